"""Which stretches of a membrane potential are a cell's, and which must be left out and why."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from unitclass.records import BoolArray, Exclusion, FloatArray
from unitclass.signals.vm_access import access_changes
from unitclass.signals.vm_looks import BlockLook, Seconds, Stuck
from unitclass.signals.vm_stream import runs_of

CONSTANT_S = 1.0
LOST_MV = -25.0
DEEPEST_MV = -120.0
LOST_S = 2.0
SHORT_S = 0.005


# --------------------------------------------------------------------- scale of the values

def scale_problem(values: ArrayLike, unit: str) -> str:
    """Return one line if values cannot be a membrane potential in mV, and what they seem to be.

    Parameters
    ----------
    values : array_like
        Some samples after conversion to mV, any shape, better from several places than from one.
    unit : str
        What the file calls its unit, for the message.

    Returns
    -------
    str
        Empty when the values may be mV.
    """
    given = np.asarray(values, dtype=float).ravel()
    finite = given[np.isfinite(given)]
    said = f" (the file says {unit!r})" if unit else ""
    if finite.size == 0:
        return f"no finite value{said}"
    if not np.any(finite):
        return f"every value is 0{said}; the conversion factor may be 0"
    low, middle, high = np.quantile(finite, [0.001, 0.5, 0.999])
    if _can_be_mv(low, middle, high):
        return ""
    seems = _seeming_scale(low, middle, high)
    return f"values from {low:.3g} to {high:.3g} cannot be mV{said}; {seems}"


def _can_be_mv(low: float, middle: float, high: float) -> bool:
    is_cell_level = middle <= -5.0
    return bool(-150.0 <= middle <= 60.0 and low >= -250.0 and high <= 250.0 and (is_cell_level or high - low >= 0.8))


def _seeming_scale(low: float, middle: float, high: float) -> str:
    """Say which power of ten brings the values where a cell's potential can be."""
    names = {1000.0: "they look like volts: the conversion to mV is missing",
             0.001: "they look like µV: a conversion of 0.001 is missing",
             1e6: "they look like volts divided by 1000: the conversion was applied twice",
             0.1: "they look 10 times too large: an amplifier gain of 10 is not divided out",
             0.01: "they look 100 times too large: an amplifier gain of 100 is not divided out",
             100.0: "they look 100 times too small: volts at an amplifier gain of 10, or a gain divided out twice",
             10.0: "they look 10 times too small: a gain of 10 was divided out twice",
             1e-6: "they look like nV: a conversion of 1e-6 is missing"}
    for factor, words in names.items():
        if -95.0 <= factor * middle <= -30.0 and factor * (high - low) <= 250.0 and factor * (high - low) >= 0.8:
            return words
    if abs(middle) > 250.0 or high - low > 500.0:
        return "they look like counts of the A/D converter: the conversion is missing"
    if 0.8e-3 <= high - low <= 0.25:
        return "they look like volts around 0: the conversion to mV is missing"
    return "check the series' conversion and offset"


# ------------------------------------------------------------------------------ the verdict

@dataclass(frozen=True)
class Verdict:
    """What is left to use and why the rest is not.

    `observed_s` has shape (n_intervals, 2). `usable` marks the pieces of `seconds` inside it.
    """

    observed_s: FloatArray
    problems: tuple[Exclusion, ...]
    seconds: Seconds
    usable: BoolArray
    notes: tuple[str, ...]


def judge(looks: list[BlockLook], spike_s: FloatArray, size_mv: FloatArray) -> Verdict:
    """Judge a whole recording.

    Parameters
    ----------
    looks : list of BlockLook
        In time order; at least one.
    spike_s, size_mv : ndarray, shape (n_spikes,)
        The cell's spikes, ascending, and their size: a cell that fires is not lost.
    """
    seconds = Seconds.joined(look.seconds for look in looks)
    notes: list[str] = []
    problems = _missing(looks)
    problems += [p for p in _stuck_problems(looks) if not _meets(p, problems)]
    problems += _lost(seconds, spike_s, problems, notes)
    problems += access_changes(seconds, spike_s, size_mv, problems)
    problems = _merged(problems)
    notes += _clipped_tops(looks)
    observed = _without(_spans(looks), problems)
    middle = 0.5 * (seconds.start_s + seconds.stop_s)
    return Verdict(observed, tuple(problems), seconds, inside(middle, observed), tuple(notes))


def inside(times_s: FloatArray, intervals_s: FloatArray) -> BoolArray:
    """Return which times lie in any of the ascending intervals, shape (n_intervals, 2)."""
    if intervals_s.shape[0] == 0:
        return np.zeros(times_s.size, bool)
    at = np.searchsorted(intervals_s[:, 0], times_s, side="right") - 1
    return np.asarray((at >= 0) & (times_s < intervals_s[np.maximum(at, 0), 1]))


def _missing(looks: list[BlockLook]) -> list[Exclusion]:
    """Name what is not finite for over SHORT_S; a sample or two are bridged by the value before."""
    return [Exclusion(a, b, "no finite values") for look in looks for a, b in look.missing_s if b - a > SHORT_S]


def _meets(one: Exclusion, others: list[Exclusion]) -> bool:
    return any(one.start_s < other.stop_s and other.start_s < one.stop_s for other in others)


def _stuck_problems(looks: list[BlockLook]) -> list[Exclusion]:
    """Name runs at the extreme value clipping, and long runs elsewhere constant."""
    low, high = min(look.low_mv for look in looks), max(look.high_mv for look in looks)
    problems = []
    for run in _joined_runs([s for look in looks for s in look.stuck]):
        is_rail = high > low and (run.value_mv >= high - 1e-6 or run.value_mv <= low + 1e-6)
        if is_rail and _is_rail_value(run, low, high, looks):
            problems.append(Exclusion(run.start_s, run.stop_s, f"clipping at {run.value_mv:.1f} mV"))
        elif run.stop_s - run.start_s >= CONSTANT_S:
            problems.append(Exclusion(run.start_s, run.stop_s, f"constant at {run.value_mv:.1f} mV"))
    return problems


