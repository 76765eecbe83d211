"""One column of a dataset, a few hundred thousand samples at a time."""

from __future__ import annotations

from collections.abc import Iterator
from itertools import pairwise
from typing import Any

import h5py
import numpy as np
from numpy.typing import NDArray

from unitclass.io.direct_chunks import chunk_plan, direct_blocks

BLOCK_SAMPLES = 2**18
BLOCK_BYTES = 2**23
_FEW_COLUMNS = 32


def column_blocks(dataset: h5py.Dataset, column: int, first: int, stop: int, *, time_axis: int = 0,
                  is_direct: bool = True) -> Iterator[tuple[int, NDArray[Any]]]:
    """Yield (index of the first sample, samples) of one column from `first` up to `stop`.

    Blocks end on borders of the dataset's own chunks, so that no chunk is decompressed twice.

    Parameters
    ----------
    dataset : h5py.Dataset
        Shape (n_samples,), (n_samples, n_columns), or its transpose with `time_axis` 1.
    column : int
        Column number; ignored for a dataset of one dimension.
    is_direct : bool
        Whether gzip chunks may be decompressed in threads; the samples are the same.
    """
    borders = block_borders(first, stop, _rows_per_block(dataset, time_axis))
    plan = chunk_plan(dataset, column) if is_direct and time_axis == 0 and len(borders) > 2 else None
    if plan is not None:
        blocks = direct_blocks(dataset, plan, borders)
    else:
        blocks = (column_part(dataset, column, a, b, time_axis=time_axis) for a, b in pairwise(borders))
    for start, samples in zip(borders[:-1], blocks, strict=True):
        yield from _pieces(start, samples)


def block_borders(first: int, stop: int, rows: int) -> list[int]:
    """Return `first`, every multiple of `rows` between, and `stop`; one number when nothing is asked."""
    if stop <= first:
        return [first]
    return [first, *range((first // rows + 1) * rows, stop, rows), stop]


def column_part(dataset: h5py.Dataset, column: int, first: int, stop: int, *,
                time_axis: int = 0) -> NDArray[Any]:
    """Return one column's samples first:stop, shape (stop - first,), in the type they are stored in."""
    if dataset.ndim == 1:
        part = dataset[first:stop]
    elif time_axis == 1:
        part = dataset[column, first:stop]
    elif dataset.chunks is None and dataset.shape[1] <= _FEW_COLUMNS:
        part = dataset[first:stop][:, column]  # one sweep over memory beats a strided selection
    else:
        part = dataset[first:stop, column]
    return np.asarray(part)


def scaled(raw: NDArray[Any], gain: float, offset: float) -> NDArray[Any]:
    """Return raw × gain + offset as new float32 (for up to 16 bits or single precision) or float64."""
    is_small = raw.dtype.itemsize <= 2 or (raw.dtype.kind == "f" and raw.dtype.itemsize <= 4)
    values: NDArray[Any] = raw.astype(np.float32 if is_small else np.float64)
    if gain != 1.0:
        values *= values.dtype.type(gain)
    if offset != 0.0:
        values += values.dtype.type(offset)
    return values


def _rows_per_block(dataset: h5py.Dataset, time_axis: int) -> int:
    width = 1 if dataset.ndim == 1 else dataset.shape[1 - time_axis]
    read_columns = min(width, _FEW_COLUMNS) if dataset.chunks is None else width
    rows = max(1024, min(BLOCK_SAMPLES, BLOCK_BYTES // (read_columns * dataset.dtype.itemsize)))
    own = dataset.chunks[time_axis] if dataset.chunks else 1
    return int(own if own >= rows else rows // own * own)


def _pieces(start: int, samples: NDArray[Any]) -> Iterator[tuple[int, NDArray[Any]]]:
    """Cut what a dataset with enormous chunks of its own gives into blocks of the usual size."""
    for i in range(0, samples.size, 4 * BLOCK_SAMPLES):
        yield start + i, samples[i : i + 4 * BLOCK_SAMPLES]
