"""What `classify` and `export` say about all files together: groups, changes, moves, other words."""

from __future__ import annotations

import csv
import json
from pathlib import Path

import pytest

from tests.commands.program import column, rows_of, run
from unitclass.io.resolver import samples_folder

BASELINE = samples_folder() / "quill-baseline.nwb"
PONS = samples_folder() / "bramble-pons-removed.nwb"


@pytest.fixture(autouse=True)
def wide_terminal(monkeypatch):
    monkeypatch.setenv("COLUMNS", "300")


@pytest.fixture(scope="module")
def old(tmp_path_factory) -> Path:
    table = tmp_path_factory.mktemp("old") / "old.csv"
    assert run("classify", BASELINE, PONS, "--table", table, "--quiet").code == 0
    return table


def changed(old: Path, target: Path, **cells: str) -> Path:
    """Write the old table with some cells of its first row changed."""
    rows = rows_of(old)
    rows[0] |= cells
    with target.open("w", newline="") as file:
        writer = csv.DictWriter(file, rows[0])
        writer.writeheader()
        writer.writerows(rows)
    return target


def test_nothing_moves_against_the_same_run(old):
    ran = run("classify", BASELINE, PONS, "--against", old, "--quiet")
    assert "0 moved" in ran.out


def test_a_moved_unit_is_listed_with_what_it_was_and_why(old, tmp_path):
    older = changed(old, tmp_path / "older.csv", suggested_type="con-I", probability="0.61", n_cycles="7",
                    settings_digest="000")
    ran = run("classify", BASELINE, PONS, "--against", older, "--quiet", "--table", tmp_path / "new.csv")
    line, = [line for line in ran.out.splitlines() if "con-I" in line and "0.61" in line and "cycles 7 to" in line]
    assert "other settings" in line
    moved = [row for row in rows_of(tmp_path / "new.csv") if row["was_type"]]
    assert [(row["unit"], row["was_type"], row["was_probability"]) for row in moved] == [
        (rows_of(old)[0]["unit"], "con-I", "0.61")]


def test_a_table_from_before_versions_were_told_says_so(old, tmp_path):
    rows = [{k: v for k, v in row.items() if k in ("file", "unit", "condition", "suggested_type", "probability")}
            for row in rows_of(old)]
    rows[0]["suggested_type"] = "con-I"
    target = tmp_path / "older.csv"
    with target.open("w", newline="") as file:
        writer = csv.DictWriter(file, rows[0])
        writer.writeheader()
        writer.writerows(rows)
    assert "does not say how it was made" in run("classify", BASELINE, PONS, "--against", target, "--quiet").out


@pytest.mark.parametrize(("text", "words"), [
    ("a,b\n1,2\n", "no column 'file'"),
    ("file,unit,condition,suggested_type,probability\nelse.nwb,1,,post-I,0.9\n", "no unit in common"),
])
def test_a_wrong_older_table_is_one_line(tmp_path, text, words):
    (tmp_path / "older.csv").write_text(text)
    ran = run("classify", BASELINE, "--against", tmp_path / "older.csv", "--quiet")
    assert ran.code == 2
    assert words in ran.err


def test_every_unit_of_two_conditions_has_its_step_in_the_table_and_in_json(old, tmp_path):
    target = tmp_path / "changes.csv"
    ran = run("classify", PONS, "--changes", target, "--quiet")
    steps, rows = rows_of(target), [row for row in rows_of(old) if row["file"] == str(PONS)]
    assert len(steps) == len(rows) / 2
    by_key = {(row["unit"], row["condition"]): row["suggested_type"] for row in rows}
    for step in steps:
        assert step["type_before"] == by_key[step["unit"], step["condition_before"]]
        assert step["type_after"] == by_key[step["unit"], step["condition_after"]]
    assert "from one condition to the next" in ran.out
    told = json.loads(run("classify", PONS, "--json", "--quiet").out)
    later = [row for row in told if row["condition_before"]]
    assert {(row["unit"], row["type_before"]) for row in later} == {(s["unit"], s["type_before"]) for s in steps}


def test_groups_name_a_group_for_every_unit_that_fires_and_for_no_silent_one(old, tmp_path):
    ran = run("classify", samples_folder(), "--groups", "--table", tmp_path / "t.csv", "--quiet")
    rows = rows_of(tmp_path / "t.csv")
    assert {bool(row["shape_group"]) for row in rows if row["suggested_type"] == "silent"} == {False}
    assert all(row["shape_group"].startswith("G") for row in rows if row["probability"])
    assert "adjusted Rand index" in ran.out
    assert "early-I 100%" in ran.out


def test_a_crosswalk_reaches_tables_reasons_and_the_labelled_nwb(tmp_path):
    from pynwb import NWBHDF5IO

    (tmp_path / "words.csv").write_text("type,word\npost-I,E-dec\naug-E,E-aug\n")
    out = tmp_path / "out"
    assert run("export", BASELINE, "--crosswalk", tmp_path / "words.csv", "--out", out, "--quiet").code == 0
    types = set(column(rows_of(out / "units.csv"), "suggested_type"))
    assert {"E-dec", "E-aug"} <= types
    assert not types & {"post-I", "aug-E"}
    assert not [row for row in rows_of(out / "units.csv") if "aug-E" in row["reasons"]]
    with NWBHDF5IO(out / "quill-baseline.labelled.nwb", "r") as io:
        assert "E-dec" in set(io.read().units["suggested_firing_type"][:])


def test_export_writes_the_changes_where_there_are_two_conditions(tmp_path):
    assert run("export", PONS, "--out", tmp_path / "two", "--quiet").code == 0
    assert run("export", BASELINE, "--out", tmp_path / "one", "--quiet").code == 0
    assert (tmp_path / "two" / "changes.csv").exists()
    assert not (tmp_path / "one" / "changes.csv").exists()


def test_with_json_export_and_report_print_one_list_of_what_they_wrote(tmp_path):
    for words in (("export", BASELINE, "--out", tmp_path / "e"),
                  ("report", BASELINE, "--out", tmp_path / "r", "--format", "svg")):
        ran = run(*words, "--json", "--quiet")
        files = json.loads(ran.out)
        assert len(files) >= 2
        assert all(Path(file).exists() for file in files)


def test_against_the_store_the_suggestions_that_people_saw_are_compared(tmp_path):
    import shutil

    from unitclass.batch import Plan, analyse_file
    from unitclass.io.decisions import DecisionStore
    from unitclass.io.template_files import read_library
    from unitclass.review.session import ReviewSession
    from unitclass.settings import Settings

    session = tmp_path / "quill.nwb"
    shutil.copyfile(BASELINE, session)
    result = analyse_file(str(session), Plan(Settings(), read_library())).result
    assert result is not None
    with DecisionStore(tmp_path / "unitclass.sqlite") as store:
        review = ReviewSession(store, "anna")
        review.add_result(result)
        for _ in range(4):
            review.accept()
    assert "0 moved, 4 did not" in run("classify", session, "--against", "store", "--quiet").out
    (tmp_path / "odd.toml").write_text("[classify]\nconcentration = 10.0\nother_prior = 0.9\n")
    ran = run("classify", session, "--against", "store", "--settings", tmp_path / "odd.toml", "--quiet")
    assert "other settings" in ran.out
    assert run("classify", BASELINE, "--against", "store", "--quiet").code == 2  # nobody has decided anything here
