"""Which stretches are left out, with the reason, and which are kept although they look odd."""

from __future__ import annotations

from functools import cache

import numpy as np
import pytest

from tests.simulators.membrane import Recipe, Trace, membrane_trace
from tests.simulators.membrane_checks import matched, membrane_of
from unitclass.records import FloatArray, VmSpikes
from unitclass.settings import MembraneSettings
from unitclass.signals.vm_quality import inside, scale_problem
from unitclass.signals.vm_spikes import find_vm_spikes

RATE = 5000.0


@cache
def cell() -> Trace:
    return membrane_trace(Recipe(duration_s=60, rate_hz=RATE), np.random.default_rng(3))


def times() -> FloatArray:
    return np.arange(cell().values_mv.size) / RATE


def judged(values: FloatArray) -> VmSpikes:
    return find_vm_spikes(membrane_of(values, RATE), MembraneSettings())


def changed(from_s: float, to_s: float, level_mv: float, gain: float, noise_mv: float) -> FloatArray:
    """Another level, another gain of the spikes and more noise from one moment to another."""
    trace, t = cell(), times()
    part = (t >= from_s) & (t < to_s)
    sharp = trace.values_mv - trace.subthreshold_mv
    values = trace.values_mv.copy()
    values[part] = trace.subthreshold_mv[part] + level_mv + gain * sharp[part]
    return values + np.where(part, np.random.default_rng(0).normal(0, noise_mv or 1e-12, t.size), 0.0)


def reasons(spikes: VmSpikes) -> list[str]:
    return [p.reason for p in spikes.problems]


def covered_s(spikes: VmSpikes) -> float:
    return float(np.sum(spikes.observed_s[:, 1] - spikes.observed_s[:, 0]))


def test_a_sound_recording_is_used_from_end_to_end() -> None:
    spikes = judged(cell().values_mv)
    assert spikes.problems == ()
    assert spikes.observed_s == pytest.approx(np.array([[0.0, 60.0]]))


def test_a_lost_cell_ends_the_recording() -> None:
    t = times()
    spikes = judged(np.where(t < 40, cell().values_mv, np.random.default_rng(1).normal(0, 1, t.size)))
    assert reasons(spikes)[0].startswith("cell lost: the potential is at")
    assert spikes.observed_s[-1, 1] == pytest.approx(40.0, abs=1.1)
    assert matched(spikes.time_s, cell().spike_s[cell().spike_s < spikes.observed_s[-1, 1]]).f1 == 1.0


def test_a_cell_lost_for_a_while_is_used_before_and_after() -> None:
    t = times()
    spikes = judged(np.where((t > 20) & (t < 30), np.random.default_rng(1).normal(-3, 1, t.size), cell().values_mv))
    assert spikes.observed_s == pytest.approx(np.array([[0.0, 20.0], [30.0, 60.0]]), abs=1.2)


@pytest.mark.parametrize(("level_mv", "gain", "noise_mv"), [(12, 0.5, 1.5), (0, 0.35, 0.0), (12, 1.0, 2.0), (0, 1.0, 4.0)])
def test_changed_access_leaves_the_stretch_out(level_mv: float, gain: float, noise_mv: float) -> None:
    spikes = judged(changed(25, 40, level_mv, gain, noise_mv))
    assert len(spikes.problems) == 1
    assert spikes.problems[0].reason.startswith("access changed: ")
    assert (spikes.problems[0].start_s, spikes.problems[0].stop_s) == pytest.approx((25, 40), abs=3)


def test_the_stretch_with_the_larger_spikes_is_the_good_one() -> None:
    early, late = judged(changed(30, 60, 12, 0.5, 1.5)), judged(changed(0, 30, 12, 0.5, 1.5))
    assert early.observed_s == pytest.approx(np.array([[0.0, 30.0]]), abs=2)
    assert late.observed_s == pytest.approx(np.array([[30.0, 60.0]]), abs=2)


def test_a_step_of_bias_current_is_no_problem() -> None:
    spikes = judged(cell().values_mv - np.where(times() > 30, 15.0, 0.0))
    assert spikes.problems == ()
    assert spikes.drift_mv == pytest.approx(-15, abs=2)


def test_a_drift_from_seventy_to_forty_is_no_problem() -> None:
    assert judged(cell().values_mv + np.linspace(-10, 20, times().size)).problems == ()


