"""Bursts on the activity of a nerve: where it stands above its floor, with no number to tune.

The trace is smoothed just enough for its bursts to stand clear of the noise; the level at which
a burst counts lies between the local floor and the local burst height, above a quarter of it (an
after-discharge is not a burst) and above the noise.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from unitclass.errors import SignalError
from unitclass.records import BoolArray, FloatArray
from unitclass.settings import CycleSettings
from unitclass.signals.levels import excess, first_floor, first_peak, floor_between, restored, running_median
from unitclass.signals.neurogram import Activity, averaged
from unitclass.signals.smoothing import runs, smooth, widened

SEARCH_HZ = 125.0  # means of four samples: ten to the shortest smoother tried, and edges are refined later
WIDTHS_S = (0.03, 0.06, 0.12, 0.24, 0.48)
MIN_CONTRAST = 7.0
GOOD_CONTRAST = 12.0
MAX_RATE_HZ = 5.6
LOW_FRACTION = 0.32
HIGH_FRACTION = 0.6


@dataclass(frozen=True)
class Bursts:
    """Bursts of one nerve in time order; indices into the activity, arrays of shape (n_bursts,).

    Attributes
    ----------
    first, last
        First sample above the level, and one past the last.
    peak
        Highest excess over the floor.
    trace, floor, level
        The smoothed trace, its floor, and the burst height expected locally; shape (n_samples,).
    fraction
        Share of the local burst height at which a burst counts.
    width_s
        Width of the smoother.
    contrast
        Typical burst height over the standard deviation of the floor, both on the smoothed trace.
    """

    first: NDArray[np.int64]
    last: NDArray[np.int64]
    peak: FloatArray
    trace: FloatArray
    floor: FloatArray
    level: FloatArray
    fraction: float
    width_s: float
    contrast: float
    noise: float

    @property
    def n_bursts(self) -> int:
        """Return the number of bursts."""
        return int(self.first.size)

    def in_burst(self) -> BoolArray:
        """Return whether each sample lies in a burst, shape (n_samples,)."""
        flags = np.zeros(self.trace.size + 1)
        np.add.at(flags, self.first, 1)
        np.add.at(flags, self.last, -1)
        return np.cumsum(flags[:-1]) > 0

    def near_burst(self, rate_hz: float) -> BoolArray:
        """Return whether each sample lies in a burst or within a tenth of the usual gap of one."""
        gap = float(np.median(self.first[1:] - self.last[:-1])) if self.n_bursts > 1 else 0.0
        return widened(self.in_burst(), round(max(0.1 * gap, self.width_s * rate_hz)))


def find_bursts(fine: Activity, settings: CycleSettings, *, threshold_scale: float = 1.0) -> Bursts:
    """Return the bursts of a stretch.

    Parameters
    ----------
    fine : Activity
        Fine activity without lag.
    settings : CycleSettings
        Shortest burst and gap, where the user gave them.
    threshold_scale : float
        Multiplies the level at which a burst counts.

    Raises
    ------
    SignalError
        When nothing stands clear of the floor: noise alone, or too little of a rhythm.
    """
    scale = threshold_scale * settings.threshold_scale
    step = max(1, int(fine.rate_hz // SEARCH_HZ))
    if step == 1:
        return _searched(fine, settings, scale)
    coarse = replace(fine, values=averaged(fine.values, step), rate_hz=fine.rate_hz / step)
    return _refined(_searched(coarse, settings, scale), fine.values.size, step)


def _refined(found: Bursts, n_samples: int, step: int) -> Bursts:
    """Return bursts found on means of `step` samples as indices and traces of the samples themselves."""
    centres = np.arange(found.trace.size) * step + (step - 1) / 2
    trace, floor, level = (np.interp(np.arange(n_samples), centres, values)
                           for values in (found.trace, found.floor, found.level))
    return replace(found, first=found.first * step, last=np.minimum(found.last * step, n_samples), trace=trace,
                   floor=floor, level=level)


def _searched(fine: Activity, settings: CycleSettings, scale: float) -> Bursts:
    """Return the bursts under the least smoothing that shows them, then under what their length allows."""
    clearest: Bursts | None = None
    best: Bursts | None = None
    for width_s in WIDTHS_S:
        if 8 * width_s > fine.values.size / fine.rate_hz:
            break
        found = _at_width(fine, width_s, settings, scale)
        if clearest is None or found.contrast > clearest.contrast:
            clearest = found
        if found.contrast >= MIN_CONTRAST and _is_rhythm(found, fine):
            if best is None or min(found.contrast, GOOD_CONTRAST) > best.contrast:
                best = found
            if found.contrast >= GOOD_CONTRAST:
                break
    if best is None:
        raise SignalError(_why_none(clearest, fine), where=f"nerve {fine.name}",
                          remedy="name another nerve with --nerve or lower cycles.threshold_scale")
    return _tuned(fine, best, settings, scale)


def _is_rhythm(found: Bursts, fine: Activity) -> bool:
    if found.n_bursts < 2:
        return False
    interval_s = np.median(np.diff(found.first)) / fine.rate_hz
    return bool(interval_s * MAX_RATE_HZ > 1)


def _why_none(best: Bursts | None, fine: Activity) -> str:
    if best is None:
        return f"{fine.values.size / fine.rate_hz:.2f} s is too short to hold a cycle"
    if best.contrast >= MIN_CONTRAST and best.n_bursts < 2:
        return f"{best.n_bursts} burst in {fine.values.size / fine.rate_hz:.1f} s: no cycle to measure"
    return ("no burst stands clear of the floor "
            f"({best.contrast:.1f} standard deviations at best, {MIN_CONTRAST:.0f} needed)")


def _tuned(fine: Activity, found: Bursts, settings: CycleSettings, scale: float) -> Bursts:
    """Smooth as much as the bursts' own length allows, and look again."""
    length_s = _typical(found.last - found.first) / fine.rate_hz
    gap_s = float(np.median(found.first[1:] - found.last[:-1])) / fine.rate_hz
    width_s = float(np.clip(0.15 * min(length_s, gap_s), 0.02, 0.2))
    if width_s <= found.width_s:
        return found
    again = _at_width(fine, width_s, settings, scale)
    return again if _is_rhythm(again, fine) and again.contrast >= found.contrast * 0.9 else found


