"""Two people on one store: blind judgements, disagreements, and one label in the end."""

from __future__ import annotations

import pytest

from tests.review.reviews import changed_unit, result_with, review, row, units
from unitclass.errors import UsageError
from unitclass.review import reviewer as reviewers
from unitclass.review.filters import Filter
from unitclass.review.reviewer import reviewer_name

KEY = ("rig/a.nwb", "10", "baseline")
FLAGS = ("few cycles (12)", "rule of thumb says post-I", "unsure", "some flag of a later version: post-I")


def judged(session, type_id, key=KEY):
    session.go_to(key)
    return session.name_type(type_id)


# ------------------------------------------------------------------------------- blind

def test_blind_rows_tell_nothing_of_suggestion_or_other_opinions(tmp_path):
    result = changed_unit(result_with(), "10", flags=FLAGS)
    anna = review(tmp_path, result)
    anna.go_to(KEY)
    anna.note("surely post-I")
    judged(anna, "post-I")
    blind = review(tmp_path, result, reviewer="ben", is_blind=True)
    entry = row(blind, "10")
    assert entry.is_hidden
    assert (entry.suggested_type, entry.ranked, entry.label, entry.note, entry.shape_group, entry.state) == (
        "", (), None, "", "", "open")
    assert entry.flags == ("few cycles (12)",)
    unit = blind.unit_result(entry)
    told = repr(unit.suggestion) + repr(unit.flags) + unit.shape_group
    assert "post-I" not in told
    assert unit.suggestion.fitted_rate_hz.size == 0
    assert unit.histogram.n_spikes > 0
    assert blind.opinions(entry) == ()
    assert blind.disagreements() == ()
    assert "post-I" not in dict(blind.choices("types"))


def test_blind_order_is_that_of_the_file_and_sorting_by_probability_tells_nothing(tmp_path):
    blind = review(tmp_path, is_blind=True)
    assert units(blind) == ["2", "3", "10", "11", "20"]
    blind.sort("probability")
    assert units(blind) == ["2", "3", "10", "11", "20"]
    blind.show(Filter(types=("post-I",)))
    assert units(blind) == []


def test_in_blind_mode_a_type_must_be_named_and_then_the_suggestion_shows(tmp_path):
    blind = review(tmp_path, is_blind=True)
    with pytest.raises(UsageError, match="hidden until you have named a type"):
        blind.accept()
    with pytest.raises(UsageError, match="no alternative"):
        blind.take_alternative(1)
    assert blind.batch_candidates() == ()
    entry = judged(blind, "I-E")
    assert (entry.own_type, entry.own_how, entry.is_hidden, entry.suggested_type) == ("I-E", "blind", False, "post-I")
    (kept,) = blind.opinions(entry)
    assert (kept.how, kept.suggested_type) == ("blind", "")
    blind.undo()
    assert row(blind, "10").is_hidden


def test_own_notes_can_be_read_in_blind_mode(tmp_path):
    blind = review(tmp_path, is_blind=True)
    entry = blind.note("mine")
    assert row(blind, entry.unit).note == "mine"


def test_blind_mode_can_be_switched_and_a_unit_looked_at_before_is_not_blind(tmp_path):
    session = review(tmp_path)
    session.go_to(KEY)
    session.set_blind(True)
    assert session.current.is_hidden
    assert session.name_type("post-I").own_how == "viewed"
    session.go_to(("rig/a.nwb", "20", "baseline"))
    assert session.name_type("silent").own_how == "blind"


def test_new_suggestions_do_not_betray_hidden_ones(tmp_path):
    blind = review(tmp_path, is_blind=True)
    anew = review(tmp_path).unit_result(row(review(tmp_path), "2")).suggestion
    blind.go_to(("rig/a.nwb", "2", "baseline"))
    blind.update_suggestions({KEY: anew})
    assert (row(blind, "10").suggested_type, row(blind, "10").is_changed) == ("", False)
    assert judged(blind, "I-E").suggested_type == "ramp-I"


# ------------------------------------------------------------------------ two reviewers

