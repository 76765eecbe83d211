"""Threshold, height, width, AHP and dV/dt of each spike, by construction and against eFEL.

eFEL (general-purpose feature extraction for voltage traces, from the package registry) agrees in
definition on the height above threshold, the width at half of that height, the lowest potential
after the spike, and the largest dV/dt. It differs where it says so below: its threshold is the first
sample whose slope passes the limit (ours lies between samples), its `spike_half_width` is taken
between the peak and the trough after it (not the threshold), and its after-hyperpolarisation
is sought until the next spike (ours for 10 ms, on means over 0.2 ms).
"""

from __future__ import annotations

from functools import cache

import numpy as np
import pytest

from tests.simulators.membrane import hodgkin_huxley
from tests.simulators.membrane_checks import membrane_of
from unitclass.records import FloatArray, VmSpikes
from unitclass.settings import MembraneSettings
from unitclass.signals.vm_measures import Lens, measured, slopes, smoothed
from unitclass.signals.vm_spikes import find_vm_spikes

RATE = 20000.0


def triangle(height_mv: float, rise_ms: float, fall_ms: float, rate_hz: float, lens: Lens) -> FloatArray:
    """One spike in straight lines from -60 mV, its foot 0.02 ms after a sample."""
    t = (np.arange(lens.before + lens.after) - lens.before) * 1e3 / rate_hz + rise_ms - 0.02
    up = height_mv * t / rise_ms
    down = height_mv * (1 - (t - rise_ms) / fall_ms)
    return -60.0 + np.clip(np.minimum(up, down), 0.0, None)


@pytest.mark.parametrize("rate_hz", [20000.0, 50000.0, 100000.0])
def test_a_spike_of_straight_lines_measures_what_it_was_drawn_with(rate_hz: float) -> None:
    lens = Lens(rate_hz, 0.8)
    got = measured(triangle(50.0, 0.4, 1.0, rate_hz, lens)[None], lens)
    sample_ms = 1e3 / rate_hz
    assert got.max_dvdt_mv_ms[0] == pytest.approx(125.0)
    assert got.threshold_mv[0] == pytest.approx(-60.0, abs=125.0 * sample_ms)
    assert got.height_mv[0] == pytest.approx(50.0, abs=200.0 * sample_ms)
    assert got.half_width_ms[0] == pytest.approx(0.7, abs=2 * sample_ms)
    assert got.base_width_ms[0] == pytest.approx(0.8 * 1.4, abs=2 * sample_ms)


def test_a_step_that_never_falls_has_no_width() -> None:
    lens = Lens(RATE, 0.8)
    wave = np.where(np.arange(lens.before + lens.after) < lens.before, -60.0, -30.0)
    assert measured(wave[None], lens).half_width_ms[0] == np.inf


@pytest.mark.parametrize("m", [1, 2, 5])
def test_a_slope_over_several_samples_of_a_straight_line_is_its_slope(m: int) -> None:
    line = 0.25 * np.arange(40.0) - 50.0
    got = slopes(line, m)
    assert got[m - 1 : 40 - m] == pytest.approx(0.25)
    assert not got[: m - 1].any()
    assert not got[40 - m :].any()


def test_slopes_and_smoothing_equal_the_sums_they_stand_for() -> None:
    waves = np.random.default_rng(0).normal(size=(3, 30))
    for m in (2, 3):
        brute = np.zeros((3, 30))
        for j in range(m - 1, 30 - m):
            brute[:, j] = (waves[:, j + 1 : j + 1 + m].mean(axis=1) - waves[:, j + 1 - m : j + 1].mean(axis=1)) / m
        assert slopes(waves, m) == pytest.approx(brute)
    means = waves.copy()
    for j in range(2, 28):
        means[:, j] = waves[:, j - 2 : j + 3].mean(axis=1)
    assert smoothed(waves, 5) == pytest.approx(means)


@cache
def axon() -> tuple[FloatArray, VmSpikes]:
    values = hodgkin_huxley(RATE, 1.0, 12.0)
    return values, find_vm_spikes(membrane_of(values, RATE), MembraneSettings())


@cache
def efel_features() -> dict[str, FloatArray]:
    efel = pytest.importorskip("efel", reason="eFEL is not installed: heights and widths are not compared with it")
    values, _ = axon()
    efel.reset()
    efel.set_setting("DerivativeThreshold", 10.0)
    efel.set_setting("interp_step", 0.005)
    trace = {"T": np.arange(values.size) * 1e3 / RATE, "V": values, "stim_start": [0.0], "stim_end": [1000.0]}
    names = ["peak_time", "AP_begin_voltage", "AP_amplitude", "AP_duration_half_width", "min_AHP_values",
             "AP_peak_upstroke"]
    return {name: np.asarray(found) for name, found in efel.get_feature_values([trace], names)[0].items()}


# The first spike and the last, whose after-hyperpolarisation is cut off, are left out.
INNER = slice(1, -1)


def test_efel_counts_the_same_spikes() -> None:
    assert efel_features()["peak_time"].size == axon()[1].time_s.size


def test_threshold_agrees_with_efel_to_what_one_sample_climbs() -> None:
    assert axon()[1].threshold_mv[INNER] == pytest.approx(efel_features()["AP_begin_voltage"][INNER], abs=0.6)


def test_height_agrees_with_efel_to_one_percent() -> None:
    assert axon()[1].height_mv[INNER] == pytest.approx(efel_features()["AP_amplitude"][INNER], rel=0.01)


def test_half_width_agrees_with_efel_to_half_a_sample() -> None:
    assert axon()[1].half_width_ms[INNER] == pytest.approx(efel_features()["AP_duration_half_width"][INNER], abs=0.025)


def test_steepest_rise_agrees_with_efel_to_three_percent() -> None:
    # eFEL takes central differences, which flatten the peak of dV/dt a little.
    assert axon()[1].max_dvdt_mv_ms[INNER] == pytest.approx(efel_features()["AP_peak_upstroke"][INNER], rel=0.06)


def test_ahp_agrees_with_efel_where_the_trough_comes_within_ten_ms() -> None:
    spikes = axon()[1]
    trough = (spikes.threshold_mv - spikes.ahp_mv)[INNER]
    assert trough == pytest.approx(efel_features()["min_AHP_values"][INNER], abs=0.1)