def _is_rail_value(run: Stuck, low: float, high: float, looks: list[BlockLook]) -> bool:
    """Tell a rail from the resting level of a model cell without noise: a rail is far from usual."""
    usual = float(np.median(np.concatenate([look.seconds.level_mv for look in looks])))
    return abs(run.value_mv - usual) > 10.0


def _joined_runs(runs: list[Stuck]) -> list[Stuck]:
    joined: list[Stuck] = []
    for run in runs:
        if joined and run.start_s - joined[-1].stop_s < 0.002 and abs(run.value_mv - joined[-1].value_mv) < 1e-6:
            joined[-1] = Stuck(joined[-1].start_s, run.stop_s, run.value_mv)
        else:
            joined.append(run)
    return joined


def _lost(seconds: Seconds, spike_s: FloatArray, known: list[Exclusion], notes: list[str]) -> list[Exclusion]:
    """Find where the potential is not a cell's: near 0 mV (or absurdly low) and without its spikes."""
    counts = _counts(seconds, spike_s)
    with_spikes = counts > 0
    usual = float(np.median(seconds.level_mv[with_spikes] if with_spikes.sum() >= 3 else seconds.level_mv))
    rate = spike_s.size / max(seconds.level_mv.size, 1)
    if usual > LOST_MV and spike_s.size == 0:
        reason = f"no cell: the potential stays near {usual:.0f} mV and has no spikes"
        return [Exclusion(float(seconds.start_s[0]), float(seconds.stop_s[-1]), reason)]
    if usual > LOST_MV or usual < DEEPEST_MV:
        notes.append(f"the level ({usual:.0f} mV) is not that of a cell: an offset is missing or the "
                     "recording is AC-coupled; only differences count")
        limits = (usual - 60.0, usual + 30.0)
    else:
        limits = (DEEPEST_MV, max(LOST_MV, usual + 25.0))
    out = ((seconds.level_mv > limits[1]) | (seconds.level_mv < limits[0])) & seconds.free_of(known)
    problems = []
    for a, b in runs_of(_bridged(out, 2)):
        lasts = seconds.stop_s[b - 1] - seconds.start_s[a]
        if lasts < LOST_S or counts[a:b].sum() > 0.2 * rate * (b - a):
            continue
        a, b = _with_approach(seconds, a, b, usual)
        level = float(np.median(seconds.level_mv[a:b]))
        problems.append(Exclusion(float(seconds.start_s[a]), float(seconds.stop_s[b - 1]),
                                  f"cell lost: the potential is at {level:.0f} mV"))
    return problems


def _with_approach(seconds: Seconds, a: int, b: int, usual: float) -> tuple[int, int]:
    """Widen a lost run by the seconds in which the potential was on its way there or back."""
    half = 0.4 * abs(float(np.median(seconds.level_mv[a:b])) - usual)
    while a > 0 and abs(seconds.level_mv[a - 1] - usual) > half:
        a -= 1
    while b < seconds.level_mv.size and abs(seconds.level_mv[b] - usual) > half:
        b += 1
    return max(0, a - 1), min(seconds.level_mv.size, b + 1)


def _bridged(mask: BoolArray, gap: int) -> BoolArray:
    out = mask.copy()
    for a, b in runs_of(~mask):
        if a > 0 and b < mask.size and b - a <= gap:
            out[a:b] = True
    return out


def _counts(seconds: Seconds, spike_s: FloatArray) -> FloatArray:
    return np.asarray(np.searchsorted(spike_s, seconds.stop_s) - np.searchsorted(spike_s, seconds.start_s), float)


# --------------------------------------------------------------------------------- intervals

def _clipped_tops(looks: list[BlockLook]) -> list[str]:
    """Say when spikes are cut off at the amplifier's or converter's highest value."""
    high = max(look.high_mv for look in looks)
    at_high = [look for look in looks if look.high_mv >= high - 1e-6]
    if sum(look.n_flat for look in at_high) >= 20:
        return [f"spikes are cut off at {high:.1f} mV: their heights are lower limits"]
    return []


def _spans(looks: list[BlockLook]) -> FloatArray:
    spans: list[list[float]] = []
    for start_s, stop_s in (look.span_s for look in looks):
        if spans and start_s - spans[-1][1] < 1e-3:
            spans[-1][1] = stop_s
        else:
            spans.append([start_s, stop_s])
    return np.array(spans, dtype=float).reshape(-1, 2)


def _merged(problems: list[Exclusion]) -> list[Exclusion]:
    """Join problems of one reason that touch; ascending by start."""
    merged: list[Exclusion] = []
    for p in sorted(problems, key=lambda q: (q.start_s, q.stop_s)):
        if merged and p.reason == merged[-1].reason and p.start_s <= merged[-1].stop_s + 0.05:
            merged[-1] = Exclusion(merged[-1].start_s, max(p.stop_s, merged[-1].stop_s), p.reason)
        else:
            merged.append(p)
    return merged


def _without(spans: FloatArray, problems: list[Exclusion]) -> FloatArray:
    left = [tuple(s) for s in spans]
    for p in problems:
        left = [piece for a, b in left for piece in ((a, min(b, p.start_s)), (max(a, p.stop_s), b))
                if piece[1] - piece[0] > 1e-9]
    return np.array(left, dtype=float).reshape(-1, 2)
