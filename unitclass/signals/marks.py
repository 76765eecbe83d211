"""One nerve's bursts as times: the common ground of tags, other nerves and rhythm."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from unitclass.records import BoolArray, FloatArray, Signal
from unitclass.settings import Settings
from unitclass.signals.bursts import Bursts, find_bursts
from unitclass.signals.edges import find_edges
from unitclass.signals.levels import restored
from unitclass.signals.neurogram import Activity, activity
from unitclass.signals.preparing import prepared
from unitclass.signals.smoothing import boxcar


@dataclass(frozen=True)
class BurstTimes:
    """Onset, offset and height of every burst of one nerve; arrays of shape (n_bursts,).

    `height` is the trace above its floor, in the nerve's unit. `is_cut_before`, `is_cut_after` tell
    bursts that touch a gap or an end of the stretch: that edge is not an edge.
    """

    onset_s: FloatArray
    offset_s: FloatArray
    height: FloatArray
    is_cut_before: BoolArray
    is_cut_after: BoolArray

    @property
    def n_bursts(self) -> int:
        """Return the number of bursts."""
        return int(self.onset_s.size)


@dataclass(frozen=True)
class Marks(BurstTimes):
    """The same with the activity and the traces on which the bursts were found."""

    fine: Activity
    bursts: Bursts
    has_after_discharge: bool

    def times(self) -> BurstTimes:
        """Return the bursts without the traces, which are as long as the nerve itself."""
        return BurstTimes(self.onset_s, self.offset_s, self.height, self.is_cut_before, self.is_cut_after)


def find_marks(signal: Signal, settings: Settings, *, start_s: float, stop_s: float,
               threshold_scale: float = 1.0) -> Marks:
    """Return the bursts of one nerve in one stretch; raises SignalError when there are none."""
    fine = prepared(activity(signal, settings.nerve, start_s=start_s, stop_s=stop_s), signal)
    return marks_of(fine, settings, threshold_scale=threshold_scale)


def marks_of(fine: Activity, settings: Settings, *, threshold_scale: float = 1.0) -> Marks:
    """Return the bursts of a prepared activity."""
    bursts = find_bursts(fine, settings.cycles, threshold_scale=threshold_scale)
    edges = find_edges(fine, bursts)
    missing = np.concatenate([[True], ~np.isfinite(bursts.trace), [True]])
    middle = (bursts.first + bursts.last) // 2
    height = restored(bursts.peak, bursts.floor[middle], fine.is_power) - bursts.floor[middle]
    return Marks(fine.start_s + edges.onset / fine.rate_hz, fine.start_s + edges.offset / fine.rate_hz, height,
                 missing[bursts.first], missing[bursts.last + 1], fine, bursts, edges.knee)


def span_indices(fine: Activity, start_s: FloatArray, stop_s: FloatArray) -> NDArray[np.int64]:
    """Return first and one-past-last sample of each span, shape (n_spans, 2), never empty."""
    first = np.clip(np.round((start_s - fine.start_s) * fine.rate_hz), 0, fine.values.size - 1).astype(np.int64)
    last = np.clip(np.round((stop_s - fine.start_s) * fine.rate_hz), 1, fine.values.size).astype(np.int64)
    return np.column_stack([first, np.maximum(last, first + 1)])


def peak_and_area(fine: Activity, floor: FloatArray, spans: NDArray[np.int64], width_s: float) -> tuple[
        FloatArray, FloatArray]:
    """Return highest value and time integral above the floor in every span, shape (n_spans,).

    Measured under a centred moving average of `width_s`; in the nerve's unit, and unit·s.
    """
    above = boxcar(fine.values, round(width_s * fine.rate_hz)) - floor
    peak, area = np.full(len(spans), np.nan), np.full(len(spans), np.nan)
    for i, (first, last) in enumerate(spans):
        part = above[first:last]
        part = part[np.isfinite(part)]
        if part.size:
            peak[i], area[i] = part.max(), part.sum() / fine.rate_hz
    return peak, area
