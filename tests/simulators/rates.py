"""Simulator (a): every type is a firing rate written down from the trade's words.

A shape is a rate between 0 and 1 at every moment of the cycles. Some are locked in phase, some in
milliseconds. The words are those of the reference page; the numbers are wide on purpose. A type
means what the trade calls by that name, so the limits between neighbours are said here:

- post-I has fallen to a tenth of its peak before the last third of expiration, dec-E has not;
- late-I starts after the first half of inspiration, ramp-I in its first quarter, con-I keeps within a
  quarter of its mean;
- pre-I starts in the last third of expiration (or within 0.7 s of the burst) and reaches at least an
  eighth of its peak before the onset;
- aug-E rises through at least the second half of expiration, late-E stays within its last fifth or so;
- tonic cells never fall below a third of their peak, phasic ones have a background of at most a quarter.
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from tests.simulators.common import (
    TYPES,
    Clock,
    Shape,
    SimUnits,
    Wear,
    breathing,
    clock,
    gain_over_time,
    gains,
    log_uniform,
    preparation,
    recorded,
    renewal,
    worn,
)
from unitclass.records import NOT_MODULATED, OTHER, Cycles, FloatArray

Rng = np.random.Generator
FLAT_FOREIGN = 0.5


def simulate(n_per_type: int, *, n_cycles: int = 60, regime: str = "three-phase", rng: Rng,
             types: Sequence[str] | None = None, peak_hz: tuple[float, float] = (3.0, 100.0),
             hardness: float = 1.0, cycles: Cycles | None = None, with_other: bool = True) -> SimUnits:
    """Return `n_per_type` units of each type on one set of cycles.

    Parameters
    ----------
    n_cycles : int
        Ignored when `cycles` is given.
    types : sequence of str
        Default: every type that the regime can hold, and "other" unless `with_other` is false.
    peak_hz : tuple of float
        Peak rates are drawn log-uniformly between these.
    hardness : float
        0 leaves the trains clean, 1 wears them up to the stated limits (gain CV 0.4, drift of half,
        15 % missed, 12 % foreign, background 25 %).
    """
    cycles = cycles if cycles is not None else breathing(n_cycles, preparation(regime, rng), rng)
    at = clock(cycles)
    wanted = list(types) if types is not None else [*TYPES[regime], *([OTHER] if with_other else [])]
    trains, names, details = [], [], []
    for name in wanted:
        for _ in range(n_per_type):
            train, detail = unit(name, at, cycles, regime, rng, peak_hz=peak_hz, hardness=hardness)
            trains.append(train)
            names.append(name)
            details.append(detail)
    return SimUnits(trains, names, regime, cycles, details)


def unit(name: str, at: Clock, cycles: Cycles, regime: str, rng: Rng, *,
         peak_hz: tuple[float, float] = (3.0, 100.0), hardness: float = 1.0) -> tuple[FloatArray, str]:
    """Return one unit's spike times and what is particular about it."""
    wear = worn(rng, hardness=hardness)
    peak = log_uniform(rng, *peak_hz)
    shape, detail = drawn(name, at, regime, rng)
    train = fired(shape, at, cycles, peak, wear, rng, n_to_1=_n_to_1(name, rng, detail))
    foreign = _foreign(at, cycles, regime, max(train.size, 10), rng)
    return recorded(train, foreign, cycles, wear, rng), detail


def fired(shape: Shape, at: Clock, cycles: Cycles, peak_hz: float, wear: Wear, rng: Rng, *,
          n_to_1: int = 1) -> FloatArray:
    """Return the spikes of a shape at this peak rate, before the recording touches them."""
    form = shape(at)
    if n_to_1 > 1:
        form = form * ((at.cycle + rng.integers(n_to_1)) % n_to_1 == 0)
    rate = peak_hz * (wear.background + (1 - wear.background) * form)
    return renewal(rate * gain_over_time(at, gains(cycles.n_cycles, wear, rng), cycles), at, wear.order, rng)


def drawn(name: str, at: Clock, regime: str, rng: Rng) -> tuple[Shape, str]:
    """Draw a shape of the type; the second value says what is particular about it."""
    made = _MAKERS[name](at, regime, rng)
    return made if isinstance(made, tuple) else (made, "")


