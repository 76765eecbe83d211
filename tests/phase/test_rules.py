"""The rules by hand: common practice; pre-inspiratory by onset in the last fifth of expiration (PMC2718418)."""

import numpy as np
import pytest

from tests.builders import phasic_spikes, varied_cycles
from unitclass.phase.features import features, rule_of_thumb
from unitclass.phase.histogram import phase_histogram
from unitclass.records import Cycles
from unitclass.settings import Settings


def rule(rate, regime="three-phase"):
    cycles = varied_cycles(120, np.random.default_rng(0))
    times = phasic_spikes(cycles, rate, np.random.default_rng(1))
    found = features(times, cycles, observed_s=None, histogram=phase_histogram(times, cycles), settings=Settings())
    return rule_of_thumb(found, regime)


@pytest.mark.parametrize(("type_id", "rate"), [
    ("early-I", lambda p: np.where(p < 1, 50 * np.exp(-p / 0.4), 0.2)),
    ("ramp-I", lambda p: np.where(p < 1, 60 * p, 0.2)),
    ("pre-I", lambda p: np.where(p > 1.82, 20.0, np.where(p < 0.95, 40.0, 0.2))),
    ("I-E", lambda p: np.where((p > 0.7) & (p < 1.3), 40.0, 0.2)),
    ("post-I", lambda p: np.where(p >= 1, 60 * np.exp(-(p - 1) / 0.25), 0.2)),
    ("aug-E", lambda p: np.where(p > 1.3, 80 * (p - 1.3), 0.2)),
    ("late-E", lambda p: np.where(p > 1.84, 50.0, 0.2)),
    ("tonic", lambda p: 15 + 5 * np.cos(np.pi * (p - 0.5))),
    ("NRM", lambda p: 12 + 0 * p),
    ("silent", lambda p: 0 * p),
])
def test_the_rule_names_the_plain_cases(type_id, rate):
    assert rule(rate) == type_id


def test_without_post_inspiration_decrementing_expiratory_firing_is_dec_e():
    assert rule(lambda p: np.where(p >= 1, 60 * np.exp(-(p - 1) / 0.5), 0.2), "two-phase") == "dec-E"


def test_without_cycles_nothing_can_be_told():
    none = np.array([])
    cycles = Cycles.plain(none, none, none)
    found = features([1.0], cycles, observed_s=None, histogram=phase_histogram([1.0], cycles), settings=Settings())
    assert rule_of_thumb(found, "three-phase") == "undetermined"
