"""Every bad input gets one line with file, what and remedy, the right exit code, and the other files are done."""

from __future__ import annotations

import hashlib
import shutil

import h5py
import numpy as np
import pytest

from tests.commands.program import column, rows_of, run
from tests.layouts import add_units, columns_named_in_words, new_file, series_with_timestamps, simulated, write
from unitclass.io.resolver import samples_folder

SLICE = "sorrel-slice.nwb"


@pytest.fixture(scope="module")
def session():
    return simulated(n_cycles=30)


@pytest.fixture
def good(tmp_path, session):
    return columns_named_in_words(session, tmp_path / "good.nwb")


def said(ran) -> list[str]:
    return [line for line in ran.err.splitlines() if line.startswith("unitclass:")]


def spoilt(path, kind: str, good) -> None:
    if kind == "not HDF5":
        path.write_text("this is no HDF5 file\n" * 100)
    elif kind == "empty":
        path.write_bytes(b"")
    elif kind == "cut off":
        path.write_bytes(good.read_bytes()[:50_000])
    else:
        shutil.copyfile(good, path)
        with h5py.File(path, "r+") as file:
            SPOILERS[kind](file)


def _remove_units(file):
    del file["units"]


def _zero_length(file):
    del file["acquisition/physiology/data"]
    data = file["acquisition/physiology"].create_dataset("data", shape=(0, 2), dtype=float)
    data.attrs.update(conversion=1.0, unit="volts", resolution=-1.0)


def _all_nan(file):
    file["acquisition/physiology/data"][...] = np.nan


def _constant(file):
    file["acquisition/physiology/data"][...] = 3.0


def _broken_link(file):
    del file["acquisition/physiology/data"]
    file["acquisition/physiology/data"] = h5py.ExternalLink("gone.nwb", "/data")


def _other_clock(file):
    file["units/spike_times"][...] += 1e6


def _no_nerve(file):
    del file["acquisition/physiology"]


def _version_1(file):
    file.attrs["nwb_version"] = "NWB-1.0.6"


SPOILERS = {"no units": _remove_units, "zero-length data": _zero_length, "all NaN": _all_nan,
            "constant nerve": _constant, "broken external link": _broken_link, "no common time": _other_clock,
            "no nerve": _no_nerve, "NWB 1": _version_1}
WORDS = {"not HDF5": "not an HDF5 file", "empty": "empty", "cut off": "cut off", "no units": "no units",
         "zero-length data": "", "all NaN": "NaN", "constant nerve": "constant", "broken external link": "",
         "no common time": "do not overlap", "no nerve": "nerve", "NWB 1": "NWB 1"}


@pytest.mark.parametrize("kind", WORDS)
def test_a_bad_file_is_one_line_and_the_other_file_is_done(tmp_path, good, kind):
    bad = tmp_path / "bad.nwb"
    spoilt(bad, kind, good)
    ran = run("classify", bad, good, "--table", tmp_path / "units.csv", "--quiet")
    assert ran.code == 1
    lines = said(ran)
    assert len(lines) == 1, ran.err
    assert str(bad) in lines[0]
    assert WORDS[kind] in lines[0]
    assert ";" in lines[0], "no remedy"
    assert "Traceback" not in ran.err
    assert set(column(rows_of(tmp_path / "units.csv"), "file")) == {str(good)}


def test_no_usable_file_at_all_is_exit_code_3(tmp_path, good):
    bad = tmp_path / "bad.nwb"
    spoilt(bad, "not HDF5", good)
    assert run("classify", bad).code == 3


def test_a_file_that_is_not_there_is_said_and_the_rest_goes_on(tmp_path, good):
    ran = run("inventory", tmp_path / "gone.nwb", good)
    assert ran.code == 1
    assert "no such file" in ran.err


def test_wrong_use_is_exit_code_2_and_one_line():
    for argv in (("classify",), ("nonsense",), ("classify", "x.nwb", "--regime", "four-phase"),
                 ("simulate", "nonsense", "--out", "x")):
        ran = run(*argv)
        assert ran.code == 2
        assert len(ran.err.strip().splitlines()) == 1


def test_a_version_stored_as_an_array_is_read_all_the_same(tmp_path, good):
    path = tmp_path / "odd.nwb"
    shutil.copyfile(good, path)
    with h5py.File(path, "r+") as file:
        version = file.attrs["nwb_version"]
        del file.attrs["nwb_version"]
        file.attrs.create("nwb_version", np.array([version], dtype=h5py.string_dtype()))
    ran = run("inventory", path)
    assert ran.code == 0
    assert "stored oddly" in ran.out


def test_two_equally_good_nerves_are_named_and_asked_for(tmp_path, session):
    from pynwb import TimeSeries

    nwb = new_file()
    trace = next(iter(session.traces.values()))
    for side in ("left", "right"):
        nwb.add_acquisition(TimeSeries(name=f"phrenic_{side}", data=trace, unit="V", rate=2500.0))
    add_units(nwb, session)
    path = write(nwb, tmp_path / "two.nwb")
    ran = run("classify", path)
    assert ran.code == 3
    assert "phrenic_left and phrenic_right" in ran.err
    assert "--nerve" in ran.err
    assert run("classify", path, "--nerve", "phrenic_left").code == 0
    assert run("inventory", path).code == 0


