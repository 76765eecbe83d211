"""What the other nerves tell about each cycle: post-inspiration, late expiration, lead."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from unitclass.errors import SignalError
from unitclass.records import Cycles, FloatArray, IntArray, Signal
from unitclass.settings import Settings
from unitclass.signals.levels import excess, first_floor
from unitclass.signals.marks import BurstTimes, marks_of, peak_and_area, span_indices
from unitclass.signals.neurogram import Activity
from unitclass.signals.smoothing import filled, smooth

MAX_N = 8
SEEN_S = 0.04  # smoothing on which post-inspiration is seen at all
DECLINE, DECLINE_S = 0.05, (0.04, 0.3)  # smoothing on which its end is read: share of expiration, and limits


@dataclass(frozen=True)
class OtherNerve:
    """One more nerve of the same stretch: its activity, and its bursts where it has any."""

    fine: Activity
    marks: BurstTimes | None
    note: str = ""


@dataclass(frozen=True)
class Coupling:
    """n reference cycles for one late-expiratory burst; n is 0 where there are too few."""

    n: int
    confidence: float
    share: float


def looked_at(fine: Activity, settings: Settings) -> OtherNerve:
    """Return a nerve's bursts, or why it has none."""
    try:
        return OtherNerve(fine, marks_of(fine, settings).times())
    except SignalError as error:
        return OtherNerve(fine, None, f"{fine.name}: {error.what}")


def measured(cycles: Cycles, nerve: OtherNerve, settings: Settings) -> Cycles:
    """Return the cycles with this nerve's peak, area and lead, and what its role tells besides."""
    floor = first_floor(smooth(nerve.fine.values, 0.05 * nerve.fine.rate_hz), nerve.fine.rate_hz)
    spans = span_indices(nerve.fine, cycles.onset_s, cycles.end_s)
    peak, area = peak_and_area(nerve.fine, floor, spans, settings.nerve.tau_ms / 1000)
    name = nerve.fine.name
    out = replace(cycles, other_peak={**cycles.other_peak, name: peak}, other_area={**cycles.other_area, name: area},
                  lead_ms={**cycles.lead_ms, name: lead_ms(cycles, nerve.marks)})
    if nerve.fine.role == "vagus":
        return replace(out, post_i_end_s=post_i_end_s(cycles, nerve.fine))
    if nerve.fine.role == "abdominal":
        return replace(out, late_e=late_e(cycles, nerve))
    return out


def lead_ms(cycles: Cycles, marks: BurstTimes | None) -> FloatArray:
    """Return how long before the reference onset the nerve's burst begins, ms, shape (n_cycles,).

    The burst is the one whose onset lies nearest, within half an expiration before and one
    inspiration after; NaN where there is none.
    """
    out = np.full(cycles.n_cycles, np.nan)
    if marks is None or not cycles.n_cycles:
        return out
    ti, te = np.nanmedian(cycles.ti_s), np.nanmedian(cycles.te_s)
    onset = marks.onset_s[~marks.is_cut_before]
    if not onset.size:
        return out
    at = np.clip(np.searchsorted(onset, cycles.onset_s), 1, onset.size - 1) if onset.size > 1 else np.zeros(
        cycles.n_cycles, int)
    before, after = onset[np.maximum(at - 1, 0)], onset[at]
    nearest = np.where(np.abs(before - cycles.onset_s) <= np.abs(after - cycles.onset_s), before, after)
    lead = cycles.onset_s - nearest
    return np.where((lead < 0.5 * te) & (lead > -ti), 1000 * lead, out)


def post_i_end_s(cycles: Cycles, fine: Activity) -> FloatArray:
    """Return where post-inspiratory activity of a vagus ends in each cycle, s; NaN where there is none."""
    out = np.full(cycles.n_cycles, np.nan)
    if not cycles.n_cycles:
        return out
    over = _over_floor(fine, SEEN_S)
    # Noise makes a slow decline pass a tenth of its height too early: the end is read on a trace
    # that is smoothed by the decline's own length.
    slow = _over_floor(fine, float(np.clip(DECLINE * np.nanmedian(cycles.te_s), *DECLINE_S)))
    for i in range(cycles.n_cycles):
        if np.isfinite(cycles.offset_s[i]):
            out[i] = _post_i_end(over, slow, fine, cycles.onset_s[i], cycles.offset_s[i], cycles.end_s[i])
    return out


