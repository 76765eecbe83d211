"""`unitclass types learn`: from units that belong together to a family that the program uses."""

from __future__ import annotations

import json
import tomllib

import pytest

from tests.commands.program import column, rows_of, run


@pytest.fixture(scope="module")
def session(tmp_path_factory):
    """Return a session with four cells of each type."""
    folder = tmp_path_factory.mktemp("session")
    assert run("simulate", "three-phase", "--out", folder, "--n-units", "48", "--seconds", "150", "--quiet").code == 0
    return next(folder.glob("*.nwb"))


@pytest.fixture(scope="module")
def learned(tmp_path_factory, session):
    """Return a family made of the session's post-I units, and the run that made it."""
    target = tmp_path_factory.mktemp("learn") / "family.toml"
    table = target.parent / "before.csv"
    assert run("classify", session, "--table", table).code == 0
    units = [row["unit"] for row in rows_of(table) if row["suggested_type"] == "post-I"]
    return target, units, run("types", "learn", "brisk-E", session, "--units", ",".join(units), "--out", target,
                              "--words", "a brisk start of expiration")


def test_the_file_can_be_read_by_a_person_and_holds_what_was_asked(learned):
    target, units, ran = learned
    assert ran.code == 0, ran.err
    assert f"{len(units)} units" in ran.out
    given = tomllib.loads(target.read_text())
    assert (given["id"], given["words"], given["form"]) == ("brisk-E", "a brisk start of expiration", "drawn")
    assert 1.0 <= max(given["points"], key=lambda point: point[1])[0] < 1.3


def test_the_learned_family_competes_for_the_cells_it_was_made_of(learned, session, tmp_path):
    target, units, _ = learned
    assert run("types", "check", target).code == 0
    assert run("classify", session, "--templates", target, "--table", tmp_path / "after.csv").code == 0
    rows = {row["unit"]: row for row in rows_of(tmp_path / "after.csv")}
    first_or_second = [{rows[unit]["suggested_type"], rows[unit]["second_type"]} for unit in units]
    assert all("brisk-E" in pair for pair in first_or_second)
    assert "brisk-E" not in {row["suggested_type"] for name, row in rows.items() if name not in units}
    assert column(list(rows.values()), "suggested_type").count("ramp-I") > 0


def test_too_few_units_an_existing_file_and_no_labels_are_one_line_each(learned, session, tmp_path):
    target, units, _ = learned
    few = run("types", "learn", "x", session, "--units", units[0], "--out", tmp_path / "x.toml")
    again = run("types", "learn", "brisk-E", session, "--units", ",".join(units), "--out", target)
    unlabelled = run("types", "learn", "post-I", session, "--out", tmp_path / "y.toml")
    for ran, words in ((few, "too few"), (again, "exists"), (unlabelled, "labelled post-I")):
        assert ran.code in (1, 2)
        assert words in ran.err
        assert len(ran.err.strip().splitlines()) == 1
    assert not (tmp_path / "x.toml").exists()


def test_every_form_of_the_command_speaks_json(learned, session, tmp_path):
    target, units, _ = learned
    for words in (("list",), ("show", "ramp-I"), ("check",), ("check", target), (
            "learn", "x", session, "--units", ",".join(units), "--out", tmp_path / "x.toml")):
        assert json.loads(run("types", *words, "--json").out)
