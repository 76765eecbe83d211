"""Deciding, undoing, noting, putting off: what a key does, without the keys."""

from __future__ import annotations

import math
from dataclasses import replace

import pytest

from tests.review.reviews import changed_unit, result_with, review, row, units
from unitclass.errors import UnitclassError, UsageError
from unitclass.records import CycleEdit


def test_accept_takes_the_suggestion_and_goes_to_the_next_open_unit(tmp_path):
    session = review(tmp_path)
    first = session.current
    decided = session.accept()
    assert (decided.key, decided.own_type, decided.own_how) == (first.key, first.suggested_type, "viewed")
    assert session.current.key != first.key
    assert not session.current.is_reviewed


def test_one_key_a_unit_reviews_everything_and_then_the_cursor_rests(tmp_path):
    session = review(tmp_path)
    for _ in range(5):
        session.accept()
    assert session.next_open() is None
    assert session.progress().n_left == 0
    assert {e.own_type for e in session.entries} == {"ramp-I", "post-I", "aug-E", "silent", "pre-I"}


def test_the_nth_alternative_is_the_nth_of_the_ranked_types(tmp_path):
    session = review(tmp_path)
    ranked = session.current.ranked
    assert session.take_alternative(2).own_type == ranked[1][0]
    silent = session.go_to(("rig/a.nwb", "20", "baseline"))
    assert silent.ranked == ()
    with pytest.raises(UsageError, match="no alternative 1"):
        session.take_alternative(1)
    session.go_to(("rig/a.nwb", "10", "baseline"))
    for n in (0, -1, 10):
        with pytest.raises(UsageError, match="no alternative"):
            session.take_alternative(n)


def test_any_type_can_be_named_but_not_an_empty_one(tmp_path):
    session = review(tmp_path)
    assert session.name_type("  I-E ").own_type == "I-E"
    for bad in ("", "  ", "a\x1b[2J"):
        with pytest.raises(UsageError, match="cannot be a type"):
            session.name_type(bad)


def test_not_one_cell_is_a_verdict_of_its_own(tmp_path):
    assert review(tmp_path).not_one_cell().own_type == "not one cell"


def test_the_decision_holds_what_the_reviewer_saw(tmp_path):
    session = review(tmp_path)
    seen = session.current
    session.name_type("late-I")
    (kept,) = session.opinions(seen)
    assert (kept.type, kept.suggested_type, kept.suggested_probability, kept.reviewer, kept.digest) == (
        "late-I", seen.suggested_type, seen.probability, "anna", seen.digest)
    assert (kept.settings_digest, kept.template_digest) == (seen.settings_digest, seen.template_digest)


def test_deciding_the_same_again_adds_nothing_to_the_store(tmp_path):
    session = review(tmp_path)
    key = session.current.key
    session.accept()
    session.go_to(key)
    session.accept()
    session.undo()
    assert session.undo() is None


def test_an_empty_queue_says_so(tmp_path):
    session = review(tmp_path, result_with(units={}))
    assert session.current is None
    for act in (session.accept, session.not_one_cell, session.later, lambda: session.note("x")):
        with pytest.raises(UsageError, match="no unit under the cursor"):
            act()
    assert session.undo() is None
    assert session.move_next() is None
    assert session.find("x") is None


def test_a_later_opening_starts_where_the_first_stopped(tmp_path):
    first = review(tmp_path)
    first.accept()
    first.note("listen again")
    first.later()
    first.accept()
    states = {e.key: (e.state, e.own_type, e.note) for e in first.entries}
    again = review(tmp_path)
    assert {e.key: (e.state, e.own_type, e.note) for e in again.entries} == states
    assert again.current.key == first.current.key


def test_undo_and_redo_go_to_the_unit_across_sessions(tmp_path):
    first = review(tmp_path)
    decided = [first.accept().key, first.name_type("late-I").key]
    again = review(tmp_path)
    assert [again.undo().entries[0].key, again.undo().entries[0].key] == decided[::-1]
    assert again.current.key == decided[0]
    assert again.progress().n_reviewed == 0
    turn = again.redo()
    assert (turn.act.kind, turn.entries[0].own_type, turn.paths) == ("decide", again.current.own_type, ())
    assert again.redo().entries[0].own_type == "late-I"
    assert again.redo() is None


def test_undo_leaves_files_that_are_not_open_alone(tmp_path):
    a, b = result_with("rig/a.nwb"), result_with("rig/b.nwb")
    review(tmp_path, b).accept()
    session = review(tmp_path, a)
    assert session.undo() is None
    session.add_result(b)
    assert session.undo().entries[0].path == "rig/b.nwb"


