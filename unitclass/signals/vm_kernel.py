"""The matched filter of a cell's mean spike, whitened by the noise between its spikes."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from unitclass.records import FloatArray, IntArray
from unitclass.signals.vm_bumps import Grid, quiet_mask
from unitclass.signals.vm_sample import Sample

SHAPE_DOUBT = 0.04
"""How far single spikes differ from the mean shape, as a share of its height: bounds the whitening."""


def matched_taps(sample: Sample, grid: Grid, centres: Sequence[IntArray], width_ms: float) -> tuple[FloatArray, int]:
    """Return the taps, centred on the spike's peak, and how many lie before the centre.

    They are scaled so that the mean spike scores its own height.

    Parameters
    ----------
    sample : Sample
        Blocks to learn from.
    grid : Grid
        The coarse bins.
    centres : sequence of ndarray
        Per block, the bins at which spikes were found.
    width_ms : float
        Their usual half-width.
    """
    before, after = grid.bins(max(1.2, 1.5 * width_ms)), grid.bins(max(2.5, 3.0 * width_ms))
    columns = np.arange(-before, after + 1)
    shift = int(np.argmax(_stacked(sample, centres, columns).mean(axis=0))) - before
    centres = [at + shift for at in centres]
    shape = _stacked(sample, centres, columns).mean(axis=0)
    return whitened(shape, _quiet_pieces(sample, grid, centres, columns), before), before


def whitened(shape: FloatArray, quiet: FloatArray, before: int) -> FloatArray:
    """Solve (noise covariance) taps = shape, blind to level and slope of the potential.

    Parameters
    ----------
    shape : ndarray, shape (n_taps,)
        Mean spike in mV.
    quiet : ndarray, shape (n_pieces, n_taps)
        Noise in mV.
    before : int
        Taps before the peak; the first half of them is the foot that height is taken from.
    """
    n = shape.size
    blind, _ = np.linalg.qr(np.stack([np.ones(n), np.linspace(-1.0, 1.0, n)], axis=1))
    height = float(shape.max() - shape[: max(1, before // 2)].mean())
    quiet = quiet - (quiet @ blind) @ blind.T
    covariance = np.eye(n) * (SHAPE_DOUBT * height) ** 2
    if quiet.shape[0] >= 3 * n:
        covariance += quiet.T @ quiet / quiet.shape[0]
    elif quiet.size:
        covariance += np.eye(n) * float(np.mean(quiet**2))
    seen = shape - blind @ (blind.T @ shape)
    taps = np.linalg.solve(covariance + blind @ blind.T * height**2, seen)
    taps -= blind @ (blind.T @ taps)
    return np.asarray(taps * (height / (taps @ shape)))


def _stacked(sample: Sample, centres: Sequence[IntArray], columns: IntArray) -> FloatArray:
    """Return coarse windows around the centres, shape (n_spikes, n_columns)."""
    parts = []
    for coarse, at in zip(sample.coarse, centres, strict=True):
        at = at[(at + columns[0] >= 0) & (at + columns[-1] < coarse.size)]
        parts.append(coarse[at[:, None] + columns])
    return np.concatenate(parts)


def _quiet_pieces(sample: Sample, grid: Grid, centres: Sequence[IntArray], columns: IntArray) -> FloatArray:
    """Return windows of the same length that no spike comes near, at most about 2000."""
    parts = []
    for coarse, at in zip(sample.coarse, centres, strict=True):
        starts = np.arange(0, coarse.size - columns.size, columns.size)
        starts = starts[:: max(1, starts.size * len(sample.coarse) // 2000)]
        free = quiet_mask(coarse.size, at, grid.bins(3.0), grid.bins(8.0))
        windows = starts[:, None] + np.arange(columns.size)
        parts.append(coarse[windows[np.all(free[windows], axis=1)]])
    return np.concatenate(parts)
