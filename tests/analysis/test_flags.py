"""Two cells in one train are told by the refractory period that they break between them."""

from __future__ import annotations

import numpy as np
import pytest

from unitclass.analysis.flags import foreign_share
from unitclass.phase.profiles import unit_profiles
from unitclass.records import Cycles, FloatArray
from unitclass.settings import Settings

CYCLES = Cycles.plain(np.arange(0.0, 240.0, 3.0), np.arange(1.0, 241.0, 3.0), np.arange(3.0, 243.0, 3.0))


def renewal(rate_hz: float, rng: np.random.Generator, windows: tuple[float, float] = (0.0, 3.0)) -> FloatArray:
    """Return a train that keeps a refractory period of 3 ms and fires within a window of each cycle only."""
    spikes = np.cumsum(0.003 + rng.exponential(1 / rate_hz - 0.003, int(240 * rate_hz * 1.2)))
    spikes = spikes[spikes < 240]
    return spikes[(spikes % 3.0 >= windows[0]) & (spikes % 3.0 < windows[1])]


def share_of(train: FloatArray) -> float:
    profile, = unit_profiles(iter([(np.sort(train), None)]), CYCLES, settings=Settings(), seed=1)
    return foreign_share(profile, 1.0)


@pytest.mark.parametrize("rate_hz", [12.0, 30.0, 80.0])
@pytest.mark.parametrize("windows", [(0.0, 3.0), (0.0, 1.0)])
def test_trains_mixed_half_and_half_are_told_at_every_rate_and_single_ones_are_not(rate_hz, windows):
    rng = np.random.default_rng(1)
    one, other = renewal(rate_hz, rng, windows), renewal(rate_hz, rng, windows)
    assert share_of(one) == 0.0
    assert share_of(np.concatenate([one, other])) > 0.25


def test_a_tenth_of_foreign_spikes_is_estimated_as_about_a_tenth():
    rng = np.random.default_rng(2)
    own, foreign = renewal(45.0, rng), renewal(5.0, rng)
    assert share_of(np.concatenate([own, foreign])) == pytest.approx(0.1, abs=0.05)
