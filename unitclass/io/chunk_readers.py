"""Streaming readers: small frozen records that open the file when asked and hold no handle."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from math import ceil, inf
from typing import Any

import h5py
import numpy as np
from numpy.typing import NDArray

from unitclass.errors import FileError
from unitclass.io.hdf5 import opened
from unitclass.io.sample_blocks import column_blocks, scaled
from unitclass.records import Chunk, ChunkReader, FloatArray

_SLACK = 1e-6  # of a sample: times asked for are rounded decimals


@dataclass(frozen=True)
class Column:
    """One column of one dataset and how its numbers become the physical unit.

    Physical value = number × gain + offset. `column` is ignored when the dataset has one dimension.
    """

    path: str
    dataset: str
    column: int = 0
    gain: float = 1.0
    offset: float = 0.0
    time_axis: int = 0


@dataclass(frozen=True)
class Stretch:
    """Samples `first` up to `stop`, evenly spaced; the first one is at `start_s`."""

    first: int
    stop: int
    start_s: float


@dataclass(frozen=True)
class EvenChunks:
    """Reads the evenly sampled stretches of one column; a new stretch is a gap."""

    source: Column
    rate_hz: float
    stretches: tuple[Stretch, ...]

    def chunks(self, start_s: float = -inf, stop_s: float = inf) -> Iterator[Chunk]:
        """Yield the samples with start_s <= time < stop_s, some seconds at a time."""
        wanted = [(s, *_window(s, self.rate_hz, start_s, stop_s)) for s in self.stretches]
        wanted = [(s, first, stop) for s, first, stop in wanted if stop > first]
        if not wanted:
            return
        with opened(self.source.path) as file:
            data = _dataset(file, self.source.dataset, self.source.path)
            for stretch, first, stop in wanted:
                yield from self._of(data, stretch, first, stop)

    def _of(self, data: h5py.Dataset, stretch: Stretch, first: int, stop: int) -> Iterator[Chunk]:
        for i, values in _values(data, self.source, first, stop):
            yield Chunk(stretch.start_s + (i - stretch.first) / self.rate_hz, values)


def _window(stretch: Stretch, rate_hz: float, start_s: float, stop_s: float) -> tuple[int, int]:
    first, stop = stretch.first, stretch.stop
    if start_s > -inf:
        first = max(first, stretch.first + ceil((start_s - stretch.start_s) * rate_hz - _SLACK))
    if stop_s < inf:
        stop = min(stop, stretch.first + ceil((stop_s - stretch.start_s) * rate_hz - _SLACK))
    return first, stop


@dataclass(frozen=True)
class UnevenChunks:
    """Reads an unevenly sampled column by linear interpolation on an even grid.

    The grid of each stretch starts at its first sample; `stretches` end where the samples leave a gap.
    """

    source: Column
    timestamps: str
    rate_hz: float
    stretches: tuple[Stretch, ...]

    def chunks(self, start_s: float = -inf, stop_s: float = inf) -> Iterator[Chunk]:
        """Yield the resampled values with start_s <= time < stop_s."""
        with opened(self.source.path) as file:
            data = _dataset(file, self.source.dataset, self.source.path)
            times = _dataset(file, self.timestamps, self.source.path)
            for stretch in self.stretches:
                if stretch.start_s < stop_s:
                    yield from self._of(data, times, stretch, start_s, stop_s)

    def _of(self, data: h5py.Dataset, times: h5py.Dataset, stretch: Stretch, start_s: float,
            stop_s: float) -> Iterator[Chunk]:
        next_point = _grid_points(start_s, stretch, self.rate_hz)
        held_t, held_v = np.empty(0), np.empty(0)
        for first, values in _values(data, self.source, stretch.first, stretch.stop):
            last = first + values.size
            t = np.concatenate([held_t, times[first:last]])
            v = np.concatenate([held_v, values])
            n_points = _grid_points(min(t[-1], stop_s), stretch, self.rate_hz)
            if last == stretch.stop and t[-1] < stop_s:
                n_points = int((t[-1] - stretch.start_s) * self.rate_hz + _SLACK) + 1  # its last sample
            if n_points > next_point:
                grid = stretch.start_s + np.arange(next_point, n_points) / self.rate_hz
                yield Chunk(float(grid[0]), _interpolated(grid, t, v))
                next_point = n_points
            if t[-1] >= stop_s:
                return
            held_t, held_v = t[-1:], v[-1:]


def _values(data: h5py.Dataset, source: Column, first: int, stop: int) -> Iterator[tuple[int, NDArray[Any]]]:
    for i, raw in column_blocks(data, source.column, first, stop, time_axis=source.time_axis):
        yield i, scaled(raw, source.gain, source.offset)


def _grid_points(before_s: float, stretch: Stretch, rate_hz: float) -> int:
    """Return how many points of the stretch's even grid lie before a moment."""
    return 0 if before_s == -inf else max(0, ceil((before_s - stretch.start_s) * rate_hz - _SLACK))


def _interpolated(grid: FloatArray, t: FloatArray, v: FloatArray) -> FloatArray:
    is_new = np.concatenate([[True], np.diff(t) > 0])  # a repeated time stamp adds nothing
    return np.asarray(np.interp(grid, t[is_new], v[is_new]))


@dataclass(frozen=True)
class JoinedChunks:
    """Several readers that follow each other in time, such as the sweeps of one electrode."""

    parts: tuple[ChunkReader, ...]

    def chunks(self, start_s: float = -inf, stop_s: float = inf) -> Iterator[Chunk]:
        """Yield the samples of every part in turn."""
        for part in self.parts:
            yield from part.chunks(start_s, stop_s)


def _dataset(file: h5py.File, name: str, path: str) -> h5py.Dataset:
    found = file.get(name)
    if not isinstance(found, h5py.Dataset):
        raise FileError(f"{name} is no longer there", where=path, remedy="the file changed: start again")
    return found
