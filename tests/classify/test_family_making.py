"""A family made from units: it draws what they are, and no narrower."""

from __future__ import annotations

import numpy as np
import pytest

from unitclass.classify.draws import Timing, draw_profiles
from unitclass.classify.family_making import family_from_units

PHASE = (np.arange(40) + 0.5) / 20
EXPOSURE = np.full((12, 40), 5.0)


def humps(centres: np.ndarray) -> np.ndarray:
    away = np.abs((PHASE - centres[:, None] + 1) % 2 - 1)
    return np.random.default_rng(0).poisson(40 * np.exp(-0.5 * (away / 0.15) ** 2) * EXPOSURE[: len(centres)]).astype(float)


def test_the_family_peaks_where_its_units_do_and_spans_as_far_as_they_differ():
    centres = np.linspace(1.3, 1.5, 12)
    family = family_from_units("mid-E", humps(centres), EXPOSURE, ["three-phase"] * 12, words="w", source="s")
    drawn = draw_profiles(family, Timing(1.0, 2.0), n_bins=40, n_draws=200)
    peaks = PHASE[drawn.argmax(axis=1)]
    assert np.median(peaks) == pytest.approx(1.4, abs=0.05)
    assert np.percentile(peaks, 10) < 1.36
    assert np.percentile(peaks, 90) > 1.44


def test_units_that_are_all_alike_still_make_a_family_with_room():
    family = family_from_units("x", humps(np.full(12, 1.4)), EXPOSURE, ["two-phase"] * 12, words="w", source="s")
    low, high = family.ranges["shift"]
    assert high - low >= 0.06


def test_the_prior_follows_the_rhythms_in_which_the_units_were_found():
    regimes = ["three-phase"] * 8 + ["two-phase"] * 4
    family = family_from_units("x", humps(np.full(12, 1.4)), EXPOSURE, regimes, words="w", source="s")
    assert family.prior == {"three-phase": 1.0, "two-phase": 0.5}
    assert family.prior_in("one-phase") < 0.1


def test_two_units_are_too_few():
    with pytest.raises(ValueError, match="too few"):
        family_from_units("x", humps(np.full(2, 1.4)), EXPOSURE[:2], ["three-phase"] * 2, words="w", source="s")
