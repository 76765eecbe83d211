"""A membrane potential streamed in blocks of one fixed length, whatever chunks its reader gives.

Blocks start on the same samples however the file is chunked, so results cannot depend on it. Each
carries a margin on both sides: an event near a border is seen whole, and counted once.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from math import inf

import numpy as np

from unitclass.records import Chunk, ChunkReader, FloatArray


@dataclass(frozen=True)
class Block:
    """Consecutive samples with margins.

    Attributes
    ----------
    start_s : float
        Session time of `values[0]`.
    values : ndarray, shape (n_samples,)
        The block with `first` samples of margin before and the rest after `last`. Beyond the
        ends of a stretch the margin repeats the end value.
    first, last : int
        `values[first:last]` are the block's own samples.
    missing_s : tuple of (start, stop)
        Where own samples were not finite; `values` holds the value before them instead.
    """

    start_s: float
    values: FloatArray
    first: int
    last: int
    missing_s: tuple[tuple[float, float], ...] = ()


@dataclass(frozen=True)
class BlockPlan:
    """Samples per block and per margin, at `rate_hz`."""

    rate_hz: float
    own: int
    margin: int


def blocks(reader: ChunkReader, plan: BlockPlan, start_s: float = -inf, stop_s: float = inf) -> Iterator[Block]:
    """Yield the samples with start_s <= time < stop_s in blocks of `plan.own`, in order.

    The last block of a stretch may be shorter. A gap starts a new stretch.
    """
    stretch: _Stretch | None = None
    for chunk in reader.chunks(start_s, stop_s):
        if chunk.values.size == 0:
            continue
        if stretch is not None and abs(chunk.start_s - stretch.end_s) > 0.5 / plan.rate_hz:
            yield from stretch.rest()
            stretch = None
        stretch = stretch or _Stretch(plan, chunk)
        yield from stretch.take(chunk)
    if stretch is not None:
        yield from stretch.rest()


class _Stretch:
    """Samples of one stretch that wait for their margin."""

    def __init__(self, plan: BlockPlan, chunk: Chunk) -> None:
        self.plan = plan
        self.held = np.full(plan.margin, _first_finite(chunk.values))
        self.waiting: list[FloatArray] = [self.held]
        self.n_waiting = plan.margin
        self.end_s = chunk.start_s

    def take(self, chunk: Chunk) -> Iterator[Block]:
        """Add a chunk and yield every block that is complete with its margin."""
        self.end_s = chunk.start_s + chunk.values.size / self.plan.rate_hz
        self.waiting.append(chunk.values)
        self.n_waiting += chunk.values.size
        whole = self.plan.own + 2 * self.plan.margin
        if self.n_waiting < whole:
            return
        values = np.concatenate(self.waiting)
        at = 0
        while values.size - at >= whole:
            yield self._block(values[at : at + whole], self.end_s - (values.size - at) / self.plan.rate_hz)
            at += self.plan.own
        self.waiting = [values[at:]]
        self.n_waiting = values.size - at

    def rest(self) -> Iterator[Block]:
        """Yield what is left, its margin after the end filled with the last value."""
        values = np.concatenate(self.waiting)
        start_s = self.end_s - values.size / self.plan.rate_hz
        margin = self.plan.margin
        if values.size <= margin:
            return
        values = np.concatenate([values, np.full(margin, _first_finite(values[::-1]))])
        for at in range(0, values.size - 2 * margin, self.plan.own):
            part = values[at : at + self.plan.own + 2 * margin]
            yield self._block(part, start_s + at / self.plan.rate_hz)

    def _block(self, values: FloatArray, start_s: float) -> Block:
        first, last = self.plan.margin, values.size - self.plan.margin
        if np.isfinite(values.sum()):
            return Block(start_s, values, first, last)
        bad = ~np.isfinite(values)
        runs = runs_of(bad[first:last])
        missing = tuple((start_s + (first + a) / self.plan.rate_hz, start_s + (first + b) / self.plan.rate_hz)
                        for a, b in runs)
        return Block(start_s, _filled(values, bad), first, last, missing)


def _first_finite(values: FloatArray) -> float:
    finite = values[np.isfinite(values)]
    return float(finite[0]) if finite.size else 0.0


def _filled(values: FloatArray, bad: np.ndarray) -> FloatArray:
    """Return a copy where the good value before stands in for each bad one."""
    source = np.maximum.accumulate(np.where(bad, -1, np.arange(values.size)))
    start = _first_finite(values)
    return np.where(source < 0, start, values[np.maximum(source, 0)])


def runs_of(mask: np.ndarray) -> list[tuple[int, int]]:
    """Return the half-open index ranges where `mask` is true."""
    edges = np.flatnonzero(np.diff(np.concatenate([[False], mask, [False]]).astype(np.int8)))
    return [(int(a), int(b)) for a, b in zip(edges[::2], edges[1::2], strict=True)]