def _over_floor(fine: Activity, width_s: float) -> FloatArray:
    trace = smooth(fine.values, width_s * fine.rate_hz)
    return filled(excess(trace, first_floor(trace, fine.rate_hz), fine.is_power))


def _post_i_end(over: FloatArray, slow: FloatArray, fine: Activity, onset_s: float, offset_s: float,
                end_s: float) -> float:
    te = end_s - offset_s
    spans = span_indices(fine, np.array([onset_s, offset_s + min(0.03, 0.1 * te), end_s - 0.3 * te]),
                         np.array([offset_s, offset_s + 0.8 * te, end_s - 0.05 * te]))
    inspiratory, early, late = (over[a:b] for a, b in spans)
    first = early[: max(1, early.size // 4)]
    height = float(first.max())
    if height < max(0.2 * float(inspiratory.max()), 4 * float(late.std()) + float(late.mean())):
        return np.nan
    top = int(first.argmax())
    decline = slow[spans[1, 0] + top : spans[1, 1]]
    low = np.flatnonzero(decline < 0.1 * float(decline[: max(1, decline.size // 4)].max()))
    return fine.start_s + (spans[1, 0] + top + int(low[0])) / fine.rate_hz if low.size else np.nan


def late_e(cycles: Cycles, nerve: OtherNerve) -> IntArray:
    """Return 1 for cycles that end in a late-expiratory burst of an abdominal nerve, 0 for others."""
    out = np.zeros(cycles.n_cycles, dtype=np.int64)
    if nerve.marks is None:
        return out
    middle = (nerve.marks.onset_s + nerve.marks.offset_s) / 2
    at = np.searchsorted(cycles.onset_s, middle, side="right") - 1
    for k, t in zip(at, middle, strict=True):
        if k < 0 or not t < cycles.end_s[k]:
            continue
        if t > cycles.offset_s[k] + 0.5 * (cycles.end_s[k] - cycles.offset_s[k]):
            out[k] = 1
        elif k > 0 and t < cycles.onset_s[k] + 0.3 * (cycles.offset_s[k] - cycles.onset_s[k]):
            out[k - 1] = 1
    return out


def coupling(late: IntArray) -> Coupling:
    """Return the n:1 coupling of late-expiratory bursts to cycles, with its confidence.

    n is the commonest number of cycles from one burst to the next; the confidence is the share of
    intervals that equal it, by Laplace's rule (k + 1) / (m + 2), so that few intervals convince
    nobody.
    """
    at = np.flatnonzero(late == 1)
    known = int((late >= 0).sum())
    share = at.size / known if known else 0.0
    if at.size < 3:
        return Coupling(0, 0.0, share)
    intervals = np.diff(at)
    counts = np.bincount(np.minimum(intervals, MAX_N + 1), minlength=MAX_N + 2)
    n = int(np.argmax(counts[1 : MAX_N + 1])) + 1
    return Coupling(n, float((counts[n] + 1) / (intervals.size + 2)), share)


def agreement(cycles: Cycles, marks: BurstTimes | None) -> float:
    """Return the share of cycles in which the nerve bursts exactly once; NaN when it never does."""
    if marks is None or not cycles.n_cycles:
        return np.nan
    middle = (marks.onset_s + marks.offset_s) / 2
    lead = 0.25 * np.nanmedian(cycles.te_s)
    n_in = np.searchsorted(middle, cycles.end_s - lead) - np.searchsorted(middle, cycles.onset_s - lead)
    return float(np.mean(n_in == 1))


def read_other(signal: Signal, settings: Settings, start_s: float, stop_s: float) -> OtherNerve:
    """Read, prepare and look at one other nerve; raises SignalError when it has no usable sample."""
    from unitclass.signals.neurogram import activity
    from unitclass.signals.preparing import prepared

    fine = prepared(activity(signal, settings.nerve, start_s=start_s, stop_s=stop_s), signal)
    return looked_at(fine, settings)
