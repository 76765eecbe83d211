"""Shape groups: units that fire alike, whatever the templates say.

Rates are variance-stabilised (square root), smoothed, scaled to unit length and reduced to a
few principal components; a Gaussian mixture is fitted with the number of groups that the
Bayesian information criterion chooses [1]_. How far the groups can be believed is told by
fitting again to units drawn with replacement: the adjusted Rand index [2]_ over all units, and
for each group how much of it comes together again [3]_.

References
----------
.. [1] G. Schwarz, "Estimating the dimension of a model", Ann Stat 6:461, 1978.
.. [2] L. Hubert, P. Arabie, "Comparing partitions", J Classif 2:193, 1985.
.. [3] C. Hennig, "Cluster-wise assessment of cluster stability", Comput Stat Data Anal 52:258, 2007.
"""

from __future__ import annotations

from collections import Counter
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np

from unitclass.records import OTHER, FloatArray, IntArray

KERNEL = np.array([1.0, 2.0, 3.0, 2.0, 1.0]) / 9.0  # smooths over five bins
KEPT_VARIANCE, MOST_COMPONENTS = 0.95, 8
MOST_GROUPS, UNITS_A_GROUP = 20, 6
FLAT = 1e-3  # noise floor of the covariance: groups of near-identical units stay groups
N_STARTS, SEED = 4, 7
EXPLAINED = 0.5  # share of a group that one type must hold to explain it


@dataclass(frozen=True)
class ShapeGroup:
    """One group of units that fire alike.

    Attributes
    ----------
    name : str
        "G1", "G2", ... in the order of the phase at which they fire most.
    n_units : int
    mean_rate : ndarray, shape (n_bins,)
        Mean profile, each unit scaled to a mean of 1.
    stability : float
        Mean Jaccard overlap with the best group of each repetition; 1 when it always comes back.
    types : tuple of (type, share)
        Suggested types of its units, the commonest first.
    """

    name: str
    n_units: int
    mean_rate: FloatArray
    stability: float
    types: tuple[tuple[str, float], ...]

    @property
    def is_explained(self) -> bool:
        """Return whether one type, and not "other", holds most of the group."""
        return self.types[0][0] != OTHER and self.types[0][1] >= EXPLAINED


@dataclass(frozen=True)
class ShapeGroups:
    """All groups.

    Attributes
    ----------
    names : tuple of str, length n_units
        The group of each unit; empty for all when there are too few to group.
    stability : float
        Mean adjusted Rand index over repetitions.
    agreement : float
        Adjusted Rand index between groups and suggested types.
    criterion : Mapping of int to float
        Number of groups to its Bayesian information criterion; the lowest was taken.
    """

    names: tuple[str, ...]
    groups: tuple[ShapeGroup, ...]
    stability: float
    agreement: float
    criterion: dict[int, float]


def shape_groups(rate_hz: FloatArray, types: Sequence[str], *, n_repetitions: int = 30) -> ShapeGroups:
    """Return the shape groups of units.

    Parameters
    ----------
    rate_hz : ndarray, shape (n_units, n_bins)
        Rates by phase; NaN where nothing was observed.
    types : sequence of str, length n_units
        Suggested types, to compare with.
    n_repetitions : int
        Refits on units drawn with replacement.

    Returns
    -------
    ShapeGroups
        Without groups where there are fewer than two times UNITS_A_GROUP units.
    """
    if len(rate_hz) < 2 * UNITS_A_GROUP:
        return ShapeGroups(("",) * len(rate_hz), (), np.nan, np.nan, {})
    from sklearn.metrics import adjusted_rand_score

    rate = relative_rates(rate_hz)
    points, mixture, criterion, number = _grouped(rate)
    repeated = _repeated(points, mixture.n_components, n_repetitions)
    groups = tuple(_group(k, number, rate, types, repeated) for k in range(int(number.max()) + 1))
    return ShapeGroups(_names(number), groups, float(np.mean([adjusted_rand_score(number, r) for r in repeated])),
                       float(adjusted_rand_score(list(types), number)), criterion)


def group_names(rate_hz: FloatArray) -> tuple[str, ...]:
    """Return the names that `shape_groups` gives, without asking how far they can be believed."""
    if len(rate_hz) < 2 * UNITS_A_GROUP:
        return ("",) * len(rate_hz)
    return _names(_grouped(relative_rates(rate_hz))[-1])