def test_undo_covers_notes_and_later_marks(tmp_path):
    session = review(tmp_path)
    entry = session.note("first")
    session.note("second")
    session.later()
    assert (session.undo().act.kind, row(session, entry.unit).is_later) == ("later", False)
    assert (session.undo().act.kind, row(session, entry.unit).note) == ("note", "first")
    session.undo()
    assert row(session, entry.unit).note == ""


def test_a_note_is_kept_with_the_decision_and_the_cursor_stays(tmp_path):
    session = review(tmp_path)
    key = session.current.key
    assert session.note("  two\nlines ").note == "two\nlines"
    assert session.current.key == key
    entry = session.accept()
    assert session.opinions(entry)[0].note == "two\nlines"
    assert session.labels("rig/a.nwb")[entry.unit, "baseline"].note == "two\nlines"


def test_units_put_off_come_last_and_can_be_taken_up_again(tmp_path):
    session = review(tmp_path)
    put_off = session.later()
    assert put_off.state == "later"
    for _ in range(4):
        session.accept()
    assert session.current.key == put_off.key
    assert session.later().state == "open"
    session.accept()
    assert session.progress().n_left == 0


def test_conditions_of_a_unit_are_reviewed_apart(tmp_path):
    session = review(tmp_path, result_with(conditions=("baseline", "pons removed")))
    session.go_to(("rig/a.nwb", "10", "pons removed"))
    session.name_type("dec-E")
    rows = session.conditions_of(session.entry(("rig/a.nwb", "10", "baseline")))
    assert [(r.condition, r.own_type) for r in rows] == [("baseline", ""), ("pons removed", "dec-E")]


# ----------------------------------------------------------------------------- many files

def test_files_come_in_as_they_are_ready_and_failures_are_listed(tmp_path):
    session = review(tmp_path, result_with("rig/a.nwb"))
    session.expect(["rig/b.nwb", "rig/c.nwb"])
    session.add_failure("rig/c.nwb", "no nerve was recognised")
    assert [(f.path, f.state, f.reason, f.n_units) for f in session.files] == [
        ("rig/a.nwb", "ready", "", 5), ("rig/b.nwb", "waiting", "", 0),
        ("rig/c.nwb", "failed", "no nerve was recognised", 0)]
    session.add_result(result_with("rig/b.nwb"))
    progress = session.progress()
    assert (progress.n_entries, progress.n_files, progress.n_waiting, progress.n_failed) == (10, 3, 0, 1)


def test_the_cursor_stays_on_its_unit_while_files_come_in(tmp_path):
    session = review(tmp_path, result_with("rig/b.nwb"))
    session.jump(2)
    here = session.current.key
    session.add_result(result_with("rig/a.nwb"))
    assert session.current.key == here
    assert session.entries[session.index].key == here


def test_a_file_analysed_again_replaces_its_rows_and_drops_units_that_are_gone(tmp_path):
    session = review(tmp_path)
    session.go_to(("rig/a.nwb", "10", "baseline"))
    fewer = {"10": ("post-I", 0.60), "3": ("pre-I", 0.80), "99": ("late-E", 0.5)}
    session.add_result(result_with(units=fewer))
    assert sorted(units(session)) == ["10", "3", "99"]
    assert session.current.unit == "10"
    session.add_result(result_with(units={"3": ("pre-I", 0.80)}))
    assert session.current.unit == "3"
    session.add_result(result_with(units={}))
    assert session.current is None


def test_a_spike_train_that_changed_asks_again(tmp_path):
    review(tmp_path).accept()
    unit = review(tmp_path).all_entries
    decided = next(e.unit for e in unit if e.is_reviewed)
    session = review(tmp_path, changed_unit(result_with(), decided, digest="sorted anew"))
    entry = row(session, decided)
    assert (entry.state, entry.own_type, entry.label.type) == ("asks again", "", "")
    session.go_to(entry.key)
    assert session.accept().state == "reviewed"


def test_two_copies_of_a_session_show_the_same_decisions_at_once(tmp_path):
    ids = {"identifier": "one session", "object_id": "one object"}
    session = review(tmp_path, result_with("rig/a.nwb", **ids), result_with("rig/copy.nwb", **ids))
    entry = session.accept()
    twin = "rig/copy.nwb" if entry.path == "rig/a.nwb" else "rig/a.nwb"
    assert session.entry((twin, entry.unit, "baseline")).own_type == entry.own_type


