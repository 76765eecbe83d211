"""Chance-corrected agreement between reviewers: Cohen's kappa for two, Fleiss' for more."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from unitclass.records import FloatArray


@dataclass(frozen=True)
class Kappa:
    """Agreement beyond chance.

    `value` is 1 for perfect agreement and 0 for what chance would give; NaN where chance alone
    would agree always (everybody used one and the same type). `se` is the large-sample standard
    error (NaN for Fleiss' kappa), `observed` the share of agreeing pairs, `expected` that by chance.
    """

    value: float
    se: float
    n_units: int
    observed: float
    expected: float


def cohen_kappa(table: ArrayLike) -> Kappa:
    """Return Cohen's kappa [1]_ with its standard error for non-null agreement [2]_.

    Parameters
    ----------
    table : array_like, shape (n_types, n_types)
        Units by the first reviewer's type (rows) and the second's (columns).

    Raises
    ------
    ValueError
        If `table` is not square or holds negative or non-finite counts.

    References
    ----------
    .. [1] J. Cohen, A coefficient of agreement for nominal scales, Educ Psychol Meas 1960;20:37.
    .. [2] J. L. Fleiss, J. Cohen, B. S. Everitt, Large sample standard errors of kappa and weighted
       kappa, Psychol Bull 1969;72:323.
    """
    counts = _checked_table(table)
    n = counts.sum()
    if n == 0:
        return Kappa(math.nan, math.nan, 0, math.nan, math.nan)
    shares = counts / n
    observed = float(np.trace(shares))
    expected = float(shares.sum(axis=1) @ shares.sum(axis=0))
    if math.isclose(expected, 1.0):
        return Kappa(math.nan, math.nan, int(n), observed, expected)
    value = (observed - expected) / (1.0 - expected)
    return Kappa(value, _standard_error(shares, value, expected, float(n)), int(n), observed, expected)


def _standard_error(shares: FloatArray, value: float, expected: float, n: float) -> float:
    """Return the standard error of [2] in `cohen_kappa`, equation 13 for unit weights."""
    first, second = shares.sum(axis=1), shares.sum(axis=0)
    agreeing = np.sum(np.diag(shares) * (1 - (first + second) * (1 - value)) ** 2)
    # p_ij meets the second reviewer's share of i and the first's of j: the margins crossed.
    crossed = (second[:, None] + first[None, :]) ** 2
    differing = (1 - value) ** 2 * (np.sum(shares * crossed) - np.sum(np.diag(shares * crossed)))
    variance = agreeing + differing - (value - expected * (1 - value)) ** 2
    return math.sqrt(max(float(variance), 0.0) / n) / (1.0 - expected)


def fleiss_kappa(counts: ArrayLike) -> Kappa:
    """Return Fleiss' kappa for more than two reviewers [1]_.

    Parameters
    ----------
    counts : array_like, shape (n_units, n_types)
        How many reviewers gave the unit that type; every row has the same sum, at least 2.

    Raises
    ------
    ValueError
        If the rows do not all have the same sum of at least 2.

    References
    ----------
    .. [1] J. L. Fleiss, Measuring nominal scale agreement among many raters, Psychol Bull 1971;76:378.
    """
    table = np.asarray(counts, dtype=float)
    if table.ndim != 2:
        raise ValueError(f"counts must have shape (n_units, n_types), not {table.shape}")
    if table.shape[0] == 0:
        return Kappa(math.nan, math.nan, 0, math.nan, math.nan)
    raters = table.sum(axis=1)
    if raters[0] < 2 or not np.all(raters == raters[0]):
        raise ValueError("every unit needs opinions of the same number of reviewers, at least 2")
    m = raters[0]
    observed = float(np.mean((np.sum(table**2, axis=1) - m) / (m * (m - 1))))
    expected = float(np.sum((table.sum(axis=0) / table.sum()) ** 2))
    value = math.nan if math.isclose(expected, 1.0) else (observed - expected) / (1 - expected)
    return Kappa(value, math.nan, table.shape[0], observed, expected)


def _checked_table(table: ArrayLike) -> FloatArray:
    counts = np.asarray(table, dtype=float)
    if counts.ndim != 2 or counts.shape[0] != counts.shape[1]:
        raise ValueError(f"table must be square, not {counts.shape}")
    if not np.all(np.isfinite(counts)) or np.any(counts < 0):
        raise ValueError("table must hold finite counts of at least 0")
    return counts
