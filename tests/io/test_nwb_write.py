"""What stands in a labelled file, as NWB's own library reads it."""

from __future__ import annotations

import hashlib
from dataclasses import replace

import h5py
import numpy as np
import pynwb
import pytest

from tests.io import sources
from tests.io.labelling import label, label_cell, label_names, read
from tests.results import condition_result, session_result, unit_result
from unitclass.errors import UsageError
from unitclass.io.nwb_write import labelled_name
from unitclass.records import Label


@pytest.fixture(scope="module")
def source(tmp_path_factory):
    return sources.session_file(tmp_path_factory.mktemp("rig") / "heron_04.nwb")


@pytest.fixture(scope="module")
def cell(tmp_path_factory):
    return sources.cell_file(tmp_path_factory.mktemp("rig") / "cell.nwb")


@pytest.fixture(scope="module")
def labelled(source):
    """Return the file labelled in its only condition."""
    return label(source, source.parent / "labelled.nwb")


@pytest.fixture(scope="module")
def labelled_twice(source):
    """Return the file labelled in two conditions."""
    return label(source, source.parent / "twice.nwb", session_result())


@pytest.fixture(scope="module")
def labelled_cell(cell):
    return label_cell(cell, cell.parent / "labelled.nwb")


# -------------------------------------------------------------------------- units table

def test_units_hold_decision_suggestion_and_probability_of_the_only_condition(labelled):
    with read(labelled) as nwb:
        table = nwb.units.to_dataframe()
    assert list(table["firing_type"]) == ["early-I", "post-I", "", "", ""]  # the third is in disagreement
    assert list(table["suggested_firing_type"]) == ["early-I", "post-I", "aug-E", "silent", "undetermined"]
    np.testing.assert_array_equal(table["firing_type_probability"], [0.93, 0.93, 0.93, np.nan, np.nan])
    assert list(table["region"]) == ["rostral column"] * 5
    np.testing.assert_array_equal(table["spike_times"][3], sources.spikes_of(0))


def test_with_several_conditions_the_units_table_takes_the_one_named(source, labelled_twice, tmp_path):
    result = session_result()
    labels = {("3", "baseline"): Label("early-I", "A", "", "viewed"),
              ("3", "pons removed"): Label("tonic", "A", "", "viewed")}
    assert not label_names(labelled_twice)
    with read(label(source, tmp_path / "one.nwb", result, labels=labels, only="pons removed")) as nwb:
        assert list(nwb.units["firing_type"][:]) == ["tonic", "", "", "", ""]


def test_an_unknown_condition_is_wrong_use_and_the_known_ones_are_named(source, tmp_path):
    with pytest.raises(UsageError, match="no condition called 'hypoxia'; the conditions are: baseline"):
        label(source, tmp_path / "out.nwb", only="hypoxia")
    assert not (tmp_path / "out.nwb").exists()


def test_a_column_that_would_be_empty_is_left_out(source, tmp_path):
    names = label_names(label(source, tmp_path / "out.nwb", labels={}))
    assert names == ["suggested_firing_type", "firing_type_probability"]


def test_rows_follow_the_ids_when_not_all_units_were_analysed(source, tmp_path):
    recording = sources.session_recording(source)
    result = sources.one_condition({"31": "aug-E", "7": "pre-I"})
    recording = replace(recording, units=(recording.units[4], recording.units[1]))
    with read(label(source, tmp_path / "out.nwb", result, recording)) as nwb:
        assert list(nwb.units["suggested_firing_type"][:]) == ["", "pre-I", "", "", "aug-E"]
        types = nwb.analysis["firing_types"]
        assert list(types["unit"].data[:]) == [4, 1]


