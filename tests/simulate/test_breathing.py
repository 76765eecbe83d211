import numpy as np
import pytest

from unitclass.simulate.breathing import Pattern, breathe, join, phase_at


@pytest.fixture
def breaths():
    return breathe(Pattern(ti_s=0.8, te_s=1.7), 2.0, 600.0, np.random.default_rng(1))


def test_breaths_follow_each_other_without_gaps(breaths):
    assert np.all(breaths.onset_s < breaths.offset_s)
    assert np.all(breaths.offset_s < breaths.end_s)
    assert np.array_equal(breaths.end_s[:-1], breaths.onset_s[1:])
    assert breaths.onset_s[0] == 2.0
    assert breaths.end_s[-1] <= 600.0


def test_durations_scatter_as_a_perfused_preparation_does(breaths):
    plain = np.array([kind == "breath" for kind in breaths.kind])
    plain[:-1] &= np.array([kind != "doublet" for kind in breaths.kind[1:]])
    ti = (breaths.offset_s - breaths.onset_s)[plain]
    te = (breaths.end_s - breaths.offset_s)[plain]
    assert np.median(ti) == pytest.approx(0.8, rel=0.03)
    assert np.median(te) == pytest.approx(1.7, rel=0.04)
    assert 0.03 < ti.std() / ti.mean() < 0.10
    assert 0.03 < te.std() / te.mean() < 0.10


def test_a_slice_breathes_with_a_scatter_of_ten_to_forty_percent():
    slow = breathe(Pattern(0.55, 3.6, ti_cv=0.1, te_cv=0.22, sigh_every=0, doublet_share=0.0), 0.0, 3000.0,
                   np.random.default_rng(2))
    ttot = slow.end_s - slow.onset_s
    assert 0.10 < ttot.std() / ttot.mean() < 0.40


def test_a_sigh_is_large_and_an_apnoea_follows(breaths):
    sighs = np.array([kind == "sigh" for kind in breaths.kind])
    te = breaths.end_s - breaths.offset_s
    assert sighs.sum() >= 3
    assert np.all(breaths.amplitude[sighs] > 1.4)
    assert np.all(te[sighs] > 2.5 * np.median(te))


def test_the_second_burst_of_a_doublet_comes_early():
    breaths = breathe(Pattern(0.8, 1.7, doublet_share=0.1), 0.0, 600.0, np.random.default_rng(3))
    second = np.flatnonzero([kind == "doublet" for kind in breaths.kind])
    te = breaths.end_s - breaths.offset_s
    assert second.size > 5
    assert np.all(te[second - 1] < 0.4 * np.median(te))


def test_expiration_drifts_as_asked():
    breaths = breathe(Pattern(0.8, 1.7, drift=0.5, sigh_every=0, doublet_share=0), 0.0, 900.0,
                      np.random.default_rng(4))
    te = breaths.end_s - breaths.offset_s
    third = te.size // 3
    assert te[-third:].mean() / te[:third].mean() == pytest.approx(1.4, abs=0.12)


def test_phase_is_linear_within_each_phase_and_unknown_outside(breaths):
    middle_i = (breaths.onset_s + breaths.offset_s) / 2
    middle_e = (breaths.offset_s + breaths.end_s) / 2
    assert phase_at(breaths, middle_i)[0] == pytest.approx(0.5)
    assert phase_at(breaths, middle_e)[0] == pytest.approx(1.5)
    assert np.array_equal(phase_at(breaths, middle_e)[1], np.arange(breaths.n_breaths))
    phase, breath = phase_at(breaths, np.array([1.0, 700.0]))
    assert np.all(np.isnan(phase))
    assert np.array_equal(breath, [-1, -1])


def test_joined_conditions_keep_their_index_and_order():
    rng = np.random.default_rng(5)
    parts = [breathe(Pattern(0.8, 1.7), 0, 60, rng), breathe(Pattern(1.1, 1.7), 80, 140, rng, condition=1)]
    joined = join(parts)
    assert joined.n_breaths == parts[0].n_breaths + parts[1].n_breaths
    assert np.all(np.diff(joined.onset_s) > 0)
    assert np.array_equal(np.unique(joined.condition), [0, 1])