def form(name: str, at: Clock, regime: str, rng: Rng) -> FloatArray:
    """Return a drawn shape of the type at every moment of the clock, for the oracle."""
    return drawn(name, at, regime, rng)[0](at)


def _n_to_1(name: str, rng: Rng, detail: str) -> int:
    return int(detail[0]) if name == "late-E" else 1


def _foreign(at: Clock, cycles: Cycles, regime: str, n: int, rng: Rng) -> FloatArray:
    if rng.uniform() < FLAT_FOREIGN:
        return rng.uniform(at.time_s[0], at.time_s[-1], n)
    shape, _ = drawn(str(rng.choice(TYPES[regime])), at, regime, rng)
    form = shape(at)
    return renewal(form * n / (form.sum() * at.dt_s + 1e-9), at, 1.0, rng)


# ------------------------------------------------------------------------------ bricks

def _rise(x: FloatArray, start: float, stop: float, power: float = 1.0) -> FloatArray:
    """Return 0 before start, 1 after stop, a power law between; NaN counts as 0."""
    return np.nan_to_num(np.clip((x - start) / max(stop - start, 1e-6), 0, 1) ** power, nan=0.0)


def _fall(x: FloatArray, start: float, stop: float, power: float = 1.0) -> FloatArray:
    """Return 1 before start, 0 after stop; NaN counts as 0."""
    return np.where(np.isnan(x), 0.0, 1 - _rise(x, start, stop, power))


def _within(x: FloatArray, start: float, stop: float) -> FloatArray:
    return np.where((x >= start) & (x < stop), 1.0, 0.0)


def _decay(seconds: FloatArray, tau_s: float) -> FloatArray:
    return np.exp(-np.maximum(seconds, 0) / tau_s)


def _hump(phase: FloatArray, centre: FloatArray | float, width: float) -> FloatArray:
    return np.exp(-0.5 * (_apart(phase, centre) / width) ** 2)


def _apart(phase: FloatArray, centre: FloatArray | float) -> FloatArray:
    """Return the distance on the circle of canonical phase, 0 to 1."""
    return np.abs((phase - centre + 1) % 2 - 1)


# ------------------------------------------------------------------ inspiratory shapes

def _early_i(at: Clock, regime: str, rng: Rng) -> Shape:
    attack = rng.uniform(0.0, 0.10)
    if rng.uniform() < 0.5:
        tau = rng.uniform(0.18, 0.45) * at.ti_s
        return lambda c: _rise(c.i, 0, attack) * _decay(c.from_onset_s - attack * c.ti_s, tau)
    end, floor, power = rng.uniform(0.65, 1.05), rng.uniform(0.0, 0.2), rng.uniform(0.6, 1.3)
    return lambda c: _rise(c.i, 0, attack) * (
        floor * _within(c.i, 0, 1) + (1 - floor) * _fall(c.i, attack, end, power))


def _ramp_i(at: Clock, regime: str, rng: Rng) -> Shape:
    start, foot, power = rng.uniform(0.0, 0.25), rng.uniform(0.0, 0.35), rng.uniform(0.6, 1.8)
    stop = rng.uniform(0.94, 1.0)
    if rng.uniform() < 0.3:
        slope_s = rng.uniform(0.8, 1.1) * at.ti_s
        return lambda c: _within(c.i, start, stop) * np.minimum(
            foot + (1 - foot) * np.clip((c.from_onset_s - start * c.ti_s) / slope_s, 0, 1.3) ** power, 1.3)
    return lambda c: _within(c.i, start, stop) * (foot + (1 - foot) * _rise(c.i, start, stop, power))


def _late_i(at: Clock, regime: str, rng: Rng) -> Shape:
    start, power = rng.uniform(0.52, 0.75), rng.uniform(0.4, 1.5)
    top = rng.uniform(start + 0.6 * (1 - start), 1.0)
    stop = rng.uniform(0.95, 1.0)
    return lambda c: _rise(c.i, start, top, power) * _within(c.i, start, stop)