def test_few_cycles_make_undetermined_rows_with_the_count_and_exit_code_0(tmp_path):
    short = simulated(n_cycles=6)
    ran = run("classify", series_with_timestamps(short, tmp_path / "short.nwb"), "--table", tmp_path / "units.csv")
    assert ran.code == 0, ran.err
    rows = rows_of(tmp_path / "units.csv")
    assert set(column(rows, "suggested_type")) == {"undetermined"}
    assert set(column(rows, "probability")) == {""}
    assert all(0 < int(n) < 10 for n in column(rows, "n_cycles"))


def test_odd_spike_times_are_said_and_mended(tmp_path, session):
    from dataclasses import replace

    trains = list(session.trains)
    trains[0] = np.concatenate([trains[0][::-1], [np.nan, -5.0, 1e5]])
    trains[1] = np.zeros(0)
    odd = replace(session, trains=tuple(trains))
    path = series_with_timestamps(odd, tmp_path / "odd.nwb")
    ran = run("classify", path, "--table", tmp_path / "units.csv")
    assert ran.code == 0, ran.err
    for words in ("not numbers", "go backwards", "before the recording", "beyond the recording"):
        assert words in ran.err
    rows = rows_of(tmp_path / "units.csv")
    assert rows[0]["suggested_type"] == session.types[0]
    assert rows[1]["suggested_type"] == "silent"
    assert rows[1]["n_spikes"] == "0"


def test_a_table_that_exists_is_not_overwritten_without_force(tmp_path, good):
    table = tmp_path / "units.csv"
    table.write_text("mine")
    ran = run("classify", good, "--table", table)
    assert ran.code == 1
    assert "exists" in ran.err
    assert table.read_text() == "mine"
    assert run("classify", good, "--table", table, "--force").code == 0


def test_an_export_leaves_the_source_as_it_was_and_refuses_a_target_that_exists(tmp_path, good):
    before = hashlib.sha256(good.read_bytes()).hexdigest()
    assert run("export", good, "--out", tmp_path / "out").code == 0
    assert hashlib.sha256(good.read_bytes()).hexdigest() == before
    again = run("export", good, "--out", tmp_path / "out")
    assert again.code == 1
    assert "exists" in again.err
    assert run("export", good, "--out", tmp_path / "out", "--force").code == 0


def test_an_unknown_condition_is_refused_with_the_names_of_those_there_are(good):
    ran = run("classify", good, "--only", "moonlight")
    assert ran.code == 3
    assert "5 % CO2" in ran.err


def test_a_wrong_setting_is_refused_by_name_with_the_nearest_right_one(tmp_path, good):
    settings = tmp_path / "settings.toml"
    settings.write_text("[cycles]\nsigh_amplitud = 2.0\n")
    ran = run("classify", good, "--settings", settings)
    assert ran.code == 2
    assert "sigh_amplitude" in ran.err


def test_json_goes_to_stdout_with_the_tables_names():
    import json

    ran = run("classify", samples_folder() / SLICE, "--json", "--quiet")
    rows = json.loads(ran.out)
    assert ran.code == 0
    assert {"file", "unit", "suggested_type", "probability", "reasons"} <= set(rows[0])


def test_names_from_a_file_bring_no_escape_sequences_to_the_terminal(tmp_path, session):
    from pynwb import TimeSeries

    nwb = new_file("\x1b[31mred\x1b[0m")
    nwb.add_acquisition(TimeSeries(name="PNA", data=next(iter(session.traces.values())), unit="V", rate=2500.0,
                                   description="raw \x1b]0;owned\x07 \u202e nerve"))
    add_units(nwb, session)
    path = write(nwb, tmp_path / "hostile.nwb")
    for command in ("inventory", "cycles", "classify"):
        ran = run(command, path)
        assert ran.code == 0, ran.err
        assert "\x1b" not in ran.out + ran.err
        assert "\u202e" not in ran.out + ran.err


def test_two_files_of_one_name_do_not_overwrite_each_other_even_with_force(tmp_path, good):
    for folder in ("monday", "tuesday"):
        (tmp_path / folder).mkdir()
        shutil.copyfile(good, tmp_path / folder / "same.nwb")
    ran = run("export", tmp_path / "monday", tmp_path / "tuesday", "--out", tmp_path / "out", "--force")
    assert ran.code == 1
    assert len(said(ran)) == 1
    assert "tuesday" in said(ran)[0]
    assert set(column(rows_of(tmp_path / "out" / "units.csv"), "file")) == {str(tmp_path / "monday" / "same.nwb")}


def test_an_unknown_role_in_the_settings_is_refused_with_those_there_are(tmp_path, good):
    settings = tmp_path / "settings.toml"
    settings.write_text('[rig]\nroles = {physiology = "frenic"}\n')
    ran = run("classify", good, "--settings", settings)
    assert ran.code == 2
    assert "phrenic" in ran.err


def test_a_table_of_conditions_that_is_not_there_is_one_line_in_every_command(tmp_path, good):
    for command in (("classify", good), ("cycles", good), ("export", good, "--out", tmp_path / "o"),
                    ("report", good, "--out", tmp_path / "r")):
        ran = run(*command, "--conditions", tmp_path / "none.csv")
        assert ran.code == 2
        assert len(said(ran)) == 1
        assert "none.csv" in said(ran)[0]