def test_the_laboratorys_own_column_of_the_same_name_is_kept(tmp_path):
    source = sources.session_file(tmp_path / "heron_04.nwb")
    with pynwb.NWBHDF5IO(source, "a") as io:
        nwb = io.read()
        nwb.units.add_column("firing_type", "what the sorter calls it", data=list("abcde"))
        io.write(nwb)
    with read(label(source, tmp_path / "out.nwb")) as nwb:
        assert list(nwb.units["firing_type"][:]) == list("abcde")
        assert list(nwb.units["unitclass_firing_type"][:]) == ["early-I", "post-I", "", "", ""]


# ----------------------------------------------------------------------- analysis tables

def test_firing_types_hold_a_row_per_unit_and_condition(labelled_twice):
    with read(labelled_twice) as nwb:
        types = nwb.analysis["firing_types"]
        assert len(types) == 10
        assert types["unit"].table is nwb.units
        assert list(types["unit"].data[:]) == [0, 1, 2, 3, 4] * 2
        assert list(types["unit_id"][:]) == ["3", "7", "12", "20", "31"] * 2
        assert list(types["condition"][:]) == ["baseline"] * 5 + ["pons removed"] * 5
        assert list(types["suggested_type"][:5]) == ["early-I", "post-I", "aug-E", "silent", "undetermined"]
        assert list(types["type"][:3]) == ["early-I", "post-I", "aug-E"]
        assert list(types["reviewer"][:2]) == ["Ada Fischer"] * 2
        assert types["reviewed_at"][0] == "2031-03-04T10:20:30+00:00"
        assert (types["how"][0], types["note"][0]) == ("viewed", "clean")
        assert list(types["region"][:]) == ["rostral column"] * 10


def test_probabilities_of_all_types_sum_to_one_in_every_row_that_has_any(labelled):
    with read(labelled) as nwb:
        types = nwb.analysis["firing_types"]
        names = [n for n in types.colnames if n.startswith("probability_")]
        total = np.array([types[name][:] for name in names]).sum(axis=0)
    assert "probability_early-I" in names
    np.testing.assert_allclose(total[:3], 1.0, rtol=1e-12)
    assert np.isnan(total[3:]).all()


def test_histograms_give_the_counts_and_the_exposure_of_each_row(labelled):
    result = sources.one_condition()
    with read(labelled) as nwb:
        table = nwb.analysis["phase_histograms"]
        counts, exposure = table["counts"][:], table["exposure_s"][:]
        assert list(table["unit"].data[:]) == [0, 1, 2, 3, 4]
    for row, (_, unit) in enumerate(result.units()):
        np.testing.assert_array_equal(counts[row], unit.histogram.counts)
        np.testing.assert_allclose(exposure[row], unit.histogram.exposure_s, rtol=1e-15)


def test_cycles_are_a_table_of_intervals_in_order_of_time(labelled_twice):
    with read(labelled_twice) as nwb:
        table = nwb.intervals["respiratory_cycles"].to_dataframe()
    assert len(table) == 2 * 39
    assert (np.diff(table["start_time"]) > 0).all()
    assert (table["stop_time"] > table["start_time"]).all()
    assert table["accepted"].dtype == bool
    assert (~table["accepted"]).sum() == 4
    assert list(table["kind"][[5, 38]]) == ["sigh", "edge"]
    assert {"offset_s", "ti_s", "te_s", "ttot_s", "duty", "peak", "area", "peak_cVN", "area_cVN"} <= set(table)
    assert "late_e" not in table  # nobody could tell


def test_the_description_is_enough_to_repeat_the_run(labelled):
    with read(labelled) as nwb:
        words = nwb.analysis["firing_types"].description
    for part in ("unitclass 0.1.0", "5e771265d1ce", "7e3b1a7ed1ce", "object id 0b7e7f0e", "nerve PNA",
                 "baseline: 0.000 to 120.000 s", "37 of 39 cycles used", "raw: band-pass 100 to 3000 Hz"):
        assert part in words
    assert words.startswith("unitclass")