def _con_i(at: Clock, regime: str, rng: Rng) -> Shape:
    start, stop, tilt = rng.uniform(0.0, 0.10), rng.uniform(0.90, 1.0), rng.uniform(-0.22, 0.22)
    return lambda c: _within(c.i, start, stop) * (1 + 2 * tilt * np.nan_to_num(c.i - 0.5)) / (1 + abs(tilt))


def _pre_i(at: Clock, regime: str, rng: Rng) -> Shape:
    lead_s = rng.uniform(0.25, 0.7) if regime == "one-phase" else rng.uniform(0.10, 0.33) * at.te_s
    level, power = rng.uniform(0.15, 0.9), rng.uniform(0.5, 1.6)
    stop, end = rng.uniform(0.75, 1.0), rng.uniform(0.1, 1.0)

    def rate(c: Clock) -> FloatArray:
        before = np.where(np.isnan(c.e), 0.0, level * np.clip(1 - c.to_onset_s / lead_s, 0, 1) ** power)
        slope = 1 - (1 - end) * np.nan_to_num(c.i / stop)
        through = _within(c.i, 0, stop) * _rise(c.i, -0.05, 0.15) * slope
        return np.maximum(before, np.maximum(through, level * _within(c.i, 0, 0.3 * stop)))
    return rate


def _i_e(at: Clock, regime: str, rng: Rng) -> Shape:
    start, reach_s = rng.uniform(0.55, 0.85), rng.uniform(0.12, 0.40) * at.te_s
    top, power = rng.uniform(0.5, 1.0), rng.uniform(0.6, 1.5)

    def rate(c: Clock) -> FloatArray:
        late = _rise(c.i, start, start + top * (1 - start), 1.0)
        after = np.where(np.isnan(c.e), 0.0, np.clip(1 - c.from_offset_s / reach_s, 0, 1) ** power)
        return late + after
    return rate


# ------------------------------------------------------------------- expiratory shapes

def _post_i(at: Clock, regime: str, rng: Rng) -> Shape:
    attack_s = rng.uniform(0.0, 0.06) * at.te_s
    if rng.uniform() < 0.6:
        tau = min(rng.uniform(0.10, 0.27) * at.te_s, 1.0)
        return lambda c: _within(c.e, 0, 1) * _rise(c.from_offset_s, 0, attack_s) * _decay(
            c.from_offset_s - attack_s, tau)
    stop, power = rng.uniform(0.28, 0.62), rng.uniform(0.6, 1.4)
    return lambda c: _rise(c.e, 0, attack_s / at.te_s) * _fall(c.e, 0.05, stop, power)


def _aug_e(at: Clock, regime: str, rng: Rng) -> Shape:
    start, foot, power = rng.uniform(0.12, 0.5), rng.uniform(0.0, 0.3), rng.uniform(0.6, 1.8)
    stop = rng.uniform(0.94, 1.0)
    return lambda c: _within(c.e, start, stop) * (foot + (1 - foot) * _rise(c.e, start, stop, power))


def _con_e(at: Clock, regime: str, rng: Rng) -> Shape:
    start, stop, tilt = rng.uniform(0.0, 0.10), rng.uniform(0.90, 1.0), rng.uniform(-0.22, 0.22)
    return lambda c: _within(c.e, start, stop) * (1 + 2 * tilt * np.nan_to_num(c.e - 0.5)) / (1 + abs(tilt))


def _late_e(at: Clock, regime: str, rng: Rng) -> tuple[Shape, str]:
    n = int(rng.choice([1, 1, 2, 3]))
    start, stop = rng.uniform(0.74, 0.88), rng.uniform(0.96, 1.0)
    top, power = start + rng.uniform(0.3, 1.0) * (stop - start), rng.uniform(0.5, 1.5)
    return (lambda c: _rise(c.e, start, top, power) * _within(c.e, start, stop)), f"{n}:1"


def _dec_e(at: Clock, regime: str, rng: Rng) -> Shape:
    attack, end, power = rng.uniform(0.0, 0.08), rng.uniform(0.12, 0.45), rng.uniform(0.5, 1.2)
    if rng.uniform() < 0.5:
        tau = rng.uniform(0.5, 1.2) * at.te_s
        return lambda c: _within(c.e, 0, 1) * _rise(c.e, 0, attack) * _decay(c.from_offset_s, tau)
    return lambda c: _rise(c.e, 0, attack) * (
        end * _within(c.e, 0, 1) + (1 - end) * _fall(c.e, attack, 1.0, power))


