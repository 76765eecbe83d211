"""Draw profiles from template families, once per rhythm, and keep them as one matrix."""

from __future__ import annotations

import hashlib
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from unitclass.classify.shapes import FORM_SHAPES, Parameters
from unitclass.classify.templates import COMMON, FORMS, NEEDED, Family, TypeLibrary
from unitclass.records import BoolArray, Cycles, FloatArray, IntArray

FINE = 4  # points per bin on which a profile is evaluated before it is averaged into bins
SELDOM_LARGE = ("background", "foreign", "dip", "second_start", "wiggle")  # none, small, now and then large
NONE_SHARE = 0.3  # of the draws have none at all of these
STRAY_S = 0.08  # how far an edge at a transition may stray into expiration, however long that lasts
FLOOR = 3e-4  # a family never says "impossible": share of the peak that stray spikes may reach


@dataclass(frozen=True)
class Timing:
    """Median durations of the phases, which turn milliseconds into canonical phase."""

    ti_s: float
    te_s: float

    @classmethod
    def of(cls, cycles: Cycles) -> Timing:
        """Return the medians over cycles in use; a usual breath's where there are none."""
        used = cycles.used()
        if not used.n_cycles:
            return USUAL
        return cls(float(np.median(used.ti_s)), float(np.median(used.te_s)))


USUAL = Timing(ti_s=1.0, te_s=2.0)  # common practice


@dataclass(frozen=True)
class DrawnFamilies:
    """Profiles of every family.

    Attributes
    ----------
    types : tuple of str, length n_types
    rate : ndarray, shape (n_draws_total, n_bins)
        Relative rate per bin, mean 1 over the bins.
    owner : ndarray, shape (n_draws_total,)
        Index into `types` of the family each row was drawn from.
    log_weight : ndarray, shape (n_draws_total,)
        Log share of each draw within its family; learning moves it.
    """

    types: tuple[str, ...]
    rate: FloatArray
    owner: IntArray
    log_weight: FloatArray

    def rows(self, type_id: str) -> slice:
        """Return the rows of one family."""
        mine = np.flatnonzero(self.owner == self.types.index(type_id))
        return slice(int(mine[0]), int(mine[-1]) + 1)

    def only(self, *types: str) -> DrawnFamilies:
        """Return some of the families, in the order asked for."""
        rows = [np.flatnonzero(self.owner == self.types.index(name)) for name in types]
        chosen = np.concatenate(rows)
        return DrawnFamilies(types, self.rate[chosen], np.repeat(np.arange(len(types)), [len(r) for r in rows]),
                             self.log_weight[chosen])


def draw_families(library: TypeLibrary, timing: Timing, *, n_bins: int, n_draws: int) -> DrawnFamilies:
    """Draw `n_draws` profiles from every family.

    Latin hypercube over the parameter ranges: every parameter visits its range evenly even
    with a few hundred draws [1]_. The same library and timing give the same draws.

    References
    ----------
    .. [1] M. D. McKay, R. J. Beckman, W. J. Conover, Technometrics 21:239, 1979.
    """
    blocks = [draw_profiles(family, timing, n_bins=n_bins, n_draws=n_draws) for family in library.families]
    owner = np.repeat(np.arange(len(blocks)), [len(block) for block in blocks])
    log_weight = -np.log(np.concatenate([np.full(len(block), float(len(block))) for block in blocks]))
    return DrawnFamilies(tuple(f.id for f in library.families), np.concatenate(blocks), owner, log_weight)


def draw_profiles(family: Family, timing: Timing, *, n_bins: int, n_draws: int) -> FloatArray:
    """Return profiles of one family, shape (n_draws, n_bins), each with mean 1 over the bins."""
    rng = np.random.default_rng(_seed(family))
    phase = (np.arange(n_bins * FINE) + 0.5) * (2.0 / (n_bins * FINE))
    p = _draw_parameters(family, timing, n_draws, rng)
    level = _drawn(family, p, phase) if family.form == "drawn" else FORM_SHAPES[family.form](p, phase)
    if family.form not in ("flat", "cosine"):
        level = p["background"] + (1 - p["background"]) * level
    level = level * np.exp(p["wiggle"] * _smooth_noise(phase, n_draws, rng))
    binned = level.reshape(n_draws, n_bins, FINE).mean(axis=2)
    binned = _with_foreign(binned, p["foreign"], timing, rng)
    binned = np.maximum(binned, FLOOR * binned.max(axis=1, keepdims=True))
    return _mean_one(binned)


def _seed(family: Family) -> int:
    return int.from_bytes(hashlib.sha256(family.id.encode()).digest()[:4], "little")


