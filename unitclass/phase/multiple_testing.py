"""Correction for looking at many units."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike

from unitclass.records import FloatArray


def benjamini_hochberg(p: ArrayLike) -> FloatArray:
    """Return the q-value of each p [1]_, shape (n_units,): rejecting q <= a keeps the false share at a.

    NaN stays NaN and is not counted as a test.

    Raises
    ------
    ValueError
        If `p` is not 1-D or a value lies outside [0, 1].

    References
    ----------
    .. [1] Y. Benjamini, Y. Hochberg, J. R. Stat. Soc. B 57 (1995) 289.
    """
    given = np.asarray(p, dtype=float)
    known = np.flatnonzero(~np.isnan(given))
    values = given[known]
    if given.ndim != 1 or np.any((values < 0) | (values > 1)):
        raise ValueError("p must be one row of probabilities between 0 and 1")
    falling = np.argsort(-values, kind="stable")
    rank = np.arange(values.size, 0, -1)
    q = np.full(given.shape, np.nan)
    q[known[falling]] = np.minimum(np.minimum.accumulate(values[falling] * values.size / rank), 1.0)
    return q
