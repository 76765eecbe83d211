"""What eta squared would be with no modulation: each cycle shifted in time by its own amount.

A circular shift keeps all that a cycle's firing is (bursts, rate, refractoriness) and takes away
only where in the cycle it falls. On equal time fractions it is exact and needs no warping.
Shifts are shared by all units; the sum over cycles of shifted counts is then, frequency by
frequency, a product of one matrix of rotations with the units' spectra, and the spread of the
summed fractions follows from its spectrum by Parseval's theorem.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

from unitclass.records import BoolArray, FloatArray

CYCLES_AT_ONCE = 512
TIE = 1e-9
"""Null values this close (relative) count as ties, so the order of summation cannot matter."""


@dataclass(frozen=True)
class ShiftNull:
    """Eta squared of each unit, with and without the variance between cycles, and its probability.

    `eta_squared`, `eta_squared_within` and `p` have shape (n_units,), `null` (n_units, n_shifts):
    one-way eta squared of each shift. The probability serves both forms, whose order is the same.
    """

    eta_squared: FloatArray
    eta_squared_within: FloatArray
    p: FloatArray
    null: FloatArray


def shift_null(counts: ArrayLike, n_shifts: int, seed: int, *, cycle_s: ArrayLike | None = None,
               used: ArrayLike | None = None) -> ShiftNull:
    """Return eta squared on rates and its null from circular shifts in time.

    Eta squared is the share of the variance of rate over (cycle, fraction) cells that lies between
    fractions [1]_. The probability is (1 + shifts at least as great) / (1 + n_shifts). A unit's
    result does not depend on which others are given, nor on the number of threads. All is NaN with
    fewer than two cycles or without spikes.

    Parameters
    ----------
    counts : array_like, shape (n_units, n_cycles, n_fractions)
        Spikes per equal time fraction of each cycle.
    n_shifts : int
        Shifts, shared by the units.
    seed : int
        Of the shifts.
    cycle_s : array_like, shape (n_cycles,), optional
        Durations; counts become rates. None takes all as equally long.
    used : array_like of bool, shape (n_units, n_cycles), optional
        Cycles that count for each unit; None means all.

    Raises
    ------
    ValueError
        If `counts` is not 3-D or `n_shifts` is not positive.

    References
    ----------
    .. [1] J. Orem, T. Dick, "Consistency and signal strength of respiratory neuronal activity",
       J. Neurophysiol. 50 (1983) 1098.
    """
    cells: NDArray[Any] = np.asarray(counts)
    if cells.ndim != 3 or n_shifts < 1:
        raise ValueError(f"counts must be (units, cycles, fractions), not {cells.shape}; n_shifts must be positive")
    n_units, n_cycles, n_fractions = cells.shape
    is_used = np.ones((n_units, n_cycles), bool) if used is None else np.asarray(used, dtype=bool)
    seconds = np.ones(n_cycles) if cycle_s is None else np.asarray(cycle_s, dtype=float)
    spread, within, summed = _variances(cells, is_used, n_fractions / seconds)
    power = _shifted_power(cells, is_used, n_fractions / seconds, n_shifts, np.random.default_rng(seed))
    n_used = is_used.sum(axis=1)
    spread[n_used < 2] = 0.0
    with np.errstate(invalid="ignore", divide="ignore"):
        between = _power(summed) / n_used
        null = np.where(spread > 0, power / n_used / spread, np.nan).T
        eta = np.where(spread > 0, between / spread, np.nan)
        eta_within = np.where(within > 0, between / within, np.nan)
    p = (1 + np.count_nonzero(null >= (eta * (1 - TIE))[:, None], axis=1)) / (1 + n_shifts)
    return ShiftNull(eta, eta_within, np.where(np.isnan(eta), np.nan, p), null)


def _variances(cells: NDArray[Any], is_used: BoolArray,
               scale: FloatArray) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Return the total sum of squares, that within cycles, and the summed rates (n_units, n_fractions)."""
    n_units, _, k = cells.shape
    total, within, summed = np.zeros(n_units), np.zeros(n_units), np.zeros((n_units, k))
    for unit in range(n_units):
        rates = (cells[unit] * scale[:, None])[is_used[unit]]
        if len(rates):
            total[unit] = np.sum((rates - rates.mean()) ** 2)
            within[unit] = np.sum((rates - rates.mean(axis=1, keepdims=True)) ** 2)
            summed[unit] = rates.sum(axis=0)
    return total, within, summed


def _power(summed: FloatArray) -> FloatArray:
    return np.sum((summed - summed.mean(axis=1, keepdims=True)) ** 2, axis=1)


def _shifted_power(cells: NDArray[Any], is_used: BoolArray, scale: FloatArray, n_shifts: int,
                   rng: np.random.Generator) -> FloatArray:
    """Return the summed squares between shifted sums, shape (n_shifts, n_units)."""
    n_units, n_cycles, k = cells.shape
    frequencies = range(1, k // 2 + 1)
    spectrum = np.zeros((k // 2, n_shifts, n_units), dtype=complex)
    turns = np.exp(-2j * np.pi * np.arange(k) / k)
    for first in range(0, n_cycles, CYCLES_AT_ONCE):
        block = slice(first, first + CYCLES_AT_ONCE)
        weight = scale[block] * is_used[:, block]
        transformed = np.fft.rfft(cells[:, block] * weight[:, :, None], axis=2)
        shift = rng.integers(0, k, size=(n_shifts, weight.shape[1]))
        for q in frequencies:
            spectrum[q - 1] += turns[shift * q % k] @ np.ascontiguousarray(transformed[:, :, q].T)
    # Each frequency stands for its mirror image too, but for the highest of an even number.
    mirrored = np.array([1.0 if 2 * q == k else 2.0 for q in frequencies])
    return np.tensordot(mirrored, np.abs(spectrum) ** 2, axes=1) / k