def test_names_and_texts_of_a_file_are_made_safe(source, tmp_path):
    units = (unit_result("3", flags=("a\x1b[2Jb",)), unit_result("7"))
    condition = replace(condition_result("base\nline"), units=units)
    cycles = condition.nerve_cycles.cycles
    odd = replace(cycles, other_peak={"nerves/X:1": cycles.peak}, other_area={"nerves/X:1": cycles.area})
    condition = replace(condition, nerve_cycles=replace(condition.nerve_cycles, cycles=odd))
    result = replace(session_result(), conditions=(condition,))
    labels = {units[0].key: Label("early-I", "A", "", "viewed", note='{"dose": 3}')}
    with read(label(source, tmp_path / "out.nwb", result, labels=labels)) as nwb:
        types = nwb.analysis["firing_types"]
        assert types["flags"][0] == "ab"
        assert types["note"][0] == '("dose": 3)'
        assert "peak_nerves_X_1" in nwb.intervals["respiratory_cycles"].colnames


# -------------------------------------------------------------------------- intracellular

def test_a_cell_without_units_gets_a_units_table_of_its_spikes(labelled_cell):
    with read(labelled_cell) as nwb:
        unit = sources.cell_result().conditions[0].units[0]
        assert unit.vm_spikes is not None
        np.testing.assert_array_equal(nwb.units["spike_times"][0], unit.vm_spikes.time_s)
        np.testing.assert_array_equal(nwb.units["spike_height_mv"][0], unit.vm_spikes.height_mv)
        np.testing.assert_array_equal(nwb.units["obs_intervals"][0], [[0.0, 120.0]])
        assert nwb.units["cell"][0] == "cell 2"
        assert nwb.units["intracellular_electrode"][0] is nwb.icephys_electrodes["sharp 1"]
        assert nwb.units.resolution == pytest.approx(1 / sources.RATE_HZ)
        assert nwb.units["suggested_firing_type"][0] == "post-I"


def test_the_mean_membrane_potential_stands_beside_the_types(labelled_cell):
    with read(labelled_cell) as nwb:
        table = nwb.analysis["mean_membrane_potential"]
        vm = sources.cell_result().conditions[0].units[0].vm
        assert vm is not None
        np.testing.assert_array_equal(table["mean_mv"][0], vm.mean_mv)
        assert (table["swing_mv"][0], table["resting_mv"][0]) == (12.0, -56.0)
        assert list(table["unit"].data[:]) == [0]


def test_the_spikes_of_several_conditions_are_one_train(cell, tmp_path):
    first = sources.cell_result().conditions[0]
    second = sources.cell_result(start_s=120.0).conditions[0]
    result = replace(sources.cell_result(), conditions=(first, second))
    with read(label_cell(cell, tmp_path / "out.nwb", result)) as nwb:
        times = nwb.units["spike_times"][0]
        assert times.size == 2 * 156
        assert (np.diff(times) > 0).all()
        np.testing.assert_array_equal(nwb.units["obs_intervals"][0], [[0.0, 240.0]])


def test_a_cell_without_spikes_is_labelled_without_a_units_table(cell, tmp_path):
    result = sources.cell_result()
    unit = result.conditions[0].units[0]
    assert unit.vm_spikes is not None
    none = {name: np.zeros(0) for name in ("time_s", "threshold_mv", "height_mv", "half_width_ms", "ahp_mv",
                                           "max_dvdt_mv_ms")}
    silent = replace(unit, vm_spikes=replace(unit.vm_spikes, **none))
    result = replace(result, conditions=(replace(result.conditions[0], units=(silent,)),))
    with read(label_cell(cell, tmp_path / "out.nwb", result)) as nwb:
        assert nwb.units is None
        assert nwb.analysis["firing_types"]["unit_id"][0] == "cell 2"


