"""A new template family from units that a person, or a shape group, holds together."""

from __future__ import annotations

from collections import Counter
from collections.abc import Sequence

import numpy as np

from unitclass.classify.likelihood import log_likelihood
from unitclass.classify.templates import Family
from unitclass.records import FloatArray

LEAST_UNITS = 3
N_POINTS = 20
SHIFTS = np.linspace(-0.15, 0.15, 31)  # canonical phase
STRETCHES = np.linspace(0.8, 1.25, 19)
USUAL = (5.0, 95.0)  # percent of the units that the ranges hold
LEAST_SHIFT, LEAST_STRETCH = 0.03, 0.06  # no family is narrower than this, however few units made it
LEAST_LEVEL = 1e-3


def family_from_units(type_id: str, counts: FloatArray, exposure_s: FloatArray, regimes: Sequence[str], *,
                      words: str, source: str) -> Family:
    """Return a drawn family: the units' mean profile, moved and stretched as far as they differ.

    Parameters
    ----------
    type_id : str
        Id of the new type.
    counts, exposure_s : ndarray, shape (n_units, n_bins)
    regimes : sequence of str, length n_units
        Rhythm in which each unit was recorded; gives the prior.
    words, source : str
        What `types list` prints, and where the family comes from.

    Raises
    ------
    ValueError
        With fewer than three units.
    """
    if len(counts) < LEAST_UNITS:
        raise ValueError(f"{len(counts)} units are too few for a family; it takes {LEAST_UNITS}")
    profile = _mean_profile(counts, exposure_s)
    shift, stretch = _moved(profile, counts, exposure_s)
    return Family(
        id=type_id, form="drawn",
        ranges={"shift": _range(shift, LEAST_SHIFT), "stretch": _range(stretch, LEAST_STRETCH),
                "background": (0.0, 0.1)},
        prior=_prior(regimes), words=words, sources=(source,), points=_points(profile))


def _mean_profile(counts: FloatArray, exposure_s: FloatArray) -> FloatArray:
    """Return the mean of the units' profiles, each scaled to a mean of 1, lightly smoothed."""
    rate = counts / np.maximum(exposure_s, 1e-12)
    rate = rate / np.maximum(rate.mean(axis=1, keepdims=True), 1e-12)
    mean = rate.mean(axis=0)
    return np.asarray(0.25 * np.roll(mean, 1) + 0.5 * mean + 0.25 * np.roll(mean, -1))


def _moved(profile: FloatArray, counts: FloatArray, exposure_s: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Return the shift and the stretch about the end of inspiration that fit each unit best."""
    n_bins = profile.size
    phase = (np.arange(n_bins) + 0.5) * (2.0 / n_bins)
    pairs = [(shift, stretch) for shift in SHIFTS for stretch in STRETCHES]
    rate = np.stack([np.interp(((phase - shift - 1.0) / stretch + 1.0) % 2.0, phase, profile, period=2.0)
                     for shift, stretch in pairs])
    best = log_likelihood(counts, exposure_s, np.maximum(rate, LEAST_LEVEL)).argmax(axis=1)
    found = np.array(pairs)[best]
    return found[:, 0], found[:, 1]


def _range(values: FloatArray, least: float) -> tuple[float, float]:
    low, high = np.percentile(values, USUAL)
    middle = (low + high) / 2
    return round(min(float(low), middle - least), 3), round(max(float(high), middle + least), 3)


def _prior(regimes: Sequence[str]) -> dict[str, float]:
    counted = Counter(regimes)
    return {regime: round(n / max(counted.values()), 2) for regime, n in counted.items() if regime}


def _points(profile: FloatArray) -> tuple[tuple[float, float], ...]:
    """Return the curve at N_POINTS phases, its highest point 1."""
    step = 2.0 / N_POINTS
    at = (np.arange(N_POINTS) + 0.5) * step
    phase = (np.arange(profile.size) + 0.5) * (2.0 / profile.size)
    level = np.interp(at, phase, profile, period=2.0)
    return tuple((round(float(p), 3), round(float(v), 3)) for p, v in zip(at, level / level.max(), strict=True))
