"""Impaled cells from file to label: sweeps, fills, bias current, bad traces, a folder of short files."""

from __future__ import annotations

import numpy as np
import pytest

from tests.commands.program import column, rows_of, run
from tests.layouts import new_file, write
from unitclass.io.resolver import samples_folder
from unitclass.simulate import simulate_session
from unitclass.simulate.membrane import MV_PER_COUNT

RATE_HZ = 10_000.0


@pytest.fixture(scope="module")
def simulated():
    """Return (nerve trace, its rate, membrane potential in mV, its rate) of a post-I cell."""
    session = simulate_session("intracellular", seed=21, cell="post-I", seconds=80.0)
    nerve, cell = session.nerves[0], session.membrane
    return nerve.counts * nerve.conversion, nerve.wire.rate_hz, cell.counts * MV_PER_COUNT, cell.rate_hz


def session_file(simulated, path, *, vm=None, n_sweeps=1, cell_id="cell-7", fill="2 M potassium acetate",
                 bias_current_a=None, voltage_clamp=False, vm_shift_s=0.0, unit_scale=1e-3, plain=False):
    """Write one short session; the cell's trace may be cut into sweeps with gaps."""
    from pynwb import TimeSeries
    from pynwb.icephys import CurrentClampSeries, VoltageClampSeries

    nerve, nerve_hz, trace, rate_hz = simulated
    trace = trace if vm is None else vm
    nwb = new_file(path.stem)
    nwb.add_acquisition(TimeSeries(name="PNA", data=nerve, unit="V", rate=nerve_hz))
    if plain:
        nwb.add_acquisition(TimeSeries(name="Vm", data=trace, unit="mV", rate=rate_hz, description="membrane potential"))
        return write(nwb, path)
    device = nwb.create_device("amplifier")
    electrode = nwb.create_icephys_electrode(name="sharp", device=device, cell_id=cell_id or None,
                                             description=f"sharp electrode filled with {fill}")
    length = trace.size // n_sweeps
    for i in range(n_sweeps):
        part = trace[i * length : (i + 1) * length - (200 if n_sweeps > 1 else 0)]
        nwb.add_acquisition(CurrentClampSeries(
            name=f"sweep_{i:02d}", data=part * unit_scale, electrode=electrode, gain=1.0, rate=rate_hz,
            starting_time=i * length / rate_hz + vm_shift_s, bias_current=bias_current_a))
    if voltage_clamp:
        nwb.add_acquisition(VoltageClampSeries(name="clamped", data=np.zeros(1000), electrode=electrode, gain=1.0,
                                               rate=rate_hz))
    return write(nwb, path)


def classified(path, tmp_path, *options):
    ran = run("classify", path, "--table", tmp_path / "units.csv", "--force", *options)
    return ran, (rows_of(tmp_path / "units.csv") if ran.code == 0 else [])


@pytest.mark.parametrize(("sample", "type_id"), [("tansy-cell-a.nwb", "post-I"), ("tansy-cell-b.nwb", "early-I")])
def test_the_two_samples_classify_rightly(tmp_path, sample, type_id):
    _, rows = classified(samples_folder() / sample, tmp_path)
    assert column(rows, "suggested_type") == [type_id]


def test_sweeps_of_one_electrode_are_one_cell_named_by_its_cell_id(simulated, tmp_path):
    ran, rows = classified(session_file(simulated, tmp_path / "a.nwb", n_sweeps=4), tmp_path)
    assert ran.code == 0, ran.err
    assert column(rows, "unit") == ["cell-7"]
    assert column(rows, "suggested_type") == ["post-I"]


def test_sweeps_without_a_cell_id_are_one_cell_named_by_the_electrode(simulated, tmp_path):
    _, rows = classified(session_file(simulated, tmp_path / "a.nwb", n_sweeps=3, cell_id=""), tmp_path)
    assert column(rows, "unit") == ["sharp"]


def test_a_plain_series_that_says_membrane_potential_is_read_as_one(simulated, tmp_path):
    _, rows = classified(session_file(simulated, tmp_path / "a.nwb", plain=True), tmp_path)
    assert column(rows, "suggested_type") == ["post-I"]