def test_decisions_of_another_appear_on_refresh_and_after_the_own_next_one(tmp_path):
    anna, ben = review(tmp_path), review(tmp_path, reviewer="ben")
    judged(anna, "post-I")
    assert row(ben, "10").state == "open"
    assert ben.refresh()
    assert not ben.refresh()
    assert (row(ben, "10").state, row(ben, "10").label.reviewer) == ("labelled", "anna")
    judged(anna, "ramp-I", ("rig/a.nwb", "2", "baseline"))
    judged(ben, "pre-I", ("rig/a.nwb", "3", "baseline"))
    assert row(ben, "2").label.type == "ramp-I"


def test_each_reviewer_has_an_own_queue_of_open_units(tmp_path):
    judged(review(tmp_path), "post-I")
    ben = review(tmp_path, reviewer="ben")
    progress = ben.progress()
    assert (progress.n_reviewed, progress.n_labelled, progress.n_left) == (0, 1, 5)
    ben.show(Filter(is_labelled=False))
    assert "10" not in units(ben)


def test_a_disagreement_is_listed_until_somebody_settles_it_and_both_opinions_stay(tmp_path):
    judged(review(tmp_path), "post-I")
    ben = review(tmp_path, reviewer="ben")
    judged(ben, "dec-E")
    assert [e.key for e in ben.disagreements()] == [KEY]
    assert row(ben, "10").state == "disagreement"
    assert ben.progress().n_disagreements == 1
    carla = review(tmp_path, reviewer="carla")
    entry = carla.settle(carla.disagreements()[0], "dec-E")
    assert (entry.label.type, entry.label.how, entry.label.reviewer) == ("dec-E", "settled", "carla")
    assert carla.disagreements() == ()
    assert {(d.reviewer, d.type) for d in carla.opinions(entry)} == {("anna", "post-I"), ("ben", "dec-E")}
    assert carla.undo().act.kind == "settle"
    assert len(carla.disagreements()) == 1


def test_agreement_compares_opinions_by_condition_and_lists_what_to_discuss(tmp_path):
    result = result_with(conditions=("baseline", "pons removed"))
    for name, third in (("anna", "pre-I"), ("ben", "con-I")):
        session = review(tmp_path, result, reviewer=name)
        for unit, kind in (("2", "ramp-I"), ("10", "post-I"), ("3", third)):
            judged(session, kind, ("rig/a.nwb", unit, "baseline"))
    judged(session, "NRM", ("rig/a.nwb", "2", "pons removed"))
    report = session.agreement()
    (pair,) = report.pairs
    assert (pair.condition, pair.kappa.n_units, pair.kappa.observed) == ("baseline", 3, pytest.approx(2 / 3))
    assert report.reviewers == ("anna", "ben")
    assert [(u.unit, u.condition) for u in report.discuss] == [("3", "baseline")]


def test_agreement_leaves_hidden_units_out(tmp_path):
    for name, kind in (("anna", "post-I"), ("ben", "dec-E")):
        judged(review(tmp_path, reviewer=name), kind)
    assert review(tmp_path, reviewer="carla", is_blind=True).agreement().discuss == ()
    assert len(review(tmp_path, reviewer="carla").agreement().discuss) == 1


# ----------------------------------------------------------------------------- the name

def test_the_name_given_goes_before_that_of_the_settings_and_the_login(monkeypatch):
    monkeypatch.setattr(reviewers.getpass, "getuser", lambda: "login")
    assert [reviewer_name(" anna ", "ben"), reviewer_name("", "ben"), reviewer_name()] == ["anna", "ben", "login"]


def test_without_any_name_one_is_asked_for(monkeypatch):
    def nobody():
        raise KeyError("uid not found")

    monkeypatch.setattr(reviewers.getpass, "getuser", nobody)
    with pytest.raises(UsageError, match="give one with --reviewer"):
        reviewer_name()
    with pytest.raises(UsageError, match="cannot be a reviewer"):
        reviewer_name("anna\x1b[2J")