def _at_width(fine: Activity, width_s: float, settings: CycleSettings, scale: float) -> Bursts:
    trace = smooth(fine.values, width_s * fine.rate_hz)
    floor = first_floor(trace, fine.rate_hz)
    level = first_peak(excess(trace, floor, fine.is_power), fine.rate_hz)
    found = _above(fine, trace, floor, level, 0.4, width_s, settings)
    for _ in range(2):
        if found.n_bursts < 2:
            return found
        floor, level = _levels(fine, found)
        noise = _floor_noise(fine, trace, floor, found)
        fraction = _fraction(fine, floor, level, noise) * scale
        found = _above(fine, trace, floor, level, fraction, width_s, settings, noise)
    return found


def _fraction(fine: Activity, floor: FloatArray, level: FloatArray, noise: float) -> float:
    """Return the share of the burst height that lies 4.5 standard deviations above the floor."""
    above = excess(restored(0.0, floor, fine.is_power) + 4.5 * noise, floor, fine.is_power)
    needed = float(np.median(above / np.maximum(level, 1e-300)))
    return float(np.clip(needed, LOW_FRACTION, HIGH_FRACTION))


def _levels(fine: Activity, found: Bursts) -> tuple[FloatArray, FloatArray]:
    cycle_s = np.median(np.diff(found.first)) / fine.rate_hz
    apart = widened(found.in_burst(), round(found.width_s * fine.rate_hz))
    floor = floor_between(found.trace, apart, fine.rate_hz, float(np.clip(5 * cycle_s, 5.0, 60.0)))
    long_enough = (found.last - found.first) >= 0.3 * _typical(found.last - found.first)
    centre = (found.first + found.last)[long_enough] / 2
    height = excess(restored(found.peak, 0.0, False), 0.0, False)[long_enough]
    level = np.interp(np.arange(found.trace.size), centre, running_median(height, 15))
    return floor, level


def _floor_noise(fine: Activity, trace: FloatArray, floor: FloatArray, found: Bursts) -> float:
    apart = widened(found.in_burst(), round(2 * found.width_s * fine.rate_hz))
    quiet = (trace - floor)[~apart & np.isfinite(trace)]
    if quiet.size < 20:
        quiet = (trace - floor)[~found.in_burst() & np.isfinite(trace)]
    if quiet.size < 5:
        return float("inf")
    return float(1.4826 * np.median(np.abs(quiet - np.median(quiet))))


def _above(fine: Activity, trace: FloatArray, floor: FloatArray, level: FloatArray, fraction: float,
           width_s: float, settings: CycleSettings, noise: float = np.inf) -> Bursts:
    over = excess(trace, floor, fine.is_power)
    with np.errstate(invalid="ignore"):
        pieces = runs(over > fraction * level)
    pieces = _joined(pieces, over, settings.min_gap_s * fine.rate_hz)
    pieces = pieces[(pieces[:, 1] - pieces[:, 0]) >= _shortest(pieces, settings, fine.rate_hz)]
    peak = _highest(over, pieces)
    middle = (pieces.mean(axis=1)).astype(int) if len(pieces) else np.empty(0, int)
    heights = restored(peak, floor[middle], fine.is_power) - floor[middle]
    contrast = float(np.median(heights)) / noise if noise > 0 and heights.size else float(heights.size > 0) * 1e9
    return Bursts(pieces[:, 0], pieces[:, 1], peak, trace, floor, level, fraction, width_s, contrast, noise)


def _highest(over: FloatArray, pieces: NDArray[np.int64]) -> FloatArray:
    """Return the greatest value in each piece, shape (n_pieces,)."""
    if not len(pieces):
        return np.empty(0)
    padded = np.append(np.where(np.isfinite(over), over, -np.inf), -np.inf)
    return np.maximum.reduceat(padded, pieces.ravel())[::2]


def _joined(pieces: NDArray[np.int64], over: FloatArray, min_gap: float) -> NDArray[np.int64]:
    """Join pieces across gaps that are too short to be expiration."""
    if len(pieces) < 2:
        return pieces
    length = _typical(pieces[:, 1] - pieces[:, 0])
    gap = pieces[1:, 0] - pieces[:-1, 1]
    apart = gap >= (min_gap or min(0.12 * length, 0.5 * np.median(gap)))
    first = np.concatenate([[True], apart])
    last = np.concatenate([apart, [True]])
    return np.column_stack([pieces[first, 0], pieces[last, 1]])


def _shortest(pieces: NDArray[np.int64], settings: CycleSettings, rate_hz: float) -> float:
    if settings.min_burst_s:
        return settings.min_burst_s * rate_hz
    return 0.2 * _typical(pieces[:, 1] - pieces[:, 0]) if len(pieces) else 0.0


def _typical(length: NDArray[np.int64]) -> float:
    """Return the median length of bursts, the long ones weighing more (noise is short)."""
    if not length.size:
        return 0.0
    ordered = np.sort(length).astype(float)
    weight = np.cumsum(ordered**2)
    return float(ordered[np.searchsorted(weight, 0.5 * weight[-1])])
