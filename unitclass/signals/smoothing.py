"""Centred smoothers on an even grid that respect gaps: none of them delays anything."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from unitclass.records import BoolArray, FloatArray


def boxcar(values: FloatArray, width: int) -> FloatArray:
    """Return the centred moving mean over `width` samples, shape (n_samples,).

    NaN samples are left out of the mean; where a window holds none but NaN the result is NaN. At
    the edges the window is cut, not padded. An even width is made odd.
    """
    half = max(0, int(width) // 2)
    if half == 0:
        return np.asarray(values, dtype=float)
    present = np.isfinite(values)
    total = _window_sum(np.where(present, values, 0.0), half)
    if present.all():
        return total / _window_length(values.size, half)
    count = _window_sum(present.astype(float), half)
    with np.errstate(invalid="ignore", divide="ignore"):
        return np.where(count > 0.5, total / count, np.nan)


def smooth(values: FloatArray, width: float) -> FloatArray:
    """Return `values` under a centred triangular window whose noise equals a box of `width` samples.

    Two boxes of 2/3 of the width: the sum of squared weights of a triangle of half-width h is
    2/(3h), so it averages noise like a box of 1.5 h.
    """
    box = int(2 * round((2.0 / 3.0 * width - 1) / 2) + 1)
    if box < 3:
        return np.array(values, dtype=float)
    return boxcar(boxcar(values, box), box)


def filled(values: FloatArray) -> FloatArray:
    """Return `values` with NaN bridged by straight lines (all zero when everything is NaN)."""
    present = np.isfinite(values)
    if present.all():
        return np.asarray(values, dtype=float)
    if not present.any():
        return np.zeros(values.size)
    at = np.arange(values.size)
    return np.interp(at, at[present], values[present])


def runs(flags: BoolArray) -> NDArray[np.int64]:
    """Return first and one-past-last index of every run of true, shape (n_runs, 2)."""
    padded = np.concatenate([[False], flags, [False]])
    edges = np.flatnonzero(padded[1:] != padded[:-1])
    return edges.reshape(-1, 2).astype(np.int64)


def widened(flags: BoolArray, n: int) -> BoolArray:
    """Return `flags` with every true run grown by `n` samples on both sides."""
    if n <= 0 or not flags.any():
        return flags
    return _window_sum(flags.astype(float), n) > 0.5


def _window_sum(values: FloatArray, half: int) -> FloatArray:
    n = values.size
    half = min(half, n)
    total = np.empty(n + 2 * half + 1)  # the running sum, held at its ends: windows are cut there
    total[: half + 1] = 0.0
    np.cumsum(values, out=total[half + 1 : half + 1 + n])
    total[half + 1 + n :] = total[half + n]
    return total[2 * half + 1 :] - total[:n]


def _window_length(n: int, half: int) -> FloatArray:
    length = np.full(n, min(2 * half + 1, n), dtype=float)
    at = np.arange(min(half, n))  # windows are cut at the ends only
    length[: at.size] = np.minimum(at + half + 1, n)
    length[n - at.size :] = np.minimum(length[n - at.size :], np.minimum(at + half + 1, n)[::-1])
    return length