def test_a_cell_beside_sorted_units_gets_a_table_of_its_own(source, tmp_path):
    recording = replace(sources.session_recording(source), membranes=sources.cell_recording(source).membranes)
    cell = sources.cell_result().conditions[0].units[0]
    condition = condition_result("", {"3": "early-I"})
    result = replace(session_result(), conditions=(replace(condition, units=(*condition.units, cell)),))
    with read(label(source, tmp_path / "out.nwb", result, recording)) as nwb:
        assert list(nwb.units["suggested_firing_type"][:]) == ["early-I", "", "", "", ""]
        assert nwb.analysis["intracellular_units"]["cell"][0] == "cell 2"
        types = nwb.analysis["firing_types"]
        assert [list(x.index) for x in (types["unit"][0], types["unit"][1])] == [[3], []]


# -------------------------------------------------------------------------------- the file

def test_the_source_is_not_changed_by_a_byte_and_the_copy_has_its_own_object_id(source, tmp_path):
    before = hashlib.sha256(source.read_bytes()).hexdigest()
    label(source, tmp_path / "out.nwb")
    label(source, tmp_path / "linked.nwb", link_raw=True)
    assert hashlib.sha256(source.read_bytes()).hexdigest() == before
    with h5py.File(source) as old, h5py.File(tmp_path / "out.nwb") as new:
        assert old.attrs["object_id"] != new.attrs["object_id"]
        assert old["identifier"][()] == new["identifier"][()]
        assert len(new["file_create_date"]) == len(old["file_create_date"]) + 1


def test_a_second_export_replaces_the_programs_own_tables_and_columns(labelled, tmp_path):
    changed = sources.one_condition({"3": "ramp-I", "7": "tonic", "12": "NRM"})
    second = label(labelled, tmp_path / "second.nwb", changed, labels={})
    with read(second) as nwb:
        assert list(nwb.units["suggested_firing_type"][:]) == ["ramp-I", "tonic", "NRM", "", ""]
        assert "firing_type" not in nwb.units.colnames
        assert sorted(nwb.analysis) == ["firing_types", "phase_histograms"]
        assert len(nwb.analysis["firing_types"]) == 3
        assert list(nwb.intervals) == ["respiratory_cycles"]


def test_a_second_export_of_a_cell_finds_its_units_table_again(labelled_cell, tmp_path):
    with read(label_cell(labelled_cell, tmp_path / "second.nwb")) as nwb:
        assert len(nwb.units) == 1
        assert sorted(nwb.analysis) == ["firing_types", "mean_membrane_potential", "phase_histograms"]


def test_a_session_with_no_usable_condition_still_gets_its_copy(source, tmp_path):
    with read(label(source, tmp_path / "out.nwb", session_result(conditions=()))) as nwb:
        assert len(nwb.units) == 5
        assert not nwb.analysis


@pytest.mark.parametrize(("source_name", "expected"), [
    ("rig/heron_04.nwb", "heron_04.labelled.nwb"), ("a.b.NWB", "a.b.labelled.nwb"),
    ("x.nwb.h5", "x.labelled.nwb"), ("noend", "noend.labelled.nwb")])
def test_the_copy_is_named_after_the_stem(source_name, expected):
    assert labelled_name(source_name) == expected


def test_a_units_table_in_a_processing_module_is_labelled_where_it_stands(tmp_path):
    source = sources.session_file(tmp_path / "a.nwb")
    with h5py.File(source, "r+") as file:
        module = file["processing"].create_group("ecephys")
        for name, value in (("neurodata_type", "ProcessingModule"), ("namespace", "core"),
                            ("description", "sorted"), ("object_id", "6f6c0d1e-7b3a-4f0e-9d43-0d6f9a2b1c11")):
            module.attrs[name] = value
        file.move("units", "processing/ecephys/units")
    with read(label(source, tmp_path / "out.nwb")) as nwb:
        table = nwb.processing["ecephys"]["units"]
        assert list(table["firing_type"][:]) == ["early-I", "post-I", "", "", ""]
        assert nwb.analysis["firing_types"]["unit"].table is table
