"""Does a unit do what its suggested type is defined by? A check that does not use the engine.

The engine's own fit may be wrong in the same way as its suggestion; here the measured histogram
is held against the ranges that the type's template file states.
"""

from __future__ import annotations

from collections.abc import Iterator
from typing import TYPE_CHECKING

import numpy as np

from unitclass.records import FloatArray, UnitResult

if TYPE_CHECKING:
    from unitclass.classify.templates import Family

SLACK = 0.08
"""Canonical phase by which a measured peak may miss the stated range."""
LEAST_INSIDE = 0.5
"""Share of the firing above background that must fall where the type may fire."""
FEW_SPIKES = 60
DEEP = 0.95
"""Depth of modulation of a cell that does not fire throughout."""
MODULATED = 0.6
"""Depth of modulation that is too much for a cell called not modulated."""


def conflicts(unit: UnitResult, family: Family) -> tuple[str, ...]:
    """Return in words where the unit's histogram contradicts what the template states.

    Nothing is said of a unit with few spikes, nor of what the template leaves open.
    """
    if unit.histogram.n_spikes < FEW_SPIKES:
        return ()
    if family.form in ("flat", "cosine"):
        return tuple(_depth_conflicts(unit, family))
    if "onset" not in family.ranges:
        return ()
    return tuple(_place_conflicts(unit, family))


def _depth_conflicts(unit: UnitResult, family: Family) -> Iterator[str]:
    depth = unit.modulation.depth
    limit = MODULATED if family.form == "flat" else DEEP
    if np.isfinite(depth) and depth > limit:
        what = "is modulated" if family.form == "flat" else "falls silent in part of the cycle"
        yield f"{what} (depth {depth:.2f}), {family.id} is not"


def _place_conflicts(unit: UnitResult, family: Family) -> Iterator[str]:
    rate = np.nan_to_num(unit.histogram.rate_hz)
    phase = unit.histogram.centres
    if family.form != "two humps":
        yield from _peak_conflict(rate, phase, family)
    yield from _level_conflicts(rate, phase, family)
    start, stop = _active_range(family)
    inside = _is_between(phase, start - SLACK / 2, stop + SLACK / 2)
    above = np.clip(rate - np.quantile(rate, 0.1), 0, None) * unit.histogram.exposure_s
    if inside.all() or above.sum() <= 0:
        return
    share = float(above[inside].sum() / above.sum())
    if share < LEAST_INSIDE:
        yield (f"{1 - share:.0%} of its firing lies outside phase {start % 2:.2f} to {stop % 2:.2f}, "
               f"where {family.id} may fire")


def _peak_conflict(rate: FloatArray, phase: FloatArray, family: Family) -> Iterator[str]:
    low, high = family.range("peak")
    smooth = np.roll(rate, 1) + rate + np.roll(rate, -1)
    peak = float(phase[int(np.argmax(smooth))])
    if not _is_between(np.array([peak]), low - SLACK, high + SLACK)[0]:
        yield f"peaks at phase {peak:.2f}, {family.id} peaks at {low % 2:.2f} to {_end(high):.2f}"


def _level_conflicts(rate: FloatArray, phase: FloatArray, family: Family) -> Iterator[str]:
    """Tell of parts of the cycle in which the type fires by definition and the unit hardly does."""
    top = float(rate.max())
    needed: list[tuple[str, float, float, float]] = []
    if family.range("foot")[0] > 0:
        needed.append(("before inspiration", 2 + family.range("foot_onset")[1] - 0.1, 2.0, family.range("foot")[0]))
    if family.form == "plateau":
        start, stop = family.range("onset")[1], family.range("offset")[0]
        length = (stop - start) / 4
        needed += [("early in its phase", start, start + length, family.range("start_level")[0]),
                   ("late in its phase", stop - length, stop, family.range("end_level")[0])]
    if family.form == "two humps":
        needed.append(("late in expiration", family.range("second_onset")[1], 2.0,
                       family.range("second_level")[0]))
    for where, start, stop, least in needed:
        level = float(rate[_is_between(phase, start, stop)].mean()) / top
        if level < least / 2:
            yield f"fires little {where} ({level:.0%} of its peak), {family.id} does"


def _active_range(family: Family) -> tuple[float, float]:
    """Return the phase at which the type may begin to fire, and the one by which it has ended."""
    start = family.range("onset")[0]
    stop = family.range("offset")[1]
    if family.range("foot")[1] > 0:
        start = min(start, family.range("foot_onset")[0])
    if family.form == "two humps":
        stop = max(stop, family.range("second_offset")[1])
    return start, stop


def _is_between(phase: FloatArray, low: float, high: float) -> np.ndarray:
    """Return which phases lie between two that may leave [0, 2)."""
    if high - low >= 2:
        return np.ones(phase.shape, bool)
    return (phase - low) % 2 <= high - low


def _end(phase: float) -> float:
    return phase if phase <= 2 else phase % 2
