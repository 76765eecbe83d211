"""The fast way through a gzip-compressed dataset: whole chunks, decompressed in threads.

zlib releases the interpreter's lock, so chunks are decompressed on all cores and ahead of the
signal processing that consumes them. Only the plain pipeline of (shuffle and) gzip is handled;
anything else is read by h5py (`sample_blocks`), which is also this module's oracle in the tests.
"""

from __future__ import annotations

import os
import zlib
from collections import deque
from collections.abc import Iterator
from concurrent.futures import Future, ThreadPoolExecutor
from dataclasses import dataclass
from itertools import pairwise
from typing import Any

import h5py
import numpy as np
from numpy.typing import NDArray

_GZIP = (h5py.h5z.FILTER_DEFLATE,)
_SHUFFLE_GZIP = (h5py.h5z.FILTER_SHUFFLE, h5py.h5z.FILTER_DEFLATE)
MIN_CHUNK_BYTES = 16 * 1024
MAX_CHUNK_BYTES = 16 * 1024 * 1024


@dataclass(frozen=True)
class ChunkPlan:
    """How to take one column out of the chunks of a dataset of shape (n_samples[, n_columns])."""

    rows: int
    shape: tuple[int, ...]
    dtype: np.dtype[Any]
    is_shuffled: bool
    column: int

    @property
    def column_in_chunk(self) -> int:
        """Return the column's place within the chunk that holds it."""
        return self.column % self.shape[1] if len(self.shape) == 2 else 0

    def offset(self, row: int) -> tuple[int, ...]:
        """Return the coordinates of the chunk that holds `row` of the column."""
        first = row // self.rows * self.rows
        return (first,) if len(self.shape) == 1 else (first, self.column - self.column_in_chunk)


def chunk_plan(dataset: h5py.Dataset, column: int) -> ChunkPlan | None:
    """Return how to read `column` chunk by chunk, or None where the plain way must do."""
    if dataset.chunks is None or dataset.is_virtual or dataset.dtype.kind not in "iuf":
        return None
    creation = dataset.id.get_create_plist()
    filters = tuple(creation.get_filter(i)[0] for i in range(creation.get_nfilters()))
    size = int(np.prod(dataset.chunks)) * dataset.dtype.itemsize
    if filters not in (_GZIP, _SHUFFLE_GZIP) or not MIN_CHUNK_BYTES <= size <= MAX_CHUNK_BYTES:
        return None
    return ChunkPlan(dataset.chunks[0], dataset.chunks, dataset.dtype, filters == _SHUFFLE_GZIP, column)


def direct_blocks(dataset: h5py.Dataset, plan: ChunkPlan, borders: list[int]) -> Iterator[NDArray[Any]]:
    """Yield the column's raw samples between consecutive `borders`, decompressing one block ahead."""
    with ThreadPoolExecutor(max_workers=max(1, min(4, os.cpu_count() or 1))) as pool:
        ahead: deque[tuple[int, int, list[Future[NDArray[Any]]]]] = deque()
        for first, stop in pairwise(borders):
            starts = range(first // plan.rows * plan.rows, stop, plan.rows)
            ahead.append((first, stop, [_submitted(pool, dataset, plan, row) for row in starts]))
            if len(ahead) > 1:
                yield _assembled(plan, *ahead.popleft())
        while ahead:
            yield _assembled(plan, *ahead.popleft())


def _submitted(pool: ThreadPoolExecutor, dataset: h5py.Dataset, plan: ChunkPlan,
               row: int) -> Future[NDArray[Any]]:
    try:
        mask, packed = dataset.id.read_direct_chunk(plan.offset(row))
    except (OSError, RuntimeError, ValueError):  # never written: h5py gives the fill value
        mask, packed = 1, b""
    if mask == 0:
        return pool.submit(_unpacked, packed, plan)
    done: Future[NDArray[Any]] = Future()
    part = slice(row, row + plan.rows)
    done.set_result(dataset[part] if dataset.ndim == 1 else dataset[part, plan.column])
    return done


def _unpacked(packed: bytes, plan: ChunkPlan) -> NDArray[Any]:
    try:
        raw = zlib.decompress(packed)
    except zlib.error as error:
        raise OSError(f"a compressed chunk is damaged: {error}") from error
    if plan.is_shuffled:
        planes = np.frombuffer(raw, np.uint8).reshape(plan.dtype.itemsize, -1)
        samples = np.ascontiguousarray(planes.T).view(plan.dtype).reshape(plan.shape)
    else:
        samples = np.frombuffer(raw, plan.dtype).reshape(plan.shape)
    return samples if samples.ndim == 1 else samples[:, plan.column_in_chunk]


def _assembled(plan: ChunkPlan, first: int, stop: int, parts: list[Future[NDArray[Any]]]) -> NDArray[Any]:
    whole: NDArray[Any] = np.concatenate([part.result() for part in parts])
    skip = first % plan.rows
    return whole[skip : skip + stop - first]
