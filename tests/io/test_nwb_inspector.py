"""The NWB inspector and pynwb's validator have nothing to say of a labelled file that they do not say of its source.

Outside check: nwbinspector (every check, lowest threshold) and pynwb.validate, as installed.
"""

from __future__ import annotations

from collections import Counter
from dataclasses import replace
from functools import cache

import h5py
import numpy as np
import pynwb
import pytest

from tests.io import sources
from tests.io.labelling import label, label_cell
from tests.results import condition_result, cycles, session_result, unit_result
from unitclass.io import nwb_write
from unitclass.io.nwb_linked_copy import copy_with_links
from unitclass.records import Cycles, Label

inspector = pytest.importorskip("nwbinspector", reason="nwbinspector is in the extra 'test'")


@cache
def messages(path):
    """Return every message with its place; those of pynwb's validator are among them."""
    found = inspector.inspect_nwbfile(nwbfile_path=str(path))
    return Counter((m.importance.name, m.check_function_name, m.location, m.message) for m in found)


def added(source, target):
    return messages(target) - messages(source)


def in_session(*units, **changes):
    condition = replace(condition_result("baseline"), units=units, **changes)
    return replace(session_result(), conditions=(condition,))


@pytest.fixture(autouse=True)
def unchecked(monkeypatch):
    """Let the inspector alone judge, so that it is not the program's own check that passes here."""
    monkeypatch.setattr(nwb_write, "check_written", lambda *_: None)


@pytest.fixture(scope="module")
def source(tmp_path_factory):
    return sources.session_file(tmp_path_factory.mktemp("rig") / "heron_04.nwb")


def test_the_inspector_and_the_validator_do_find_what_is_wrong(tmp_path):
    """Without this, silence would prove nothing."""
    source = sources.session_file(tmp_path / "a.nwb")
    with pynwb.NWBHDF5IO(source, "a") as io:
        nwb = io.read()
        table = pynwb.core.DynamicTable("one_row", "a table", id=[0])
        table.add_column("empty", "nothing", data=[np.nan])
        nwb.add_analysis(table)
        io.write(nwb)
    with h5py.File(source, "r+") as file:
        del file["acquisition/cVN/data"].attrs["unit"]
    found = {(level, name) for level, name, _, _ in messages(source)}
    assert ("BEST_PRACTICE_SUGGESTION", "check_single_row") in found
    assert ("BEST_PRACTICE_SUGGESTION", "check_col_not_nan") in found
    assert "PYNWB_VALIDATION" in {level for level, _ in found}


@pytest.mark.parametrize("options", [{"only": "baseline"}, {"link_raw": True}])
def test_a_session_of_two_conditions(source, tmp_path, options):
    assert not added(source, label(source, tmp_path / "out.nwb", session_result(), **options))


def test_a_session_without_any_decision(source, tmp_path):
    assert not added(source, label(source, tmp_path / "out.nwb", labels={}))


def test_units_of_which_nothing_can_be_said(source, tmp_path):
    silent = dict.fromkeys(("3", "7", "12", "20", "31"), "silent")
    assert not added(source, label(source, tmp_path / "out.nwb", sources.one_condition(silent), labels={}))


def test_one_unit_in_one_condition(tmp_path):
    source = sources.session_file(tmp_path / "a.nwb", (3,))
    recording = sources.session_recording(source, (3,))
    result = sources.one_condition({"3": "early-I"})
    assert not added(source, label(source, tmp_path / "out.nwb", result, recording))


def test_one_intracellular_cell_in_one_condition(tmp_path):
    source = sources.cell_file(tmp_path / "cell.nwb")
    target = label_cell(source, tmp_path / "out.nwb")
    assert not added(source, target)
    assert not added(source, label_cell(target, tmp_path / "again.nwb", force=True))


def test_columns_that_hold_only_zeros_and_ones(source, tmp_path):
    """Counts, probabilities and marks that happen to look like a yes and a no."""
    unit = unit_result("3")
    few = replace(unit.histogram, counts=np.eye(40)[3])
    sure = replace(unit.suggestion, probabilities={"early-I": 1.0, "tonic": 0.0})
    never = replace(unit.suggestion, type="tonic", probabilities={"tonic": 0.0, "early-I": 1.0})
    units = (replace(unit, histogram=few, n_spikes=1, suggestion=sure),
             replace(unit, unit="7", histogram=replace(few, counts=np.zeros(40)), n_spikes=0, suggestion=never),
             replace(unit, unit="12", n_spikes=1, histogram=few))
    marks = replace(cycles(), late_e=np.arange(39) % 2)
    condition = condition_result("baseline")
    result = in_session(*units, nerve_cycles=replace(condition.nerve_cycles, cycles=marks))
    assert not added(source, label(source, tmp_path / "out.nwb", result))


@pytest.mark.parametrize("words", [("yes", "no", "no"), ("True", "False", "True")])
def test_columns_of_the_source_that_say_yes_and_no(source, tmp_path, words):
    units = [unit_result(name, columns={"tagged": word}) for name, word in zip(("3", "7", "12"), words, strict=True)]
    assert not added(source, label(source, tmp_path / "out.nwb", in_session(*units)))


def test_a_note_that_looks_like_program_text(source, tmp_path):
    labels = {("3", "baseline"): Label("early-I", "A", "", "viewed", note="{'a': 1}")}
    assert not added(source, label(source, tmp_path / "out.nwb", labels=labels))


def test_fewer_than_two_cycles_make_no_table(source, tmp_path):
    condition = condition_result("baseline")
    one: Cycles = cycles().select(np.arange(39) == 0)
    result = in_session(*condition.units, nerve_cycles=replace(condition.nerve_cycles, cycles=one))
    target = label(source, tmp_path / "out.nwb", result)
    assert not added(source, target)
    with pynwb.NWBHDF5IO(target, "r") as io:
        assert not io.read().intervals


def test_a_copy_with_links_alone_is_valid(source, tmp_path):
    copy_with_links(str(source), tmp_path / "linked.nwb")
    assert not added(source, tmp_path / "linked.nwb")