def _grouped(rate: FloatArray) -> tuple[FloatArray, Any, dict[int, float], IntArray]:
    """Return the units as points, the mixture chosen, its criterion, and each unit's group from 0."""
    points = components(rate)
    mixture, criterion = _chosen(points)
    return points, mixture, criterion, _in_order(mixture.predict(points), rate)


def _names(number: IntArray) -> tuple[str, ...]:
    return tuple(f"G{k + 1}" for k in number)


def components(rate: FloatArray) -> FloatArray:
    """Return each unit's shape, rates of shape (n_units, n_bins), as a few numbers, shape (n_units, n_components)."""
    shape = np.sqrt(np.maximum(_smoothed(rate), 0.0))
    shape = shape / np.maximum(np.linalg.norm(shape, axis=1, keepdims=True), 1e-12)
    centred = shape - shape.mean(axis=0)
    left, size, _ = np.linalg.svd(centred, full_matrices=False)
    share = np.cumsum(size**2) / max(float((size**2).sum()), 1e-300)
    n = min(int(np.searchsorted(share, KEPT_VARIANCE)) + 1, MOST_COMPONENTS, size.size)
    return np.asarray(left[:, :n] * size[:n])


def relative_rates(rate_hz: FloatArray) -> FloatArray:
    """Return rates scaled to a mean of 1; bins never observed take the unit's mean.

    They are taken as exactly as results are kept, so that units fresh and from the cache group alike.
    """
    rate = np.asarray(rate_hz, dtype=np.float32).astype(float)
    mean = np.nanmean(rate, axis=1, keepdims=True)
    return np.asarray(np.where(np.isnan(rate), 1.0, rate / np.maximum(mean, 1e-12)))


def _smoothed(rate: FloatArray) -> FloatArray:
    reach = KERNEL.size // 2
    return np.sum([w * np.roll(rate, k - reach, axis=1) for k, w in enumerate(KERNEL)], axis=0)


def _mixture(n_groups: int, seed: int = SEED, n_starts: int = N_STARTS) -> Any:
    from sklearn.mixture import GaussianMixture

    return GaussianMixture(n_groups, covariance_type="diag", reg_covar=FLAT, n_init=n_starts, random_state=seed)


def _chosen(points: FloatArray) -> tuple[Any, dict[int, float]]:
    fits = [_mixture(k).fit(points) for k in range(1, min(MOST_GROUPS, len(points) // UNITS_A_GROUP) + 1)]
    criterion = {fit.n_components: float(fit.bic(points)) for fit in fits}
    return min(fits, key=lambda fit: criterion[fit.n_components]), criterion


def _in_order(label: IntArray, rate: FloatArray) -> IntArray:
    """Return the labels numbered by the phase at which their units fire most, from 0 without gaps."""
    present = np.unique(label)
    phase = (np.arange(rate.shape[1]) + 0.5) / rate.shape[1]
    mean = np.array([rate[label == k].mean(axis=0) @ np.exp(2j * np.pi * phase) for k in present])
    order = present[np.argsort(np.angle(mean) % (2 * np.pi), kind="stable")]
    place = {int(k): i for i, k in enumerate(order)}
    return np.array([place[int(k)] for k in label])


def _repeated(points: FloatArray, n_groups: int, n_repetitions: int) -> list[IntArray]:
    """Return the groups of all units from mixtures fitted to units drawn with replacement."""
    rng = np.random.default_rng(SEED)
    found = []
    for i in range(n_repetitions):
        chosen = rng.integers(0, len(points), len(points))
        found.append(np.asarray(_mixture(n_groups, seed=i, n_starts=1).fit(points[chosen]).predict(points)))
    return found


def _group(k: int, number: IntArray, rate: FloatArray, types: Sequence[str],
           repeated: Sequence[IntArray]) -> ShapeGroup:
    mine = number == k
    n = int(mine.sum())
    counted = Counter(name for name, is_mine in zip(types, mine, strict=True) if is_mine)
    return ShapeGroup(f"G{k + 1}", n, rate[mine].mean(axis=0),
                      float(np.mean([_best_overlap(mine, again) for again in repeated])),
                      tuple((name, count / n) for name, count in counted.most_common()))


def _best_overlap(mine: np.ndarray, again: IntArray) -> float:
    return max(float((mine & (again == k)).sum() / (mine | (again == k)).sum()) for k in np.unique(again))
