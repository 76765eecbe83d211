"""The same session in several laboratories' layouts gets the same answers."""

from __future__ import annotations

import pytest

from tests.commands.program import column, rows_of, run
from tests.layouts import LAYOUTS, simulated

EXPECTED_CONDITIONS = {"channels": ["baseline", "high CO2"], "timestamps": ["baseline"], "integrated": [""],
                       "columns": ["5 % CO2"]}
EXPECTED_NERVE = {"channels": "neurograms/right phrenic", "timestamps": "PNA", "integrated": "intPNA",
                  "columns": "physiology/PND"}


@pytest.fixture(scope="module")
def session():
    return simulated(trouble=("hum",))


@pytest.mark.parametrize("layout", LAYOUTS)
def test_units_get_their_true_types_whatever_the_layout(tmp_path, session, layout):
    path = LAYOUTS[layout](session, tmp_path / f"{layout}.nwb")
    ran = run("classify", path, "--table", tmp_path / "units.csv")
    assert ran.code == 0, ran.err
    rows = rows_of(tmp_path / "units.csv")
    assert list(dict.fromkeys(column(rows, "condition"))) == EXPECTED_CONDITIONS[layout]
    assert set(column(rows, "nerve")) == {EXPECTED_NERVE[layout]}
    assert column(rows, "suggested_type") == list(session.types) * len(EXPECTED_CONDITIONS[layout])
    assert set(column(rows, "animal")) == {"woodcock-3"}


def test_a_region_column_is_carried_into_the_table_under_its_own_name(tmp_path, session):
    path = LAYOUTS["timestamps"](session, tmp_path / "a.nwb")
    run("classify", path, "--table", tmp_path / "units.csv")
    assert column(rows_of(tmp_path / "units.csv"), "region")[:2] == ["BötC", "preBötC"]


def test_times_are_on_the_session_clock(tmp_path, session):
    path = LAYOUTS["timestamps"](session, tmp_path / "a.nwb")
    run("cycles", path, "--table", tmp_path / "cycles.csv")
    onsets = [float(x) for x in column(rows_of(tmp_path / "cycles.csv"), "onset_s")]
    assert min(onsets) > 1000.0


def test_an_invalid_stretch_is_used_by_no_cycle(tmp_path, session):
    path = LAYOUTS["columns"](session, tmp_path / "a.nwb")
    run("cycles", path, "--table", tmp_path / "cycles.csv")
    for row in rows_of(tmp_path / "cycles.csv"):
        if row["accepted"] == "true":
            assert float(row["end_s"]) <= 70.0 or float(row["onset_s"]) >= 74.0


def test_a_plain_table_gives_conditions_to_a_file_that_has_none(tmp_path, session):
    path = LAYOUTS["integrated"](session, tmp_path / "a.nwb")
    table = tmp_path / "conditions.csv"
    half = session.stop_s / 2
    table.write_text(f"file,start_s,stop_s,condition,animal,cell\na.nwb,0,{half},control,hare-1,\na.nwb,{half},,drug,hare-1,\n")
    ran = run("classify", path, "--table", tmp_path / "units.csv", "--conditions", table)
    assert ran.code == 0, ran.err
    rows = rows_of(tmp_path / "units.csv")
    assert set(column(rows, "condition")) == {"control", "drug"}
    assert set(column(rows, "animal")) == {"hare-1"}


def test_a_table_of_conditions_may_come_from_a_spreadsheet_with_decimal_commas(tmp_path, session):
    path = LAYOUTS["integrated"](session, tmp_path / "a.nwb")
    table = tmp_path / "conditions.csv"
    half = f"{session.stop_s / 2:.1f}".replace(".", ",")
    table.write_bytes(f"file;start_s;stop_s;condition\r\na.nwb;0;{half};Kälte\r\na.nwb;{half};;drug\r\n".encode("cp1252"))
    for command in ("classify", "cycles"):
        ran = run(command, path, "--table", tmp_path / f"{command}.csv", "--conditions", table)
        assert ran.code == 0, ran.err
        assert set(column(rows_of(tmp_path / f"{command}.csv"), "condition")) == {"Kälte", "drug"}


def test_a_condition_asked_for_is_the_only_one(tmp_path, session):
    path = LAYOUTS["channels"](session, tmp_path / "a.nwb")
    run("classify", path, "--table", tmp_path / "units.csv", "--only", "high CO2")
    assert set(column(rows_of(tmp_path / "units.csv"), "condition")) == {"high CO2"}


def test_labelled_copies_are_valid_in_every_layout(tmp_path, session):
    from pynwb import NWBHDF5IO, validate

    for name, layout in LAYOUTS.items():
        layout(session, tmp_path / f"{name}.nwb")
    ran = run("export", tmp_path, "--out", tmp_path / "out")
    assert ran.code == 0, ran.err
    for name in LAYOUTS:
        target = tmp_path / "out" / f"{name}.labelled.nwb"
        assert not validate(path=str(target))
        with NWBHDF5IO(str(target), "r") as io:
            nwb = io.read()
            assert "firing_types" in nwb.analysis
            assert list(nwb.units.id[:]) == list(range(10, 10 + len(session.types)))


def test_the_programs_own_copies_are_passed_over_in_a_folder(tmp_path, session):
    LAYOUTS["integrated"](session, tmp_path / "a.nwb")
    run("export", tmp_path / "a.nwb", "--out", tmp_path)
    ran = run("inventory", tmp_path)
    assert ran.out.count("session lab-7") == 1
