"""How closely to look at a cell's spikes, and whether each can be timed by its own dV/dt."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

from unitclass.records import FloatArray, IntArray
from unitclass.signals.vm_detector import Detector, score_vertex
from unitclass.signals.vm_measures import Lens, measured
from unitclass.signals.vm_sample import Sample, slope_noise, value_noise

CLEAR_SLOPE = 8.0
VERY_CLEAR_SLOPE = 20.0
CLEAR_MEAN = 30.0
GOOD_JITTER_MS = 0.04
BAD_JITTER_MS = 0.1
MOST_SPIKES = 200


@dataclass(frozen=True)
class Timing:
    """The lens for the cell; see `Detector` for the rest.

    `steep_ms` is the time from the filter's centre to the steepest rise of the mean spike, `shift_ms`
    from where the lens sees the steepest rise of the mean spike to where it is.
    """

    lens: Lens
    by_slope: bool
    usual_slope_mv_ms: float
    steep_ms: float
    shift_ms: float


@dataclass(frozen=True)
class _Found:
    """Samples of a block, and where in them (between samples) the matched filter puts its spikes."""

    values: FloatArray
    at: FloatArray


def choose_timing(sample: Sample, detector: Detector, centres: Sequence[IntArray], scores: Sequence[FloatArray],
                  width_ms: float) -> Timing:
    """Choose how many samples a slope and a smoothed value take, and how spikes are timed.

    The shortest slope that stands twenty deviations out of its noise (so that a spike of a third of the
    height is still clear), and whose moments agree with those of the matched filter to 0.04 ms, times each
    spike; failing that the one of at least eight deviations that agrees best. Where none agrees to 0.1 ms,
    noise is stronger than dV/dt and the matched filter times them, moved by what the mean spike shows.

    Parameters
    ----------
    sample : Sample
        Blocks to learn from.
    detector : Detector
        With its kernel.
    centres, scores : sequence of ndarray
        Per block, the bins of its spikes and the detector's score.
    width_ms : float
        Usual half-width.
    """
    found = _spikes(sample, detector, centres, scores)
    rate = detector.grid.rate_hz
    n_spikes = sum(one.at.size for one in found)
    clearest, best, finest = (0.0, 1, 0.0), (np.inf, 1, 0.0), 0
    for m in _spans(rate, max(0.4, 0.5 * width_ms)):
        lens = Lens(rate, width_ms, slope_samples=m)
        slope, jitter = _slope_and_jitter(found, lens)
        clarity = slope / max(slope_noise(sample, lens), 1e-6)
        clearest = max(clearest, (clarity, m, slope))
        finest = finest or (m if clarity * np.sqrt(n_spikes) >= CLEAR_MEAN else 0)
        if clarity >= CLEAR_SLOPE and (m == 1 or 1e3 * m / rate <= max(0.2, 0.35 * width_ms)):
            best = min(best, (jitter, m, slope))
            if jitter < GOOD_JITTER_MS and clarity >= VERY_CLEAR_SLOPE:
                best = (jitter, m, slope)
                break
    by_slope = best[0] < BAD_JITTER_MS
    _, m, slope = best if by_slope else clearest
    lens = Lens(rate, width_ms, slope_samples=m)
    height = float(np.median(measured(_windows(found, lens)[0], lens).height_mv))
    steep_ms = _steepest_ms(found, replace(lens, slope_samples=min(finest or m, m)))
    return Timing(_smoothing(sample, lens, height), by_slope, slope, steep_ms, steep_ms - _steepest_ms(found, lens))


def _spans(rate_hz: float, longest_ms: float) -> list[int]:
    longest = max(2, round(longest_ms * 1e-3 * rate_hz))
    return sorted({m for m in (1, 2, 3, 4, 6, 8, 10, 12, 16, 20, 24, 32, longest) if m <= longest})


def _spikes(sample: Sample, detector: Detector, centres: Sequence[IntArray],
            scores: Sequence[FloatArray]) -> list[_Found]:
    every = max(1, sum(c.size for c in centres) // MOST_SPIKES)
    k = detector.grid.bin_samples
    return [_Found(block.values, (at[::every] + 0.5 + score_vertex(score, at[::every])) * k - 0.5)
            for block, at, score in zip(sample.blocks, centres, scores, strict=True)]


def _windows(found: Sequence[_Found], lens: Lens) -> tuple[FloatArray, FloatArray]:
    """Return windows around the nearest samples, and how far before it the filter's moment is."""
    waves, parts = [], []
    for one in found:
        whole = np.round(one.at).astype(np.int64)
        inside = (whole >= lens.before) & (whole < one.values.size - lens.after)
        waves.append(one.values[whole[inside][:, None] + np.arange(lens.before + lens.after) - lens.before])
        parts.append((whole - one.at)[inside])
    return np.concatenate(waves), np.concatenate(parts)


def _slope_and_jitter(found: Sequence[_Found], lens: Lens) -> tuple[float, float]:
    """Return the usual slope and the spread, in ms, of its moments against those of the filter."""
    waves, part = _windows(found, lens)
    if waves.shape[0] == 0:
        return 0.0, np.inf
    got = measured(waves, lens)
    moments = (got.rise_samples + part) * 1e3 / lens.rate_hz
    spread = np.quantile(moments, [0.05, 0.95])
    return float(np.median(got.max_dvdt_mv_ms)), float(spread[1] - spread[0]) / 3.3


def _smoothing(sample: Sample, lens: Lens, height_mv: float) -> Lens:
    """Smooth until the noise is a fortieth of the spike's height, or over 0.2 ms."""
    noise_mv = value_noise(sample, replace(lens, smooth_samples=1))
    wanted = min((40.0 * noise_mv / max(height_mv, 1e-6)) ** 2, 0.2e-3 * lens.rate_hz)
    if not np.isfinite(wanted):  # too few events, or none with noise, to weigh noise against blur
        return lens
    return replace(lens, smooth_samples=max(1, int(wanted + 1) // 2 * 2 - 1))


def _steepest_ms(found: Sequence[_Found], lens: Lens) -> float:
    """Return the time from the filter's centre to the steepest rise of the mean spike at the full rate."""
    waves = np.concatenate([_aligned(one, lens) for one in found])
    if waves.shape[0] == 0:
        return 0.0
    return float((measured(waves.mean(axis=0)[None], lens).rise_samples[0] - lens.before) * 1e3 / lens.rate_hz)


def _aligned(one: _Found, lens: Lens) -> FloatArray:
    """Return windows whose centres are the filter's moments, by linear interpolation."""
    whole = np.floor(one.at).astype(np.int64)
    inside = (whole >= lens.before) & (whole < one.values.size - lens.after - 1)
    whole, part = whole[inside], (one.at - whole)[inside][:, None]
    columns = whole[:, None] + np.arange(lens.before + lens.after) - lens.before
    return np.asarray((1.0 - part) * one.values[columns] + part * one.values[columns + 1])
