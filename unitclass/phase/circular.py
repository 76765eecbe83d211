"""Circular statistics of spike phase: Rayleigh, Kuiper, Watson, Rao.

They treat spikes as independent, which spikes within a burst are not: descriptive here. Give
them exposure-equalised phase (`equalised_turns`), on which a steady cell is uniform.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from unitclass.records import FloatArray

EXACT_BELOW = 100
"""Samples up to which the Rayleigh test is exact."""


@dataclass(frozen=True)
class Resultant:
    """Mean direction in radians, [0, 2 pi), mean resultant length, [0, 1], of n directions."""

    angle: float
    length: float
    n: int


@dataclass(frozen=True)
class Kuiper:
    """Kuiper's V, its sample-size corrected V*, and the probability of V* under uniformity."""

    v: float
    v_star: float
    p: float


@dataclass(frozen=True)
class Watson:
    """Watson's U squared and its sample-size corrected form (5 % critical value 0.187)."""

    u2: float
    u2_star: float


def equalised_turns(phase: FloatArray, exposure_s: FloatArray) -> FloatArray:
    """Return phases as turns, [0, 1), stretched so that each second of exposure takes equal room.

    Parameters
    ----------
    phase : ndarray, shape (n_spikes,)
        Canonical phase.
    exposure_s : ndarray, shape (n_bins,)
        Seconds observed per phase bin.
    """
    before = np.append(0.0, np.cumsum(exposure_s))
    place = phase * (exposure_s.size / 2)
    bins = np.minimum(place.astype(np.int64), exposure_s.size - 1)
    turns = (before[bins] + (place - bins) * exposure_s[bins]) / before[-1]
    return np.minimum(turns, 1 - 2**-50)


def canonical_phase(turn: float, exposure_s: FloatArray) -> float:
    """Return the canonical phase of one equalised turn; undoes `equalised_turns`."""
    before = np.append(0.0, np.cumsum(exposure_s))
    edges = np.linspace(0.0, 2.0, before.size)
    return float(np.interp(turn * before[-1], before, edges) % 2.0)


def resultant(angles: ArrayLike) -> Resultant:
    """Return the mean direction and resultant length of angles in radians, shape (n,); NaN without any."""
    a = np.asarray(angles, dtype=float)
    if not a.size:
        return Resultant(np.nan, np.nan, 0)
    c, s = np.cos(a).sum(), np.sin(a).sum()
    return Resultant(float(np.arctan2(s, c) % (2 * np.pi)), float(min(np.hypot(c, s) / a.size, 1.0)), a.size)


def rayleigh_p(n: int, length: float) -> float:
    """Return the probability of a mean resultant length as great, were n directions uniform.

    Exact [1]_ for 5 to 100 directions: p = 1 - R int J1(R t) J0(t)^n dt. Otherwise, and where
    that integral drowns in rounding (p below 1e-10), the approximation of [2]_, which there errs
    to the safe side: p = exp(sqrt(1 + 4 n + 4 (n^2 - R^2)) - (1 + 2 n)).

    References
    ----------
    .. [1] Lord Rayleigh, Phil. Mag. 37 (1919) 321; K. V. Mardia, P. E. Jupp, *Directional
       Statistics*, Wiley, 2000, section 4.4.
    .. [2] D. Wilkie, "Rayleigh test for randomness of circular data", Appl. Stat. 32 (1983) 311.
    """
    if n < 1:
        return np.nan
    wilkie = rayleigh_p_wilkie(n, length)
    if not 5 <= n <= EXACT_BELOW or wilkie < 1e-10:
        return wilkie
    exact = _rayleigh_integral(n, n * length)
    return wilkie if exact < 1e-10 else min(exact, 1.0)


def rayleigh_p_wilkie(n: int, length: float) -> float:
    """Return Wilkie's approximation to the Rayleigh probability; see `rayleigh_p`."""
    total = n * length
    return float(min(np.exp(np.sqrt(1 + 4 * n + 4 * (n**2 - total**2)) - (1 + 2 * n)), 1.0))


def kuiper(turns: ArrayLike) -> Kuiper:
    """Return Kuiper's test of uniformity for turns in [0, 1), shape (n,).

    V* = V (sqrt(n) + 0.155 + 0.24 / sqrt(n)) and its asymptotic probability [1]_; NaN without any.

    References
    ----------
    .. [1] M. A. Stephens, J. R. Stat. Soc. B 32 (1970) 115.
    """
    return kuiper_of_sorted(np.sort(np.asarray(turns, dtype=float)))


def kuiper_of_sorted(turns: FloatArray) -> Kuiper:
    """Return Kuiper's test for ascending turns."""
    n = turns.size
    if not n:
        return Kuiper(np.nan, np.nan, np.nan)
    excess = np.arange(1, n + 1) / n - turns
    v = float(excess.max() - excess.min() + 1 / n)
    v_star = v * (np.sqrt(n) + 0.155 + 0.24 / np.sqrt(n))
    return Kuiper(v, float(v_star), _kuiper_p(float(v_star)))


def watson(turns: ArrayLike) -> Watson:
    """Return Watson's U squared for turns in [0, 1), shape (n,); NaN without any.

    U2* = (U2 - 0.1/n + 0.1/n^2)(1 + 0.8/n) (M. A. Stephens 1970, as for `kuiper`).
    """
    return watson_of_sorted(np.sort(np.asarray(turns, dtype=float)))


def watson_of_sorted(turns: FloatArray) -> Watson:
    """Return Watson's U squared for ascending turns."""
    n = turns.size
    if not n:
        return Watson(np.nan, np.nan)
    gap = turns - (np.arange(n) + 0.5) / n
    u2 = float(gap @ gap - n * gap.mean() ** 2 + 1 / (12 * n))
    return Watson(u2, (u2 - 0.1 / n + 0.1 / n**2) * (1 + 0.8 / n))


def rao_spacing(turns: ArrayLike) -> float:
    """Return Rao's spacing statistic in degrees for turns in [0, 1), shape (n,).

    Half the summed departure of the gaps from 360/n (J. S. Rao, Sankhya B 38 (1976) 329).
    """
    ordered = np.sort(np.asarray(turns, dtype=float))
    if not ordered.size:
        return np.nan
    gaps = np.diff(ordered, append=ordered[0] + 1)
    return float(180.0 * np.abs(gaps - 1 / ordered.size).sum())


def _kuiper_p(v_star: float) -> float:
    if v_star < 0.4:
        return 1.0
    j = np.arange(1, 101)
    x = (j * v_star) ** 2
    return float(np.clip(2 * np.sum((4 * x - 1) * np.exp(-2 * x)), 0.0, 1.0))


def _rayleigh_integral(n: int, total: float) -> float:
    """Integrate panel by panel with Gauss and Legendre's rule, as far as J0(t)^n matters."""
    from scipy.special import j0, j1

    # |J0(t)| < sqrt(2 / (pi t)): beyond `reach` the tail is below rounding (or t = 4000).
    reach = min(4000.0, max(8.0, 10 ** (26 / (n - 1))))
    nodes, weights = np.polynomial.legendre.leggauss(32)
    starts = np.arange(0.0, reach, 0.5)[:, None]
    t = starts + 0.25 * (nodes + 1)
    return float(1 - total * 0.25 * np.sum(weights * j1(total * t) * j0(t) ** n))
