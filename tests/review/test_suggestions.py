"""Suggestions that change while a person works: marked, in their places, never under the cursor."""

from __future__ import annotations

import pytest

from tests.results import suggestion
from tests.review.reviews import result_with, review, row, unit_with, units


def key(unit):
    return "rig/a.nwb", unit, "baseline"


def other(kind, probability=0.99):
    return suggestion(kind, unit_with("x", kind, probability).histogram, probability)


@pytest.fixture
def session(tmp_path):
    opened = review(tmp_path)
    opened.go_to(key("10"))
    return opened


def test_a_changed_suggestion_is_marked_with_what_it_was_and_keeps_its_place(session):
    before = units(session)
    assert session.update_suggestions({key("3"): other("late-I")}) == (key("3"),)
    entry = row(session, "3")
    assert (entry.suggested_type, entry.probability, entry.is_changed, entry.change) == (
        "late-I", 0.99, True, "was pre-I 0.80")
    assert units(session) == before
    assert session.unit_result(entry).suggestion.type == "late-I"
    session.sort()
    assert units(session) != before


def test_a_small_change_of_probability_is_taken_over_without_a_mark(session):
    session.update_suggestions({key("3"): other("pre-I", 0.85)})
    assert (row(session, "3").probability, row(session, "3").is_changed) == (0.85, False)
    session.update_suggestions({key("3"): other("pre-I", 0.99)})
    assert row(session, "3").change == "was pre-I 0.85"


def test_what_is_under_the_cursor_does_not_change_before_the_cursor_leaves_it(session):
    session.update_suggestions({key("10"): other("I-E")})
    assert (session.current.suggested_type, session.current.is_changed) == ("post-I", False)
    assert session.unit_result(session.current).suggestion.type == "post-I"
    session.move_next()
    assert (row(session, "10").suggested_type, row(session, "10").change) == ("I-E", "was post-I 0.60")


def test_accept_takes_what_was_on_the_screen(session):
    session.update_suggestions({key("10"): other("I-E")})
    assert session.accept().own_type == "post-I"
    assert row(session, "10").own_type == "post-I"
    assert row(session, "10").suggested_type == "I-E"


def test_the_mark_goes_once_the_unit_was_seen(session):
    session.update_suggestions({key("3"): other("late-I")})
    session.go_to(key("3"))
    assert session.current.is_changed
    session.move_previous()
    assert not row(session, "3").is_changed


def test_the_mark_goes_with_a_decision_even_when_the_cursor_stays(tmp_path):
    session = review(tmp_path, result_with(units={"1": ("ramp-I", 0.7), "2": ("ramp-I", 0.7)}))
    session.update_suggestions({key("2"): other("late-I")})
    session.accept()
    assert session.accept().is_changed is False


def test_a_persons_label_is_never_overwritten(session):
    session.go_to(key("3"))
    session.name_type("con-I")
    session.update_suggestions({key("3"): other("late-I")})
    assert (row(session, "3").own_type, row(session, "3").label.type) == ("con-I", "con-I")


def test_unknown_units_and_no_news_change_nothing(session):
    before = session.entries
    assert session.update_suggestions({key("99"): other("late-I")}) == ()
    assert session.update_suggestions({}) == ()
    assert session.entries == before


def test_results_analysed_again_mark_what_changed(session):
    changed = result_with(units={"10": ("I-E", 0.7), "3": ("pre-I", 0.8)})
    session.add_result(changed)
    assert row(session, "10").change == "was post-I 0.60"
    assert not row(session, "3").is_changed
    assert session.current.suggested_type == "I-E"


def test_new_results_end_the_suggestions_that_the_old_ones_had_been_given(session):
    session.update_suggestions({key("3"): other("late-I"), key("10"): other("late-I")})
    session.add_result(result_with())
    assert row(session, "3").suggested_type == "pre-I"
    session.move_next()
    assert row(session, "10").suggested_type == "post-I"


def test_only_labels_of_a_person_who_looked_teach(tmp_path):
    session = review(tmp_path)
    session.go_to(key("10"))
    session.name_type("I-E")
    session.go_to(key("20"))
    session.accept()
    session.go_to(key("3"))
    session.not_one_cell()
    session.accept_batch(session.batch_candidates())
    assert [(lesson.key, lesson.type, lesson.how) for lesson in session.lessons()] == [(key("10"), "I-E", "viewed")]
    session.undo()
    session.undo()
    session.undo()
    session.undo()
    assert session.lessons() == ()
