"""A membrane potential without its spikes: cut, bridged, and averaged to a low rate."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np

from unitclass.records import BoolArray, ChunkReader, FloatArray
from unitclass.settings import MembraneSettings
from unitclass.signals.vm_stream import Block, BlockPlan, blocks

FINE_HZ = 2000.0
COARSENING = 4


@dataclass(frozen=True)
class Cuts:
    """What is cut around each spike: seconds from `start_s` to `stop_s`, shape (n_spikes,)."""

    start_s: FloatArray
    stop_s: FloatArray


@dataclass(frozen=True)
class Stretch:
    """Low-rate potential of one block, arrays of shape (n_samples,), all in mV.

    `bridged_mv` is cut as set, `wide_mv` with both margins doubled, `raw_mv` not at all.
    """

    times_s: FloatArray
    bridged_mv: FloatArray
    wide_mv: FloatArray
    raw_mv: FloatArray


def cuts_around(spike_s: FloatArray, settings: MembraneSettings, *, scale: float = 1.0) -> Cuts:
    """Return what to cut: from `cut_before_ms` before each spike to `cut_after_ms` after it.

    Of a short interval a quarter is always kept, else a fast burst would be bridged from before its first
    spike to after its last, and its plateau would be lost: a cut takes at most half of the interval after
    its spike and a quarter of the one before.

    Parameters
    ----------
    spike_s : ndarray, shape (n_spikes,)
        Ascending.
    settings : MembraneSettings
    scale : float
        Multiplies both margins.
    """
    interval = np.diff(spike_s, prepend=-np.inf, append=np.inf)
    before = np.minimum(scale * 1e-3 * settings.cut_before_ms, 0.25 * interval[:-1])
    after = np.minimum(scale * 1e-3 * settings.cut_after_ms, 0.5 * interval[1:])
    return Cuts(spike_s - before, spike_s + after)


def bridged_stretches(reader: ChunkReader, rate_hz: float, spike_s: FloatArray, settings: MembraneSettings,
                      start_s: float, stop_s: float) -> Iterator[Stretch]:
    """Yield the potential without spikes at about 500 Hz, a few seconds at a time."""
    step = max(1, round(rate_hz / FINE_HZ))
    whole = step * COARSENING
    plan = BlockPlan(rate_hz, own=whole * max(1, round(5.0 * rate_hz / whole)),
                     margin=whole * int(np.ceil(0.1 * rate_hz / whole)))
    narrow, wide = cuts_around(spike_s, settings), cuts_around(spike_s, settings, scale=2.0)
    for block in blocks(reader, plan, start_s, stop_s):
        yield _stretch(block, step, rate_hz, narrow, wide)


def _stretch(block: Block, step: int, rate_hz: float, narrow: Cuts, wide: Cuts) -> Stretch:
    n = block.values.size // step
    fine = _means(block.values[: n * step], step)
    times = block.start_s + (np.arange(n) + 0.5) * (step / rate_hz) - 0.5 / rate_hz
    half_s = 0.5 * step / rate_hz
    own = slice(block.first // step, block.first // step + max(1, (block.last - block.first) // step))
    parts = [_thinned(values[own]) for values in (times, _bridged(fine, times, narrow, half_s),
                                                  _bridged(fine, times, wide, half_s), fine)]
    return Stretch(*parts)


def _means(values: FloatArray, step: int) -> FloatArray:
    if step == 1:
        return values
    return np.asarray(values.reshape(-1, step) @ np.full(step, 1.0 / step))


def _thinned(values: FloatArray) -> FloatArray:
    """Average groups of COARSENING values; the last group may be smaller."""
    whole = values.size // COARSENING * COARSENING
    means = _means(values[:whole], COARSENING)
    return means if whole == values.size else np.append(means, values[whole:].mean())


def _bridged(fine: FloatArray, times: FloatArray, cuts: Cuts, half_s: float) -> FloatArray:
    """Replace every sample that a cut touches by the line between its neighbours."""
    cut = _cut_mask(times, cuts, half_s)
    if not cut.any():
        return fine
    if cut.all():
        return fine
    out = fine.copy()
    out[cut] = np.interp(times[cut], times[~cut], fine[~cut])
    return out


def _cut_mask(times: FloatArray, cuts: Cuts, half_s: float) -> BoolArray:
    low = np.searchsorted(cuts.stop_s, times[0] - half_s)
    high = np.searchsorted(cuts.start_s, times[-1] + half_s)
    edges = np.zeros(times.size + 1, np.int64)
    # A sample that spans t - half to t + half is touched when it overlaps the open cut.
    np.add.at(edges, np.searchsorted(times, cuts.start_s[low:high] - half_s, side="right"), 1)
    np.add.at(edges, np.searchsorted(times, cuts.stop_s[low:high] + half_s, side="left"), -1)
    return np.asarray(np.cumsum(edges[:-1]) > 0)