def test_voltage_clamp_is_named_and_left_out(simulated, tmp_path):
    ran = run("inventory", session_file(simulated, tmp_path / "a.nwb", voltage_clamp=True))
    assert ran.code == 0
    line = next(line for line in ran.out.splitlines() if "clamped" in line)
    assert "left out" in line


def test_an_inert_fill_gives_the_potential_its_say_and_chloride_takes_it_away(simulated, tmp_path):
    _, inert = classified(session_file(simulated, tmp_path / "a.nwb"), tmp_path)
    _, chloride = classified(session_file(simulated, tmp_path / "b.nwb", fill="3 M KCl"), tmp_path)
    _, unknown = classified(session_file(simulated, tmp_path / "c.nwb", fill="something"), tmp_path)
    assert "hyperpolarised by" in inert[0]["reasons"]
    assert "chloride" in chloride[0]["reasons"]
    assert "not known" in unknown[0]["reasons"]
    assert "hyperpolarised by" not in chloride[0]["reasons"] + unknown[0]["reasons"]


def test_a_cell_held_down_by_bias_current_is_not_called_silent(simulated, tmp_path):
    quiet = np.minimum(simulated[2], -52.0) - 15.0
    _, rows = classified(session_file(simulated, tmp_path / "a.nwb", vm=quiet, bias_current_a=-200e-12), tmp_path)
    assert rows[0]["suggested_type"] == "undetermined"
    assert "bias current" in rows[0]["reasons"] + rows[0]["flags"]


def test_a_cell_without_spikes_is_suggested_from_its_potential_alone_and_marked(simulated, tmp_path):
    quiet = np.minimum(simulated[2], -52.0)
    _, rows = classified(session_file(simulated, tmp_path / "a.nwb", vm=quiet), tmp_path)
    assert rows[0]["n_spikes"] == "0"
    assert "membrane potential alone" in rows[0]["flags"]


@pytest.mark.parametrize(("kind", "words"), [("scale", "mV"), ("constant", "constant"), ("zero gain", ""),
                                             ("elsewhere", "overlap")])
def test_a_bad_trace_is_one_line_and_the_other_file_goes_on(simulated, tmp_path, kind, words):
    good, bad = session_file(simulated, tmp_path / "good.nwb"), tmp_path / "bad.nwb"
    options = {"scale": {"unit_scale": 1.0}, "constant": {"vm": np.full(simulated[2].size, -60.0)},
               "zero gain": {}, "elsewhere": {"vm_shift_s": 5000.0}}[kind]
    session_file(simulated, bad, **options)
    if kind == "zero gain":
        import h5py

        with h5py.File(bad, "r+") as file:
            file["acquisition/sweep_00/data"].attrs["conversion"] = 0.0
    ran = run("classify", bad, good, "--table", tmp_path / "units.csv", "--quiet")
    lines = [line for line in ran.err.splitlines() if line.startswith("unitclass:")]
    assert ran.code == 1, ran.err
    assert len(lines) == 1
    assert str(bad) in lines[0]
    assert words in lines[0]
    assert set(column(rows_of(tmp_path / "units.csv"), "file")) == {str(good)}


def test_a_folder_of_short_files_is_one_row_per_cell(simulated, tmp_path):
    folder = tmp_path / "week"
    folder.mkdir()
    for i in range(3):
        session_file(simulated, folder / f"day-{i}.nwb", cell_id=f"cell-{i}")
    ran = run("classify", folder, "--table", tmp_path / "units.csv")
    assert ran.code == 0
    assert column(rows_of(tmp_path / "units.csv"), "unit") == ["cell-0", "cell-1", "cell-2"]


def test_the_export_holds_the_detected_spikes_tied_to_their_electrode(simulated, tmp_path):
    from pynwb import NWBHDF5IO, validate

    path = session_file(simulated, tmp_path / "a.nwb", n_sweeps=2)
    assert run("export", path, "--out", tmp_path / "out").code == 0
    target = str(tmp_path / "out" / "a.labelled.nwb")
    assert not validate(path=target)
    with NWBHDF5IO(target, "r") as io:
        nwb = io.read()
        assert len(nwb.units["spike_times"][0]) > 100
        assert nwb.units["intracellular_electrode"][0].name == "sharp"
        assert len(nwb.units["spike_height_mv"][0]) == len(nwb.units["spike_times"][0])
        assert "respiratory_cycles" in nwb.intervals