def test_clipping_is_left_out_where_it_lasts_and_said_where_it_cuts_spikes() -> None:
    t = times()
    stuck = judged(np.where((t > 20) & (t < 22), 102.4, cell().values_mv))
    assert reasons(stuck) == ["clipping at 102.4 mV"]
    assert covered_s(stuck) == pytest.approx(58.0, abs=0.01)
    cut = judged(np.minimum(cell().values_mv, -20.0))
    assert cut.problems == ()
    assert any("cut off at -20.0 mV" in note for note in cut.notes)
    assert matched(cut.time_s, cell().spike_s).f1 >= 0.99


def test_a_constant_stretch_is_left_out() -> None:
    t = times()
    spikes = judged(np.where((t > 20) & (t < 23), -58.0, cell().values_mv))
    assert reasons(spikes) == ["constant at -58.0 mV"]
    assert spikes.observed_s == pytest.approx(np.array([[0.0, 20.0], [23.0, 60.0]]), abs=1e-3)


def test_missing_values_are_left_out_where_they_last_and_bridged_where_they_do_not() -> None:
    t = times()
    gone = judged(np.where((t > 20) & (t < 22), np.nan, cell().values_mv))
    assert reasons(gone) == ["no finite values"]
    assert gone.observed_s == pytest.approx(np.array([[0.0, 20.0], [22.0, 60.0]]), abs=1e-3)
    sprinkled = cell().values_mv.copy()
    sprinkled[::2500] = np.nan
    spikes = judged(sprinkled)
    assert spikes.problems == ()
    assert matched(spikes.time_s, cell().spike_s).f1 >= 0.99


def test_a_bath_is_no_cell() -> None:
    spikes = judged(np.random.default_rng(2).normal(0, 0.5, times().size))
    assert reasons(spikes)[0].startswith("no cell: ")
    assert spikes.observed_s.shape == (0, 2)
    assert np.isnan(spikes.resting_mv)


def test_an_ac_coupled_recording_is_used_and_its_level_doubted() -> None:
    spikes = judged(cell().values_mv + 60.0)
    assert spikes.problems == ()
    assert matched(spikes.time_s, cell().spike_s).f1 == 1.0
    assert any("AC-coupled" in note for note in spikes.notes)


def test_spikes_in_time_left_out_are_left_out_and_said() -> None:
    spikes = judged(changed(30, 60, 12, 0.5, 1.5))
    assert spikes.time_s.max() < 31
    assert any(note.endswith("spikes in stretches that are left out") for note in spikes.notes)


def test_inside_is_half_open_and_takes_no_intervals() -> None:
    got = inside(np.array([0.0, 1.0, 1.5, 2.0, 3.0]), np.array([[0.0, 1.0], [1.5, 3.0]]))
    assert got.tolist() == [True, False, True, True, False]
    assert not inside(np.array([1.0]), np.empty((0, 2))).any()


MV = cell().values_mv[:20000]


@pytest.mark.parametrize("values", [MV, MV + 60.0, np.full(10, -65.0), MV[:1000] * 1e-3 - 65])
def test_values_that_may_be_mv_raise_nothing(values: FloatArray) -> None:
    assert scale_problem(values, "volts") == ""


@pytest.mark.parametrize(("factor", "words"), [
    (1e-3, "look like volts"), (1e3, "look like µV"), (10.0, "10 times too large"), (1e-6, "divided by 1000"),
    (0.01, "100 times too small"),
])
def test_values_that_cannot_be_mv_are_named_with_the_scale_they_seem_to_have(factor: float, words: str) -> None:
    line = scale_problem(factor * MV, "volts")
    assert words in line
    assert "'volts'" in line
    assert "\n" not in line


def test_volts_of_an_ac_coupled_recording_are_named() -> None:
    assert "volts around 0" in scale_problem(1e-3 * (MV + 60.0), "V")


def test_a_gain_of_zero_counts_and_nothing_at_all_are_named() -> None:
    assert "conversion factor may be 0" in scale_problem(np.zeros(50), "V")
    assert "counts of the A/D converter" in scale_problem(np.random.default_rng(0).integers(-32768, 32767, 500), "")
    assert "no finite value" in scale_problem([np.nan, np.inf], "V")
