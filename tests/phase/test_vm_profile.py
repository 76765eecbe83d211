"""The cycle-averaged membrane potential against what the trace was drawn from."""

from __future__ import annotations

from dataclasses import replace
from functools import cache

import numpy as np
import pytest

from tests.simulators.membrane import Recipe, Shape, Trace, membrane_trace
from tests.simulators.membrane_checks import membrane_of
from unitclass.phase.vm_bridging import bridged_stretches, cuts_around
from unitclass.phase.vm_profile import vm_phase_levels, vm_profile
from unitclass.phase.warp import to_phase
from unitclass.records import Cycles, Electrode, FloatArray, VmProfile, VmSpikes
from unitclass.settings import MembraneSettings
from unitclass.signals.vm_spikes import find_vm_spikes

RATE = 5000.0
SETTINGS = MembraneSettings()


def spikes_at(times_s: FloatArray, observed_s: list[list[float]]) -> VmSpikes:
    n = np.full(np.size(times_s), np.nan)
    return VmSpikes(np.asarray(times_s, float), n, n, n, n, n, 0, np.array(observed_s), (), -60.0, 0.0)


def uneven_cycles(n: int, seed: int = 0, start_s: float = 0.5) -> Cycles:
    rng = np.random.default_rng(seed)
    ti, te = rng.uniform(0.5, 0.8, n), rng.uniform(0.9, 1.5, n)
    marks = start_s + np.concatenate([[0.0], np.cumsum(ti + te)])
    return Cycles.plain(marks[:-1], marks[:-1] + ti, marks[1:])


