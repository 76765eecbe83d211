from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from tests.simulators.sessions import in_memory, whole
from unitclass.analysis import analyse, cycles_only
from unitclass.errors import FileError
from unitclass.io.template_files import read_library
from unitclass.records import ArraySpikes, Condition, Unit
from unitclass.settings import Settings
from unitclass.simulate import simulate_session

LIBRARY, SETTINGS = read_library(), Settings()
CLEAR = ("early-I", "ramp-I", "post-I", "aug-E", "NRM")


@pytest.fixture(scope="module")
def recording():
    made, _ = whole("rates", "three-phase", 1, n_cycles=40, rng=np.random.default_rng(8), types=CLEAR, hardness=0.2,
                    peak_hz=(20.0, 80.0), with_other=False, raw_rate_hz=2500.0)
    return made


@pytest.fixture(scope="module")
def result(recording):
    return analyse(recording, LIBRARY, SETTINGS)


def test_clear_cells_get_their_true_types_from_raw_nerve_to_label(result):
    assert [unit.suggestion.type for _, unit in result.units()] == list(CLEAR)


def test_the_same_recording_gives_the_same_answer(recording, result):
    again = analyse(recording, LIBRARY, SETTINGS)
    for (_, a), (_, b) in zip(result.units(), again.units(), strict=True):
        assert a.suggestion.probabilities == b.suggestion.probabilities
        assert a.modulation == b.modulation


def test_there_is_one_result_per_unit_and_condition(recording):
    middle = recording.stop_s / 2
    two = replace(recording, conditions=(Condition("a", 0.0, middle), Condition("b", middle, recording.stop_s)))
    found = analyse(two, LIBRARY, SETTINGS)
    assert [(u.unit, u.condition) for _, u in found.units()] == [
        (unit.id, name) for name in ("a", "b") for unit in recording.units]


def test_no_cycle_of_a_condition_reaches_into_another(recording):
    middle = recording.stop_s / 2
    two = replace(recording, conditions=(Condition("a", 0.0, middle), Condition("b", middle, recording.stop_s)))
    first, second = (c.nerve_cycles.cycles.used() for c in cycles_only(two, LIBRARY, SETTINGS).conditions)
    assert first.end_s.max() <= middle + 0.02
    assert second.onset_s.min() >= middle - 0.02


def test_a_condition_without_a_rhythm_gives_undetermined_rows_and_the_rest_is_done(recording):
    gap = Condition("before", -50.0, -10.0)
    both = replace(recording, conditions=(gap, Condition("rest", 0.0, recording.stop_s)))
    found = analyse(both, LIBRARY, SETTINGS)
    assert {u.suggestion.type for u in found.conditions[0].units} == {"undetermined"}
    assert found.conditions[0].problem
    assert [u.suggestion.type for u in found.conditions[1].units] == list(CLEAR)


def test_nerve_and_spikes_that_share_no_moment_are_one_line_with_both_spans(recording):
    late = tuple(Unit(u.id, ArraySpikes(u.train.read() + 1e5), u.observed_s) for u in recording.units)
    with pytest.raises(FileError, match=r"do not overlap in time") as error:
        analyse(replace(recording, units=late), LIBRARY, SETTINGS)
    assert f"{recording.stop_s:.1f}" in str(error.value)
    assert "100" in str(error.value)


def test_a_recording_without_cells_is_refused_but_its_cycles_are_not(recording):
    bare = replace(recording, units=())
    with pytest.raises(FileError, match="no units"):
        analyse(bare, LIBRARY, SETTINGS)
    assert cycles_only(bare, LIBRARY, SETTINGS).conditions[0].nerve_cycles.cycles.n_cycles > 30


def test_a_conduction_delay_moves_the_phase_but_not_the_cycle_table(recording, result):
    slow = replace(SETTINGS, classify=replace(SETTINGS.classify, conduction_delay_ms=100.0))
    moved = analyse(recording, LIBRARY, slow)
    np.testing.assert_array_equal(moved.conditions[0].nerve_cycles.cycles.onset_s,
                                  result.conditions[0].nerve_cycles.cycles.onset_s)
    early, late = (next(u for _, u in r.units() if u.suggestion.type == "post-I") for r in (result, moved))
    assert late.features.peak_phase >= early.features.peak_phase


@pytest.mark.parametrize("cell", ["post-I", "early-I"])
def test_an_impaled_cell_is_classified_from_its_own_spikes_and_potential(cell):
    found = analyse(in_memory(simulate_session("intracellular", seed=3, cell=cell)), LIBRARY, SETTINGS)
    unit = found.conditions[0].units[0]
    assert unit.suggestion.type == cell
    assert unit.vm is not None
    assert any("polarised by" in reason for reason in unit.suggestion.reasons)


def test_the_digest_of_a_unit_is_that_of_its_spikes_not_of_its_id(recording, result):
    renamed = tuple(replace(u, id=f"x{u.id}") for u in recording.units)
    other = analyse(replace(recording, units=renamed), LIBRARY, SETTINGS)
    assert [u.digest for _, u in result.units()] == [u.digest for _, u in other.units()]
    assert len({u.digest for _, u in result.units()}) == len(CLEAR)


def test_a_modulation_that_is_certain_but_too_shallow_to_speak_of_is_none(recording):
    """A regular train shows a swing of four per cent to the test; nobody calls such a cell modulated."""
    start, stop = recording.start_s, recording.stop_s
    cycles = cycles_only(recording, LIBRARY, SETTINGS).conditions[0].nerve_cycles.cycles
    time = np.arange(start, stop, 1e-3)
    phase = np.interp(time, cycles.onset_s, np.arange(cycles.n_cycles))
    expected = np.cumsum(60.0 * (1 + 0.04 * np.cos(2 * np.pi * phase))) * 1e-3
    spikes = np.interp(np.arange(1.0, expected[-1]), expected, time)  # one spike a unit of expectation: hardly any noise
    one = replace(recording, units=(Unit("steady", ArraySpikes(spikes), None),))
    (_, unit), = analyse(one, LIBRARY, SETTINGS).units()
    assert unit.modulation.eta_squared_p <= 0.01
    assert unit.modulation.depth_high < 0.1
    assert unit.suggestion.type == "NRM"