def _bi_e(at: Clock, regime: str, rng: Rng) -> Shape:
    lead_s = rng.uniform(0.15, 0.45) * min(at.te_s, 2.0)
    lag_s = rng.uniform(0.12, 0.40) * min(at.te_s, 2.5)
    before, after = sorted(rng.uniform(0.45, 1.0, 2), key=lambda _: rng.uniform())

    def rate(c: Clock) -> FloatArray:
        up = before * np.clip(1 - c.to_onset_s / lead_s, 0, 1)
        down = after * np.clip(1 - c.from_offset_s / lag_s, 0, 1)
        return np.where(np.isnan(c.e), 0.0, np.maximum(up, down))
    return rate


# -------------------------------------------------------------- tonic, unmodulated, odd

def _tonic(at: Clock, regime: str, rng: Rng) -> tuple[Shape, str]:
    low, kind = rng.uniform(0.33, 0.60), str(rng.choice(["swell", "step", "dip"]))
    if kind == "swell":
        peak = rng.uniform(0, 2)
        return (lambda c: low + (1 - low) * (1 + np.cos(np.pi * (c.phase - peak))) / 2), "swell"
    if kind == "step":
        in_i = rng.uniform() < 0.5
        return (lambda c: np.where(np.isnan(c.e) == in_i, 1.0, low)), "step"
    centre, width = rng.uniform(0, 2), rng.uniform(0.25, 0.45)
    return (lambda c: 1 - (1 - low) * _hump(c.phase, centre, width)), "dip"


def _nrm(at: Clock, regime: str, rng: Rng) -> tuple[Shape, str]:
    if rng.uniform() < 0.75:
        return (lambda c: np.full(c.time_s.size, 0.7)), ""
    beat_hz, depth = rng.uniform(4.0, 7.0), rng.uniform(0.3, 0.8)
    return (lambda c: 0.6 * (1 + depth * np.cos(2 * np.pi * beat_hz * c.time_s))), "heart"


def _other(at: Clock, regime: str, rng: Rng) -> tuple[Shape, str]:
    kind = str(rng.choice(["three humps", "both middles", "narrow peak", "drifting"]))
    return _ODD[kind](rng), kind


def _three_humps(rng: Rng) -> Shape:
    centres = rng.uniform(0, 2 / 3) + np.arange(3) * 2 / 3 + rng.uniform(-0.08, 0.08, 3)
    width, tops = rng.uniform(0.06, 0.11), rng.uniform(0.6, 1.0, 3)
    return lambda c: tops @ np.stack([_hump(c.phase, m, width) for m in centres])


def _both_middles(rng: Rng) -> Shape:
    width, tops = rng.uniform(0.08, 0.16), rng.uniform(0.6, 1.0, 2)
    return lambda c: tops[0] * _hump(c.phase, 0.5, width) + tops[1] * _hump(c.phase, 1.5, width)


def _narrow_peak(rng: Rng) -> Shape:
    centre, width = rng.choice([rng.uniform(0.35, 0.5), rng.uniform(1.4, 1.65)]), rng.uniform(0.03, 0.06)
    return lambda c: _hump(c.phase, centre, width)


def _drifting(rng: Rng) -> Shape:
    start, width = rng.uniform(0, 2), rng.uniform(0.12, 0.25)
    path = rng.choice([-1, 1]) * rng.uniform(1.0, 1.8)
    return lambda c: _hump(c.phase, start + path * c.cycle / max(c.cycle[-1], 1), width)


_ODD = {"three humps": _three_humps, "both middles": _both_middles, "narrow peak": _narrow_peak,
        "drifting": _drifting}
_MAKERS = {
    "pre-I": _pre_i, "early-I": _early_i, "ramp-I": _ramp_i, "late-I": _late_i, "con-I": _con_i, "I-E": _i_e,
    "post-I": _post_i, "aug-E": _aug_e, "con-E": _con_e, "late-E": _late_e, "dec-E": _dec_e, "bi-E": _bi_e,
    "tonic": _tonic, NOT_MODULATED: _nrm, OTHER: _other,
}
