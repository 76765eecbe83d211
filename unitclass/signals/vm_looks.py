"""What the quality of a membrane potential is judged by: level and noise by the second, stuck values."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass, fields

import numpy as np

from unitclass.records import BoolArray, Exclusion, FloatArray
from unitclass.signals.vm_bumps import Grid
from unitclass.signals.vm_stream import Block, runs_of

STUCK_MS = 20.0


@dataclass(frozen=True)
class Seconds:
    """Pieces of about one second: level and noise, each of shape (n_pieces,)."""

    start_s: FloatArray
    stop_s: FloatArray
    level_mv: FloatArray
    noise_mv: FloatArray

    def free_of(self, problems: Sequence[Exclusion]) -> BoolArray:
        """Return which pieces no problem touches, shape (n_pieces,)."""
        free = np.ones(self.start_s.size, bool)
        for p in problems:
            free &= (self.start_s >= p.stop_s) | (self.stop_s <= p.start_s)
        return free

    @staticmethod
    def joined(parts: Iterable[Seconds]) -> Seconds:
        """Return all pieces in their order."""
        kept = list(parts)
        if not kept:
            return Seconds(*(np.empty(0) for _ in fields(Seconds)))
        return Seconds(*(np.concatenate([getattr(p, f.name) for p in kept]) for f in fields(Seconds)))


@dataclass(frozen=True)
class Stuck:
    """A run of equal values."""

    start_s: float
    stop_s: float
    value_mv: float


@dataclass(frozen=True)
class BlockLook:
    """What quality needs of one block."""

    seconds: Seconds
    stuck: tuple[Stuck, ...]
    missing_s: tuple[tuple[float, float], ...]
    span_s: tuple[float, float]
    low_mv: float
    high_mv: float
    n_flat: int


def look_at(block: Block, coarse: FloatArray, grid: Grid) -> BlockLook:
    """Summarise a block's own samples from its coarse means."""
    k = grid.bin_samples
    first, last = block.first // k, max(block.first // k + 1, block.last // k)
    own = coarse[first:last]
    bin_s = 1e-3 * grid.bin_ms
    start_s = block.start_s + block.first / grid.rate_hz
    stop_s = block.start_s + block.last / grid.rate_hz
    high = float(own.max())
    return BlockLook(_seconds(own, start_s, stop_s, bin_s), tuple(_stuck_runs(own, start_s, bin_s)),
                     block.missing_s, (start_s, stop_s), float(own.min()), high,
                     _flat_tops(own, high))


def _flat_tops(own: FloatArray, high: float) -> int:
    """Count the bins at the highest value whose next bin is there too."""
    at_high = own >= high - 1e-9 * (1.0 + abs(high))
    return int(np.count_nonzero(at_high[1:] & at_high[:-1]))


def _seconds(own: FloatArray, start_s: float, stop_s: float, bin_s: float) -> Seconds:
    """Return equal pieces of about a second; every sixteenth bin is enough for a median."""
    n = max(1, round(own.size * bin_s))
    size = max(1, own.size // n)
    rows = own[: n * size].reshape(n, size)
    stride = 16 if size > 1000 else 1
    change = np.abs(rows[:, 1::stride] - rows[:, :-1:stride]) if size > 1 else np.zeros((n, 1))
    times = start_s + np.arange(n + 1) * (size * bin_s)
    times[-1] = stop_s
    return Seconds(times[:-1], times[1:], np.median(rows[:, ::stride], axis=1), _lower_mean(change))


def _lower_mean(changes: FloatArray) -> FloatArray:
    """Return the mean of the smaller four fifths of each row: spikes left out, coarse steps averaged."""
    n = max(1, round(0.8 * changes.shape[1]))
    return np.asarray(np.sort(changes, axis=1)[:, :n].mean(axis=1))


def _stuck_runs(own: FloatArray, start_s: float, bin_s: float) -> Iterable[Stuck]:
    stride = max(1, int(0.2e-3 * STUCK_MS / bin_s))
    if not _equal_neighbours(own[::stride]).any():
        return
    for a, b in runs_of(_equal_neighbours(own)):
        if (b - a) * bin_s >= 1e-3 * STUCK_MS:
            yield Stuck(start_s + a * bin_s, start_s + (b + 1) * bin_s, float(own[a]))


def _equal_neighbours(values: FloatArray) -> BoolArray:
    """Return which values equal the next one but for the rounding of a mean."""
    return np.asarray(np.abs(values[1:] - values[:-1]) <= 1e-9 * (1.0 + np.abs(values[:-1])))
