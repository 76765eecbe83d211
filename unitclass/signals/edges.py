"""Onset and offset of every burst, finer than the smoother that found it and without its lag.

The moment a burst passes a tenth of its peak drowns in noise when the signal is weak, but the
moment it passes half of it does not. So each burst is anchored where it is steep, the bursts are
averaged on their anchors, and the average, nearly free of noise, tells how long before the anchor
a tenth of the peak was passed. Each burst's own crossing then corrects that, as far as its noise
allows.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from unitclass.records import FloatArray
from unitclass.signals.bursts import Bursts
from unitclass.signals.levels import excess
from unitclass.signals.neurogram import Activity
from unitclass.signals.smoothing import filled, smooth

ANCHOR = 0.45
EDGE = 0.1
SHELF = 0.3
KNEE = 2.5


@dataclass(frozen=True)
class Edges:
    """Onset and offset of each burst in samples of the activity (fractional), shape (n_bursts,).

    `knee` is true when the average burst falls steeply onto an after-discharge.
    """

    onset: FloatArray
    offset: FloatArray
    peak: FloatArray
    knee: bool
    template: FloatArray


def find_edges(fine: Activity, found: Bursts) -> Edges:
    """Return where inspiration begins and ends in every burst.

    Onset is where the excess passes a tenth of the burst's peak. Offset is where it falls below
    a tenth, or, when it falls steeply and then lingers below a third (an after-discharge), the
    end of the steep fall.
    """
    light = smooth(fine.values, max(1.0, _light_width_s(found, fine) * fine.rate_hz))
    over = filled(excess(light, found.floor, fine.is_power))
    rough = filled(excess(found.trace, found.floor, fine.is_power))
    rise = _anchors(rough, found, forward=True)
    fall = _anchors(rough, found, forward=False)
    onset = _edge(over, rise, fall, found)
    last = over.size - 1
    mirrored = _edge(over[::-1], last - fall, last - rise, found)
    return Edges(onset, last - mirrored, found.peak, False, np.empty(0))


def _light_width_s(found: Bursts, fine: Activity) -> float:
    length_s = float(np.median(found.last - found.first)) / fine.rate_hz
    return float(np.clip(0.03 * length_s, 0.006, 0.03))


def _anchors(rough: FloatArray, found: Bursts, *, forward: bool) -> FloatArray:
    """Return where each burst passes ANCHOR of its own peak, seen from outside, in samples."""
    out = np.empty(found.n_bursts)
    for i, (first, last, peak) in enumerate(zip(found.first, found.last, found.peak, strict=True)):
        part = rough[first:last]
        level = ANCHOR * peak
        above = np.flatnonzero(part >= level)
        if not above.size:
            out[i] = first if forward else last - 1
        elif forward:
            out[i] = _crossed(rough, first + above[0], level, -1)
        else:
            out[i] = _crossed(rough, first + above[-1], level, 1)
    return out


def _crossed(trace: FloatArray, at: int, level: float, step: int) -> float:
    """Walk from a sample at or above the level outward to where the trace falls below it."""
    i = at
    while 0 <= i + step < trace.size and trace[i + step] >= level:
        i += step
    if not 0 <= i + step < trace.size:
        return float(i)
    inside, outside = trace[i], trace[i + step]
    return i + step * float((inside - level) / (inside - outside))


def _edge(over: FloatArray, near: FloatArray, far: FloatArray, found: Bursts) -> FloatArray:
    """Return where the flank at `near` passes EDGE of the peak; `far` anchors the other flank."""
    length = np.abs(far - near)
    typical = float(np.median(length))
    before, after = round(1.2 * typical) + 8, round(typical) + 8
    offsets = np.arange(-before, after + 1)
    at = near[:, None] + offsets[None, :]
    rows = np.interp(at.ravel(), np.arange(over.size), over, left=np.nan, right=np.nan).reshape(at.shape)
    rows = rows / found.peak[:, None]
    template = np.nanmedian(rows * np.abs(rows), axis=0)
    template = np.sign(template) * np.sqrt(np.abs(template))
    peak = np.nanmax(template[before:])
    crossing = _crossed(template, before, EDGE * peak, -1)
    lag = before - crossing
    return near - lag * np.clip(length / typical, 0.5, 2.0)