def brute_force_bins(values: FloatArray, cycles: Cycles, n_bins: int) -> FloatArray:
    """Mean of every bin of every cycle, sample by sample; shape (n_cycles, n_bins)."""
    t = np.arange(values.size) / RATE
    out = np.empty((cycles.n_cycles, n_bins))
    for c in range(cycles.n_cycles):
        marks = [(cycles.onset_s[c], cycles.offset_s[c]), (cycles.offset_s[c], cycles.end_s[c])]
        for b in range(n_bins):
            low, high = marks[b // (n_bins // 2)]
            step = (high - low) / (n_bins // 2)
            first = low + (b % (n_bins // 2)) * step
            out[c, b] = values[(t >= first) & (t < first + step)].mean()
    return out


@cache
def smooth() -> tuple[FloatArray, Cycles]:
    """A potential without spikes that follows the cycle, drifts, and varies between cycles."""
    cycles = uneven_cycles(20)
    t = np.arange(round((cycles.end_s[-1] + 1) * RATE)) / RATE
    phased = to_phase(t, cycles)
    phase = np.nan_to_num(phased.phase)
    gain = np.random.default_rng(1).normal(1.0, 0.3, cycles.n_cycles)[phased.cycle]
    return -60.0 + 0.2 * t - 5.0 * gain * np.sin(np.pi * phase), cycles


def smooth_profile(cycles: Cycles | None = None, **options: float) -> VmProfile:
    values, every = smooth()
    spikes = spikes_at(np.empty(0), [[0.0, values.size / RATE]])
    return vm_profile(membrane_of(values, RATE), spikes, cycles or every, SETTINGS, **options)


def test_without_spikes_the_profile_is_the_mean_of_every_sample() -> None:
    values, cycles = smooth()
    brute = brute_force_bins(values, cycles, 20)
    profile = smooth_profile(n_bins=20)
    assert profile.mean_mv == pytest.approx(brute.mean(axis=0), abs=0.05)
    assert profile.n_cycles == 20


def test_the_reference_is_the_time_weighted_mean_over_the_cycle() -> None:
    values, cycles = smooth()
    t = np.arange(values.size) / RATE
    means = [values[(t >= a) & (t < b)].mean() for a, b in zip(cycles.onset_s, cycles.end_s, strict=True)]
    assert smooth_profile().reference_mv == pytest.approx(np.mean(means), abs=0.01)


def test_the_spread_is_around_each_cycles_own_mean_and_the_drift_is_said() -> None:
    values, cycles = smooth()
    brute = brute_force_bins(values, cycles, 20)
    t = np.arange(values.size) / RATE
    own = np.array([values[(t >= a) & (t < b)].mean() for a, b in zip(cycles.onset_s, cycles.end_s, strict=True)])
    relative = brute - own[:, None]
    profile = smooth_profile(n_bins=20)
    assert profile.sd_mv == pytest.approx(relative.std(axis=0, ddof=1), abs=0.03)
    assert any(f"sd {own.std(ddof=1):.1f} mV" in note for note in profile.notes)


def test_levels_and_their_errors_are_those_of_the_cycles() -> None:
    values, cycles = smooth()
    brute = brute_force_bins(values, cycles, 40)
    t = np.arange(values.size) / RATE
    own = np.array([values[(t >= a) & (t < b)].mean() for a, b in zip(cycles.onset_s, cycles.end_s, strict=True)])
    early = brute[:, :10].mean(axis=1) - own
    levels = vm_phase_levels(smooth_profile())
    assert levels.level_mv["early I"] == pytest.approx(early.mean(), abs=0.03)
    assert levels.error_mv["early I"] == pytest.approx(early.std(ddof=1) / np.sqrt(20), rel=0.03)
    trough = brute.mean(axis=0).min()
    assert levels.from_trough_mv["early I"] == pytest.approx((brute[:, :10].mean() - trough), abs=0.05)


def test_cycles_left_out_stay_out() -> None:
    _, cycles = smooth()
    accepted = np.arange(20) % 3 != 0
    some = smooth_profile(replace(cycles, accepted=accepted))
    alone = smooth_profile(cycles.select(accepted))
    assert some.n_cycles == accepted.sum()
    assert some.mean_mv == pytest.approx(alone.mean_mv)


def test_only_cycles_observed_from_end_to_end_count() -> None:
    values, cycles = smooth()
    stop_s = float(cycles.end_s[11]) + 0.1
    spikes = spikes_at(np.empty(0), [[0.0, float(cycles.onset_s[3]) + 0.2], [float(cycles.onset_s[5]), stop_s]])
    profile = vm_profile(membrane_of(values, RATE), spikes, cycles, SETTINGS)
    assert profile.n_cycles == 3 + 7


def test_no_usable_cycle_gives_an_empty_profile_that_says_so() -> None:
    values, cycles = smooth()
    spikes = spikes_at(np.empty(0), [[0.0, 0.2]])
    profile = vm_profile(membrane_of(values, RATE), spikes, cycles, SETTINGS)
    assert profile.n_cycles == 0
    assert profile.mean_mv.size == 0
    assert any("no accepted cycle" in note for note in profile.notes)
    assert all(np.isnan(v) for v in vm_phase_levels(profile).level_mv.values())
    assert vm_phase_levels(profile).sentences == ()


def test_means_around_onset_and_offset_are_those_of_the_samples_inside_cycles() -> None:
    values, cycles = smooth()
    profile = smooth_profile(locked_window_ms=200.0)
    t = np.arange(values.size) / RATE
    inside = (t >= cycles.onset_s[0]) & (t < cycles.end_s[-1])
    for name, events in (("onset", cycles.onset_s), ("offset", cycles.offset_s)):
        centres, means = profile.locked[name]
        assert centres == pytest.approx(np.arange(-190.0, 200.0, 20.0))
        for centre, mean in list(zip(centres, means, strict=True))[::4]:
            lags = t[:, None] - events[None, :]
            hit = (np.abs(lags - centre / 1e3) < 0.01) & inside[:, None]
            brute = np.repeat(values[:, None], events.size, axis=1)[hit].mean()
            assert mean == pytest.approx(brute, abs=0.15)


@cache
def firing(rate_hz: float, ahp_mv: float = 5.0) -> tuple[Trace, VmSpikes]:
    recipe = Recipe(duration_s=60, rate_hz=20000, swing_mv=8.0, active=(0.4, 0.8), rate_in_burst_hz=rate_hz,
                    shape=Shape(ahp_mv=ahp_mv))
    trace = membrane_trace(recipe, np.random.default_rng(2))
    return trace, find_vm_spikes(membrane_of(trace.values_mv, 20000), SETTINGS)


def steady_cycles() -> Cycles:
    onset = np.arange(2.0, 56.0, 2.0)
    return Cycles.plain(onset, onset + 0.8, onset + 2.0)


def bin_means(values: FloatArray) -> FloatArray:
    phased = to_phase(np.arange(values.size) / 20000, steady_cycles())
    column = (phased.phase[phased.cycle >= 0] * 20).astype(int)
    return np.bincount(column, values[phased.cycle >= 0]) / np.bincount(column)


@pytest.mark.parametrize("rate_hz", [20.0, 60.0])
def test_cutting_the_spikes_leaves_the_potential_under_them(rate_hz: float) -> None:
    trace, spikes = firing(rate_hz, 0.0)
    profile = vm_profile(membrane_of(trace.values_mv, 20000), spikes, steady_cycles(), SETTINGS)
    true, raw = bin_means(trace.subthreshold_mv), bin_means(trace.values_mv)
    assert np.abs(profile.mean_mv - true).max() < 0.15
    assert np.abs(raw - true).max() > 0.8


@pytest.mark.parametrize(("rate_hz", "most_mv"), [(20.0, 0.8), (60.0, 2.5)])
def test_the_after_hyperpolarisation_beyond_the_cut_is_all_that_is_left(rate_hz: float, most_mv: float) -> None:
    trace, spikes = firing(rate_hz)
    profile = vm_profile(membrane_of(trace.values_mv, 20000), spikes, steady_cycles(), SETTINGS)
    off = profile.mean_mv - bin_means(trace.subthreshold_mv)
    assert off.max() < 0.1
    assert -most_mv < off.min() < -0.2


def test_what_the_cut_does_at_high_rates_is_measured_and_said() -> None:
    slow = vm_profile(membrane_of(firing(20.0)[0].values_mv, 20000), firing(20.0)[1], steady_cycles(), SETTINGS)
    fast = vm_profile(membrane_of(firing(60.0)[0].values_mv, 20000), firing(60.0)[1], steady_cycles(), SETTINGS)
    # What is left of the after-hyperpolarisation pulls the plateau down, the more so the faster it fires.
    assert fast.plateau_bias_mv < slow.plateau_bias_mv < 0.0
    assert any("cutting twice as much" in note for note in fast.notes)


def test_a_cut_never_takes_more_than_three_quarters_of_an_interval() -> None:
    times = np.array([1.0, 1.003, 1.006, 1.05])
    cuts = cuts_around(times, SETTINGS)
    left = cuts.start_s[1:] - cuts.stop_s[:-1]
    assert left == pytest.approx([0.00075, 0.00075, 0.037])
    assert cuts.start_s[0] == pytest.approx(0.998)
    assert cuts.stop_s[-1] == pytest.approx(1.055)


def test_a_bridge_is_a_straight_line_over_the_cut() -> None:
    n = 4000
    values = -60.0 + 0.01 * np.arange(n)
    spiky = values.copy()
    spiky[2000:2010] += 80.0
    parts = list(bridged_stretches(membrane_of(spiky, RATE).signal.reader, RATE, np.array([0.4002]), SETTINGS, 0.0, 1.0))
    times = np.concatenate([p.times_s for p in parts])
    assert np.concatenate([p.bridged_mv for p in parts]) == pytest.approx(-60.0 + 0.01 * times * RATE, abs=1e-6)
    assert np.max(np.concatenate([p.raw_mv for p in parts]) - (-60.0 + 0.01 * times * RATE)) > 50.0


def test_a_cell_held_down_in_inspiration_is_called_hyperpolarised_in_it_and_never_inhibited() -> None:
    cycles = uneven_cycles(30, seed=4)
    t = np.arange(round((cycles.end_s[-1] + 1) * RATE)) / RATE
    phased = to_phase(t, cycles)
    values = -55.0 - 8.0 * (np.nan_to_num(phased.phase, nan=1.5) < 1.0)
    noisy = values + np.random.default_rng(0).normal(0, 1.0, t.size)
    profile = vm_profile(membrane_of(noisy, RATE), spikes_at(np.empty(0), [[0.0, t[-1] + 1]]), cycles, SETTINGS)
    levels = vm_phase_levels(profile)
    share_e = float(np.mean(cycles.te_s / cycles.ttot_s))
    assert levels.level_mv["early I"] == pytest.approx(-8.0 * share_e, abs=0.1)
    assert levels.sentences[0].startswith("hyperpolarised by 5.1 mV")
    assert levels.sentences[0].endswith("in inspiration")
    assert levels.sentences[1].startswith("depolarised by 2.9 mV")
    assert levels.sentences[1].endswith("in expiration")
    assert "inhibited" not in " ".join(levels.sentences)


def test_a_vagus_that_tells_the_end_of_post_inspiration_parts_post_i_from_e2() -> None:
    _, cycles = smooth()
    told = replace(cycles, post_i_end_s=cycles.offset_s + 0.5 * cycles.te_s)
    levels = vm_phase_levels(smooth_profile(), told)
    assert levels.spans["post-I"] == pytest.approx((1.0, 1.5))
    assert levels.spans["E2"] == pytest.approx((1.5, 1.8))


def test_flat_potential_says_nothing() -> None:
    _, cycles = smooth()
    values = np.random.default_rng(0).normal(-60.0, 1.0, round((cycles.end_s[-1] + 1) * RATE))
    profile = vm_profile(membrane_of(values, RATE), spikes_at(np.empty(0), [[0.0, 100.0]]), cycles, SETTINGS)
    assert vm_phase_levels(profile).sentences == ()
    assert profile.swing_mv < 0.5


def test_whether_the_junction_potential_is_corrected_is_stated() -> None:
    values, cycles = smooth()
    spikes = spikes_at(np.empty(0), [[0.0, values.size / RATE]])
    silent = vm_profile(membrane_of(values, RATE), spikes, cycles, SETTINGS)
    told = membrane_of(values, RATE, electrode=Electrode("e", junction_potential="corrected by 8 mV"))
    assert any("junction potential is corrected is not stated" in n for n in silent.notes)
    assert "liquid junction potential: corrected by 8 mV" in vm_profile(told, spikes, cycles, SETTINGS).notes


def test_one_cycle_has_a_mean_and_no_spread() -> None:
    _, cycles = smooth()
    profile = smooth_profile(cycles.select(np.arange(20) == 7))
    assert profile.n_cycles == 1
    assert np.isfinite(profile.mean_mv).all()
    assert np.isnan(profile.sd_mv).all()
    assert np.isnan(vm_phase_levels(profile).error_mv["E2"])
