"""Accepting the sure ones together: exactly those shown, in one act."""

from __future__ import annotations

import pytest

from tests.results import suggestion
from tests.review.reviews import changed_unit, result_with, review, row, unit_with
from unitclass.errors import UsageError
from unitclass.review.filters import Filter

SURE = {"1": ("ramp-I", 0.99), "2": ("post-I", 0.95), "3": ("aug-E", 0.97), "4": ("silent", 0.0), "5": ("pre-I", 0.949)}


@pytest.fixture
def session(tmp_path):
    return review(tmp_path, result_with(units=SURE))


def listed(session):
    return sorted(entry.unit for entry in session.batch_candidates())


def test_the_batch_is_every_suggestion_at_or_over_the_sure_probability(session):
    assert listed(session) == ["1", "2", "3"]
    assert session.batch_objection(row(session, "5")) == "below 0.95"
    assert session.batch_objection(row(session, "4")) == "silent"
    assert session.batch_objection(row(session, "1")) == ""


def test_exactly_the_listed_are_accepted_and_undone_as_one(session):
    accepted = session.accept_batch(session.batch_candidates())
    assert {e.unit: (e.own_type, e.own_how) for e in accepted} == {
        "1": ("ramp-I", "batch"), "2": ("post-I", "batch"), "3": ("aug-E", "batch")}
    assert session.progress().n_batch == 3
    assert listed(session) == []
    turn = session.undo()
    assert (turn.act.kind, len(turn.entries)) == ("batch", 3)
    assert session.progress().n_reviewed == 0
    session.redo()
    assert session.progress().n_batch == 3


def test_a_part_of_the_list_may_be_accepted(session):
    session.accept_batch([e for e in session.batch_candidates() if e.unit != "2"])
    assert listed(session) == ["2"]
    assert session.accept_batch([]) == ()


def test_the_batch_keeps_to_what_the_filter_shows(session):
    session.show(Filter(types=("ramp-I",)))
    assert listed(session) == ["1"]


def test_anything_that_speaks_against_a_suggestion_keeps_it_out(tmp_path):
    result = changed_unit(result_with(units=SURE), "3", flags=("few cycles (12)",))
    session = review(tmp_path, result)
    session.go_to(("rig/a.nwb", "1", "baseline"))
    session.later()
    ben = review(tmp_path, result, reviewer="ben")
    ben.go_to(("rig/a.nwb", "2", "baseline"))
    ben.name_type("dec-E")
    session.refresh()
    assert listed(session) == []
    said = {unit: session.batch_objection(row(session, unit)) for unit in "123"}
    assert said == {"1": "put off", "2": "another reviewer says dec-E", "3": "few cycles (12)"}


def test_a_spike_train_that_changed_is_not_accepted_unseen(tmp_path):
    review(tmp_path, result_with(units=SURE)).accept_batch(review(tmp_path, result_with(units=SURE)).batch_candidates())
    session = review(tmp_path, changed_unit(result_with(units=SURE), "1", digest="sorted anew"))
    assert listed(session) == []
    assert session.batch_objection(row(session, "1")) == "asks again"


def test_a_suggestion_that_changed_since_the_list_was_shown_stops_the_batch(session):
    shown = session.batch_candidates()
    anew = suggestion("I-E", unit_with("1", "I-E", 0.99).histogram)
    session.update_suggestions({("rig/a.nwb", "1", "baseline"): anew})
    with pytest.raises(UsageError, match="changed for 1 of the listed units; look at the list again"):
        session.accept_batch(shown)
    assert session.progress().n_reviewed == 0


def test_looking_at_a_unit_accepted_in_a_batch_makes_it_a_viewed_one(session):
    session.accept_batch(session.batch_candidates())
    session.go_to(("rig/a.nwb", "1", "baseline"))
    assert session.accept().own_how == "viewed"
    assert session.progress().n_batch == 2