def test_sessions_that_share_an_identifier_do_not_mix(tmp_path):
    a = result_with("rig/a.nwb", identifier="test")
    b = replace(changed_unit(result_with("rig/b.nwb", identifier="test"), "10", digest="its own"))
    session = review(tmp_path, a, b)
    session.go_to(("rig/a.nwb", "10", "baseline"))
    session.accept()
    session.refresh()
    assert session.entry(("rig/b.nwb", "10", "baseline")).state == "open"
    again = review(tmp_path, a, b)
    assert again.entry(("rig/b.nwb", "10", "baseline")).state == "open"


# --------------------------------------------------------------------------- cycle edits

EDIT = CycleEdit("baseline", "threshold", value=1.4)


def test_an_edit_of_the_cycles_makes_labels_stale_until_confirmed(tmp_path):
    session = review(tmp_path)
    entry = session.accept()
    session.edit_cycles("rig/a.nwb", EDIT)
    assert session.cycle_edits("rig/a.nwb")[0].reviewer == "anna"
    assert row(session, entry.unit).state == "stale"
    assert session.progress().n_stale == 1
    session.go_to(entry.key)
    assert session.accept().state == "reviewed"


def test_undoing_an_edit_names_the_file_to_analyse_again(tmp_path):
    session = review(tmp_path, result_with("rig/a.nwb"), result_with("rig/b.nwb"))
    session.edit_cycles("rig/b.nwb", EDIT)
    turn = session.undo()
    assert (turn.act.kind, turn.paths) == ("cycles", ("rig/b.nwb",))
    assert session.cycle_edits("rig/b.nwb") == ()
    assert session.redo().paths == ("rig/b.nwb",)
    assert len(session.cycle_edits("rig/b.nwb")) == 1


# --------------------------------------------------------------------- progress and export

def test_progress_counts_follow_the_work(tmp_path):
    session = review(tmp_path)
    session.accept()
    session.accept_batch(session.batch_candidates())
    session.later()
    p = session.progress()
    assert (p.n_entries, p.n_reviewed, p.n_batch, p.n_left, p.n_later, p.n_labelled) == (5, 3, 2, 2, 1, 3)
    assert sum(p.types.values()) == 3


def test_the_export_plan_tells_targets_and_what_is_in_the_way(tmp_path):
    for name in ("a.nwb", "b.nwb", "b.labelled.nwb"):
        (tmp_path / name).touch()
    a, b = str(tmp_path / "a.nwb"), str(tmp_path / "b.nwb")
    session = review(tmp_path, result_with(a))
    session.expect([b])
    session.accept()
    plan = {item.path: item for item in session.export_plan()}
    assert plan[a].target == str(tmp_path / "a.labelled.nwb")
    assert (plan[a].n_entries, plan[a].n_labelled, plan[a].n_left, plan[a].problem) == (5, 1, 4, "")
    assert plan[b].problem == "its analysis has not ended"
    session.add_result(result_with(b))
    assert {i.path: i.problem for i in session.export_plan()} == {a: "", b: "exists already"}
    assert {i.problem for i in session.export_plan(tmp_path / "out")} == {""}


def test_two_files_of_one_name_cannot_go_into_one_folder(tmp_path):
    session = review(tmp_path, result_with("one/a.nwb"), result_with("two/a.nwb"))
    said = "another file of the same name would be written there"
    assert {i.problem for i in session.export_plan(tmp_path)} == {said}
    assert {i.problem for i in session.export_plan()} == {""}


def test_results_for_an_export_hold_the_analysis_own_suggestions_whatever_labels_taught(tmp_path):
    session = review(tmp_path)
    other = session.unit_result(row(session, "10")).suggestion
    session.update_suggestions({("rig/a.nwb", "3", "baseline"): other})
    result = session.session_result("rig/a.nwb")
    assert {u.unit: u.suggestion.type for _, u in result.units()}["3"] == "pre-I"
    assert result.object_id == "object of rig/a.nwb"
    with pytest.raises(UnitclassError, match="no results yet"):
        session.session_result("rig/unknown.nwb")


def test_profiles_are_the_rates_of_the_rows_asked_for(tmp_path):
    session = review(tmp_path, result_with("rig/a.nwb"), result_with("rig/b.nwb"))
    rows = session.entries[::3]
    profiles = session.profiles(rows)
    for profile, entry in zip(profiles, rows, strict=True):
        assert profile == pytest.approx(session.unit_result(entry).histogram.rate_hz, rel=1e-6, nan_ok=True)
    assert session.profiles([]).shape[0] == 0


def test_a_state_has_no_probability_and_no_second_type(tmp_path):
    silent = row(review(tmp_path), "20")
    assert math.isnan(silent.probability)
    assert (silent.second_type, math.isnan(silent.second_probability)) == ("", True)