def _draw_parameters(family: Family, timing: Timing, n_draws: int, rng: np.random.Generator) -> Parameters:
    names = sorted({*COMMON, *FORMS[family.form], *NEEDED[family.form]})
    unit = _latin_hypercube(n_draws, len(names) + 1, rng)
    drawn: dict[str, FloatArray] = {}
    for column, name in enumerate(names):
        share = _seldom_large(unit[:, column]) if name in SELDOM_LARGE else unit[:, column]
        value = _scaled(family, name, share, timing, by_time=unit[:, -1] < 0.5)
        drawn[name] = _kept_near(value, name, timing)[:, None]
    drawn["ti_s"], drawn["te_s"] = np.full((n_draws, 1), timing.ti_s), np.full((n_draws, 1), timing.te_s)
    return drawn


def _seldom_large(unit: FloatArray) -> FloatArray:
    return np.clip((unit - NONE_SHARE) / (1 - NONE_SHARE), 0.0, 1.0) ** 2.5


def _kept_near(value: FloatArray, name: str, timing: Timing) -> FloatArray:
    """Return edges that lie just across a transition into expiration no further than STRAY_S."""
    stray = STRAY_S / timing.te_s
    if name == "onset":
        return np.where((value > -0.1) & (value < 0.0), np.maximum(value, -stray), value)
    if name == "offset":
        return np.where((value > 1.0) & (value < 1.1), np.minimum(value, 1.0 + stray), value)
    return value


def _latin_hypercube(n_draws: int, n_dims: int, rng: np.random.Generator) -> FloatArray:
    strata = np.tile(np.arange(n_draws)[:, None], (1, n_dims))
    return (rng.permuted(strata, axis=0) + rng.random((n_draws, n_dims))) / n_draws


def _scaled(family: Family, name: str, share: FloatArray, timing: Timing, *, by_time: BoolArray) -> FloatArray:
    in_ms = None if name.endswith("_ms") else family.ranges.get(f"{name}_ms")
    if in_ms is None:
        low, high = family.range(name)
        return low + (high - low) * share
    value = _phase_of_ms(in_ms[0] + (in_ms[1] - in_ms[0]) * share, name, family, timing)
    if name not in family.ranges:
        return value
    low, high = family.range(name)
    return np.where(by_time, value, low + (high - low) * share)


def _phase_of_ms(ms: FloatArray, name: str, family: Family, timing: Timing) -> FloatArray:
    """Return canonical phase of a time from a transition.

    Below zero it is time before the onset of inspiration; above zero, time after its onset, or
    after its end for a parameter whose phase range lies in expiration.
    """
    in_expiration = name in family.ranges and min(family.ranges[name]) > 1.0
    before = (2.0 if in_expiration else 0.0) + np.clip(ms / 1e3 / timing.te_s, -0.9, 0.0)
    after = (1.0 + np.clip(ms / 1e3 / timing.te_s, 0.0, 0.9) if in_expiration
             else np.clip(ms / 1e3 / timing.ti_s, 0.0, 1.0))
    return np.where(ms < 0, before, after)


def _drawn(family: Family, p: Parameters, phase: FloatArray) -> FloatArray:
    at = np.array([point[0] for point in family.points])
    height = np.array([point[1] for point in family.points])
    height = height / max(float(height.max()), 1e-12)
    moved = ((phase - p["shift"] - 1.0) / p["stretch"] + 1.0) % 2.0
    return np.interp(moved, at, height, period=2.0)


def _with_foreign(binned: FloatArray, share: FloatArray, timing: Timing, rng: np.random.Generator) -> FloatArray:
    """Return the profiles with a share of another cell's spikes: no sorting is perfect.

    Half of the foreign trains fire steadily, half in one hump somewhere in the cycle. The share is
    one of spikes: a foreign burst in a short inspiration stands high there.
    """
    n_draws, n_bins = binned.shape
    phase = (np.arange(n_bins) + 0.5) * (2.0 / n_bins)
    away = np.abs((phase - rng.uniform(0, 2, (n_draws, 1)) + 1.0) % 2.0 - 1.0)
    hump = np.exp(-0.5 * (away / rng.uniform(0.08, 0.3, (n_draws, 1))) ** 2)
    other = np.where(rng.random((n_draws, 1)) < 0.5, 1.0, hump)
    seconds = np.where(phase < 1.0, timing.ti_s, timing.te_s)
    own, foreign = (rate / (rate @ seconds / seconds.sum())[:, None] for rate in (binned, other))
    return np.asarray((1 - share) * own + share * foreign)


def _mean_one(binned: FloatArray) -> FloatArray:
    return binned / binned.mean(axis=1, keepdims=True)


def _smooth_noise(phase: FloatArray, n_draws: int, rng: np.random.Generator) -> FloatArray:
    """Return smooth periodic curves of unit variance: what a drawn form leaves out of a real cell."""
    harmonics: Sequence[int] = (1, 2, 3, 4)
    basis = np.concatenate([[np.cos(np.pi * k * phase), np.sin(np.pi * k * phase)] for k in harmonics])
    return np.asarray(rng.normal(size=(n_draws, basis.shape[0])) @ basis / np.sqrt(len(harmonics)))
