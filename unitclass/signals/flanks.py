"""One flank of the bursts, seen from outside: where it passes a tenth of the peak."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from unitclass.records import BoolArray, FloatArray
from unitclass.signals.align import Field, average
from unitclass.signals.smoothing import boxcar, filled

EDGE = 0.1
SHELF = 0.3
STEEP = 0.45
KNEE = 2.5
MIN_DROP = 0.08
KNEE_LEVEL = 0.15
REACH = 3.0


@dataclass(frozen=True)
class Edge:
    """How far inward of the fitted flank the edge lies in each burst, in samples (negative: outward).

    `is_knee` tells whether the flank falls onto an after-discharge.
    """

    inward: FloatArray
    is_knee: bool


@dataclass(frozen=True)
class _Flank:
    """The average burst around one flank on even steps of one sample of a usual burst.

    `strength` has peak one; step k lies `first + k` steps inward of the fitted flank. `usual` is
    the usual burst length in samples, `gain` the peak strength of each burst.
    """

    strength: FloatArray
    first: int
    usual: float
    gain: FloatArray
    is_power: bool

    def level(self, amplitude: float) -> float:
        """Return the strength at a share of the peak amplitude."""
        return amplitude**2 if self.is_power else amplitude


def edge_inward(field: Field, onset: FloatArray, offset: FloatArray, typical: BoolArray, *,
                allow_knee: bool) -> Edge:
    """Return where bursts pass a tenth of their peak near their fitted `onset`.

    The average burst tells it for all; each burst's own crossing corrects that as far as the
    bursts differ by more than noise (shrinkage toward the average).

    Parameters
    ----------
    field : Field
        Additive strength.
    onset, offset : ndarray, shape (n_bursts,)
        Fitted flanks in samples, `onset` being the one in question.
    typical : ndarray of bool, shape (n_bursts,)
        Bursts that make the average.
    allow_knee : bool
        Whether the flank may fall onto an after-discharge, which does not belong to the burst.
    """
    length = offset - onset
    flank = _flank(field, onset, length, typical, _reach(onset, offset))
    at, width, is_knee = _on_average(flank, allow_knee=allow_knee)
    inward = (at + flank.first) / flank.usual * length
    if is_knee or np.count_nonzero(typical) < 8:
        return Edge(inward, is_knee)
    return Edge(inward + _own_correction(field, flank, onset + inward, at, width, typical), is_knee)


def crossed(trace: FloatArray, at: int, level: float, step: int) -> float:
    """Walk from a sample at or above the level until the trace falls below it, and interpolate."""
    i = int(at)
    while 0 <= i + step < trace.size and trace[i + step] >= level:
        i += step
    if not 0 <= i + step < trace.size:
        return float(i)
    inside, outside = trace[i], trace[i + step]
    return i + step * min(1.0, float((inside - level) / max(inside - outside, 1e-300)))


def _reach(onset: FloatArray, offset: FloatArray) -> float:
    """Return how far outward the flank may be followed, in samples."""
    usual = float(np.median(offset - onset))
    if onset.size < 2:
        return usual
    ordered = np.argsort(onset)
    gap = float(np.median(onset[ordered][1:] - offset[ordered][:-1]))
    return float(min(REACH * usual, 0.8 * max(gap, 0.0)))


def _flank(field: Field, onset: FloatArray, length: FloatArray, typical: BoolArray, reach: float) -> _Flank:
    usual = float(np.median(length[typical]))
    k = np.arange(-round(reach) - 3, round(usual) + 4)
    rows = field.rows(onset[:, None] + length[:, None] / usual * k)
    inner = np.nanmean(np.where(k > 0, rows, np.nan), axis=1)
    strength = average(rows[typical] / inner[typical, None], np.ones(int(typical.sum()), bool))
    peak = float(np.max(boxcar(strength, max(1, round(0.05 * usual)))[k > 0]))
    return _Flank(strength / peak, int(k[0]), usual, inner * peak, field.is_power)


def _on_average(flank: _Flank, *, allow_knee: bool) -> tuple[float, int, bool]:
    """Return where the average burst has its edge (step), the smoothing used, and whether at a knee."""
    width = max(3, round(0.04 * flank.usual)) | 1
    at = steep = shelf = 0.0
    for _ in range(3):
        trace = boxcar(flank.strength, width)
        steep = crossed(trace, _inside(flank, trace), flank.level(STEEP), -1)
        shelf = crossed(trace, int(np.ceil(steep)), flank.level(SHELF), -1)
        at = crossed(trace, int(np.ceil(shelf)), flank.level(EDGE) + _raised(trace, at, width, flank), -1)
        width = max(3, round(min(0.6 * (shelf - at), 3 * (steep - shelf), 0.15 * flank.usual))) | 1
    knee = _knee(flank, at) if allow_knee else None
    return (at, width, False) if knee is None else (knee, width, True)


def _raised(trace: FloatArray, at: float, width: int, flank: _Flank) -> float:
    """Return by how much smoothing lifts the trace near the edge: a curved foot is not its own mean.

    A moving average of n samples adds n² / 24 times the second derivative; a burst that begins
    gently, the more so in power, would be found early without this.
    """
    k = round(at)
    if not width <= k < trace.size - width:
        return 0.0
    bend = trace[k + width] - 2 * trace[k] + trace[k - width]
    return float(np.clip(bend / 24, 0.0, 0.5 * flank.level(EDGE)))


def _knee(flank: _Flank, at: float) -> float | None:
    """Return where a steep fall ends on an after-discharge (step), or None when there is no such fall.

    The fall must be several times steeper than the trace on either side of it, and end below a
    third but not below a tenth of the peak.
    """
    h = max(3, round(0.05 * flank.usual))
    trace = boxcar(flank.strength, max(3, round(0.02 * flank.usual)))
    amplitude = np.sign(trace) * np.sqrt(np.abs(trace)) if flank.is_power else trace
    k = np.arange(max(2 * h, int(at)), min(amplitude.size - 2 * h, -flank.first + h))
    if not k.size:
        return None
    inner, outer = amplitude[k + h // 2], amplitude[k - h + h // 2]
    drop = inner - outer
    slope_in, slope_out = np.abs(amplitude[k + h + h // 2] - inner), np.abs(outer - amplitude[k - 2 * h + h // 2])
    steep = (drop > MIN_DROP) & (outer < SHELF) & (outer > EDGE)
    steep &= drop > KNEE * np.maximum(slope_in, slope_out)
    if not steep.any():
        return None
    best = int(np.argmax(np.where(steep, drop, -np.inf)))
    level = outer[best] + KNEE_LEVEL * drop[best]
    return crossed(amplitude, int(k[best] + h // 2), float(level), -1)


def _inside(flank: _Flank, trace: FloatArray) -> int:
    above = np.flatnonzero(trace[max(0, -flank.first - 1) :] >= flank.level(STEEP))
    return max(0, -flank.first - 1) + (int(above[0]) if above.size else 0)


def _own_correction(field: Field, flank: _Flank, edge: FloatArray, at: float, width: int,
                    typical: BoolArray) -> FloatArray:
    """Return what each burst's own crossing adds to the average's, in samples, shape (n_bursts,)."""
    trace = filled(boxcar(field.strength, width))
    own = np.array([_own_crossing(trace, e, g * flank.level(SHELF), g * flank.level(EDGE), flank.usual)
                    for e, g in zip(edge, flank.gain, strict=True)])
    differs = own - edge
    middle = np.nanmedian(differs[typical])
    spread = 1.4826 * np.nanmedian(np.abs(differs[typical] - middle))
    noise = _crossing_noise(field, flank, trace, at, width)
    share = max(0.0, 1 - (noise / spread) ** 2) if spread > 0 else 0.0
    limit = 3 * spread
    return np.nan_to_num(share * np.clip(differs - middle, -limit, limit))


def _own_crossing(trace: FloatArray, edge: float, high: float, low: float, usual: float) -> float:
    if not np.isfinite(edge) or not 0 <= edge < trace.size:
        return np.nan
    start = int(edge)
    inner = trace[start : start + max(2, round(usual))]
    above = np.flatnonzero(inner >= high)
    return crossed(trace, start + int(above[0]), low, -1) if above.size else np.nan


def _crossing_noise(field: Field, flank: _Flank, trace: FloatArray, at: float, width: int) -> float:
    """Return the standard deviation of one burst's crossing that noise alone makes, in samples."""
    smooth = boxcar(flank.strength, width)
    k = int(np.clip(round(at), 1, smooth.size - 2))
    slope = max(float(smooth[min(k + 1 + width // 2, smooth.size - 1)] - smooth[k]) / (1 + width // 2), 1e-300)
    gain = float(np.nanmedian(flank.gain))
    level_power = 1.0
    if field.is_power:
        floor_power = float(np.median(field.floor)) ** 2
        level_power = 1 + flank.level(EDGE) * gain / max(floor_power, 1e-300)
    return field.quiet_noise(width) * level_power / (slope * gain)
