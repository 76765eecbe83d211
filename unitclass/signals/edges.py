"""Onset and offset of every burst, finer than the smoother that found it and without its lag.

The moment a burst passes a tenth of its peak drowns in noise when the signal is weak. So the
bursts are fitted to their own average (`align`), and the average, nearly free of noise, tells where
a tenth of the peak lies.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from unitclass.records import FloatArray
from unitclass.signals.align import aligned, field_of
from unitclass.signals.bursts import Bursts
from unitclass.signals.flanks import crossed, edge_inward
from unitclass.signals.levels import excess
from unitclass.signals.neurogram import Activity
from unitclass.signals.smoothing import filled

ANCHOR = 0.4


@dataclass(frozen=True)
class Edges:
    """Onset and offset of each burst in samples of the activity (fractional), shape (n_bursts,).

    `knee` is true when the average burst falls steeply onto an after-discharge.
    """

    onset: FloatArray
    offset: FloatArray
    knee: bool


def find_edges(fine: Activity, found: Bursts) -> Edges:
    """Return where inspiration begins and ends in every burst.

    Onset is where the excess passes a tenth of the burst's peak. Offset is where it falls below
    a tenth, or, when it falls steeply and then lingers below a third (an after-discharge), the
    end of the steep fall.
    """
    rough = filled(excess(found.trace, found.floor, fine.is_power))
    rise, fall = _anchors(rough, found)
    typical = _typical(found, rise, fall)
    field = field_of(fine.values, found.floor, ~found.near_burst(fine.rate_hz), is_power=fine.is_power)
    onset, offset = aligned(field, rise, fall, typical)
    before = edge_inward(field, onset, offset, typical, allow_knee=False)
    end = field.strength.size - 1
    after = edge_inward(field.mirrored(), (end - offset)[::-1], (end - onset)[::-1], typical[::-1], allow_knee=True)
    return Edges(onset + before.inward, offset - after.inward[::-1], after.is_knee)


def _typical(found: Bursts, rise: FloatArray, fall: FloatArray) -> np.ndarray:
    """Return the bursts of about the usual height and length."""
    length = fall - rise
    ratio = found.peak / np.median(found.peak)
    stretch = length / np.median(length)
    typical = (ratio > 0.5) & (ratio < 1.5) & (stretch > 0.5) & (stretch < 2)
    return typical if typical.any() else np.ones(found.n_bursts, bool)


def _anchors(rough: FloatArray, found: Bursts) -> tuple[FloatArray, FloatArray]:
    """Return where each burst first and last passes ANCHOR of its own peak, in samples."""
    rise, fall = np.empty(found.n_bursts), np.empty(found.n_bursts)
    for i, (first, last, peak) in enumerate(zip(found.first, found.last, found.peak, strict=True)):
        level = ANCHOR * peak
        above = np.flatnonzero(rough[first:last] >= level)
        inner, outer = (above[0], above[-1]) if above.size else (0, last - 1 - first)
        rise[i] = crossed(rough, first + inner, level, -1)
        fall[i] = max(crossed(rough, first + outer, level, 1), rise[i] + 1)
    return rise, fall
