"""What the store keeps and which label stands. Expected labels follow from the rules by hand."""

from __future__ import annotations

import math
import sqlite3
from dataclasses import replace

import pytest

from tests.io.stores import DIGESTS, IDENTIFIER, OBJECT_ID, decision, ref
from unitclass.errors import UsageError
from unitclass.io.decisions import DecisionStore
from unitclass.records import CycleEdit

KEY = ("3", "baseline")


@pytest.fixture
def store(tmp_path):
    with DecisionStore(tmp_path / "unitclass.sqlite") as opened:
        yield opened


def labels(store, digests=DIGESTS, **options):
    return store.labels_for(IDENTIFIER, OBJECT_ID, digests, **options)


def test_a_decision_comes_back_in_every_field(store):
    given = decision(note="two notes", how="blind", suggested_probability=0.123456789012345)
    store.decide([given])
    assert store.history(IDENTIFIER, OBJECT_ID) == (given,)


def test_an_unknown_probability_comes_back_as_nan(store):
    store.decide([decision(suggested_type="", suggested_probability=math.nan)])
    (kept,) = store.history(IDENTIFIER, OBJECT_ID)
    assert math.isnan(kept.suggested_probability)


def test_the_label_of_one_reviewer_is_the_last_decision(store):
    store.decide([decision("ramp-I")])
    store.decide([decision("con-I")])
    label = labels(store)[KEY]
    assert (label.type, label.reviewer, label.flags) == ("con-I", "anna", ())


def test_conditions_have_labels_of_their_own(store):
    store.decide([decision("ramp-I"), decision("early-I", condition="pons removed")])
    assert {key: label.type for key, label in labels(store).items()} == {
        KEY: "ramp-I", ("3", "pons removed"): "early-I"}


def test_two_reviewers_who_agree_give_one_label_with_both_names(store):
    store.decide([decision(reviewer="ben", how="batch")])
    store.decide([decision(reviewer="anna", how="blind")])
    label = labels(store)[KEY]
    assert (label.type, label.reviewer, label.how) == ("ramp-I", "anna; ben", "blind")


def test_two_reviewers_who_differ_leave_no_type_until_it_is_settled(store):
    store.decide([decision("ramp-I", reviewer="anna")])
    store.decide([decision("con-I", reviewer="ben")])
    assert (labels(store)[KEY].type, labels(store)[KEY].flags) == ("", ("disagreement",))
    store.decide([decision("con-I", reviewer="carla", how="settled")], kind="settle")
    label = labels(store)[KEY]
    assert (label.type, label.reviewer, label.how, label.flags) == ("con-I", "carla", "settled", ())
    assert {d.type for d in store.history(IDENTIFIER, OBJECT_ID)} == {"ramp-I", "con-I"}


def test_an_opinion_after_the_settlement_opens_the_question_again(store):
    store.decide([decision("ramp-I", reviewer="anna")])
    store.decide([decision("con-I", reviewer="ben")])
    store.decide([decision("con-I", reviewer="ben", how="settled")])
    store.decide([decision("late-I", reviewer="anna")])
    assert labels(store)[KEY].flags == ("disagreement",)
    store.decide([decision("con-I", reviewer="anna")])
    assert labels(store)[KEY].type == "con-I"


def test_a_decision_on_another_spike_train_is_not_used_and_asks_again(store):
    store.decide([decision("ramp-I")])
    label = labels(store, {"3": "another train"})[KEY]
    assert (label.type, label.reviewer, label.flags) == ("", "", ("asks again",))
    store.decide([decision("con-I", digest="another train")])
    assert labels(store, {"3": "another train"})[KEY].type == "con-I"
    assert labels(store)[KEY].type == "ramp-I"


def test_a_unit_that_is_gone_has_no_label(store):
    store.decide([decision()])
    assert labels(store, {"7": "digest-7"}) == {}


def test_a_copy_under_a_new_object_id_keeps_labels_of_the_same_spike_train_only(store):
    store.decide([decision("ramp-I", unit="3"), decision("post-I", unit="7")])
    copy = store.labels_for(IDENTIFIER, "a new object id", {"3": "digest-3", "7": "sorted anew"})
    assert (copy[KEY].type, copy[KEY].flags) == ("ramp-I", ())
    assert (copy["7", "baseline"].type, copy["7", "baseline"].flags) == ("", ("asks again",))


def test_another_session_with_the_same_identifier_is_not_asked_again(store):
    store.decide([decision("ramp-I")])
    other = store.labels_for(IDENTIFIER, "other session", {"3": "its own train"}, other_sessions={OBJECT_ID})
    assert other == {}


def test_sessions_without_identifier_do_not_mix(store):
    store.decide([decision(identifier="")])
    assert store.labels_for("", "other session", DIGESTS) == {}


@pytest.mark.parametrize("text", ["\x1b[31mred", "[bold]markup[/]", "a\nb", "\u202ertl", "nul\0byte",
                                  "'; DROP TABLE acts", "\u00e9\U0001d54f"])
def test_any_text_is_kept_as_it_is(store, text):
    store.decide([decision(text, unit=text, digest="d", condition=text, reviewer=text, note=text)])
    label = labels(store, {text: "d"})[text, text]
    assert (label.type, label.reviewer, label.note) == (text, text, text)


def test_a_lone_surrogate_is_kept_as_an_escape(store):
    store.decide([decision(reviewer="anna\udcff")])
    assert store.reviewers() == ("anna\\udcff",)


def test_a_decision_without_type_and_acts_of_several_reviewers_are_refused(store):
    with pytest.raises(UsageError, match="without a type"):
        store.decide([decision(" ")])
    with pytest.raises(UsageError, match="2 reviewers"):
        store.decide([decision(), decision(reviewer="ben")])
    with pytest.raises(UsageError, match="0 reviewers"):
        store.decide([])
    assert store.version() == 0


# ------------------------------------------------------------------------- undo and redo

def test_undo_brings_the_label_before_back_and_redo_the_later_one(store):
    store.decide([decision("ramp-I")])
    store.decide([decision("con-I")])
    assert store.undo("anna").seq == 2
    assert labels(store)[KEY].type == "ramp-I"
    assert store.redo("anna").seq == 2
    assert labels(store)[KEY].type == "con-I"
    store.undo("anna")
    store.undo("anna")
    assert labels(store) == {}
    assert store.undo("anna") is None


def test_many_acts_are_undone_and_redone_in_order_after_reopening(tmp_path):
    path = tmp_path / "unitclass.sqlite"
    types = [f"type {i}" for i in range(20)]
    with DecisionStore(path) as store:
        for name in types:
            store.decide([decision(name)])
    with DecisionStore(path) as store:
        for name in reversed(types):
            assert labels(store)[KEY].type == name
            store.undo("anna")
    with DecisionStore(path) as store:
        for name in types:
            store.redo("anna")
            assert labels(store)[KEY].type == name
        assert store.redo("anna") is None


def test_a_new_act_ends_redo(store):
    store.decide([decision("ramp-I")])
    store.undo("anna")
    store.decide([decision("con-I")])
    assert store.redo("anna") is None
    assert labels(store)[KEY].type == "con-I"


def test_undo_and_redo_may_alternate(store):
    store.decide([decision("ramp-I")])
    for _ in range(5):
        store.undo("anna")
        assert labels(store) == {}
        store.redo("anna")
        assert labels(store)[KEY].type == "ramp-I"


def test_undo_reaches_only_the_own_acts(store):
    store.decide([decision("ramp-I", reviewer="anna")])
    store.decide([decision("con-I", reviewer="ben")])
    store.undo("anna")
    assert labels(store)[KEY].reviewer == "ben"
    assert store.undo("anna") is None


def test_undo_keeps_to_the_sessions_it_is_given(store):
    store.decide([decision("ramp-I")])
    store.decide([decision("con-I", object_id="another file", identifier="another")])
    assert store.undo("anna", [OBJECT_ID]).seq == 1
    assert store.undo("anna", [OBJECT_ID]) is None
    assert store.undo("anna", [OBJECT_ID, "another file"]).seq == 2


def test_a_batch_is_one_act(store):
    act = store.decide([decision("ramp-I", unit=u, how="batch") for u in DIGESTS], kind="batch")
    assert [r.unit for r in act.refs] == list(DIGESTS)
    store.undo("anna")
    assert labels(store) == {}


def test_history_tells_decisions_and_their_taking_back_in_order(store):
    store.decide([decision("ramp-I")])
    store.undo("anna")
    store.redo("anna")
    assert [d.type for d in store.history(IDENTIFIER, OBJECT_ID)] == ["ramp-I", "", "ramp-I"]


def test_rows_cannot_be_changed_or_removed(store):
    store.decide([decision()])
    with sqlite3.connect(store.path) as db:
        for statement in ("UPDATE decisions SET type = 'NRM'", "DELETE FROM acts", "DELETE FROM decisions"):
            with pytest.raises(sqlite3.IntegrityError, match="append-only"):
                db.execute(statement)


# ------------------------------------------------------------------------- notes, later

def test_the_newest_note_stands_and_can_be_removed_and_undone(store):
    store.decide([decision(note="given with it")])
    assert labels(store)[KEY].note == "given with it"
    store.add_note(ref(), "newer", "anna")
    assert labels(store)[KEY].note == "newer"
    store.add_note(ref(), "", "anna")
    assert labels(store)[KEY].note == ""
    store.undo("anna")
    assert labels(store)[KEY].note == "newer"


def test_notes_of_two_people_are_told_apart(store):
    store.decide([decision(reviewer="anna")])
    store.add_note(ref(), "clear", "anna")
    store.add_note(ref(), "noisy", "ben")
    assert labels(store)[KEY].note == "anna: clear; ben: noisy"


def test_a_note_without_a_decision_is_a_label_without_a_type(store):
    store.add_note(ref(), "listen again", "anna")
    label = labels(store)[KEY]
    assert (label.type, label.note, label.flags) == ("", "listen again", ())


def test_a_note_stays_with_its_spike_train(store):
    store.add_note(ref(), "listen again", "anna")
    assert labels(store, {"3": "another train"}) == {}


def test_later_marks_are_each_reviewers_own_and_can_be_taken_off(store):
    store.mark_later(ref("3"), True, "anna")
    store.mark_later(ref("7"), True, "ben")
    store.mark_later(ref("12"), True, "anna")
    store.mark_later(ref("12"), False, "anna")
    assert [(name, r.unit) for name, r in store.read(IDENTIFIER, OBJECT_ID).later] == [("anna", "3"), ("ben", "7")]


# ------------------------------------------------------------------------- cycle edits

EDIT = CycleEdit("baseline", "threshold", value=1.3, reviewer="anna", made_at="2026-03-01T10:05:00.000+00:00")


def edit(store, given=EDIT):
    return store.edit_cycles(IDENTIFIER, OBJECT_ID, given)


def test_cycle_edits_come_back_in_order_and_change_the_digest(store):
    assert store.edits_digest(IDENTIFIER, OBJECT_ID) == ""
    drop = replace(EDIT, action="drop", at_s=12.5, value=math.nan)
    edit(store)
    first = store.edits_digest(IDENTIFIER, OBJECT_ID)
    edit(store, drop)
    kept = store.edits_for(IDENTIFIER, OBJECT_ID)
    assert (kept[0].action, math.isnan(kept[0].at_s), kept[0].value) == ("threshold", True, 1.3)
    assert (kept[1].action, kept[1].at_s, math.isnan(kept[1].value)) == ("drop", 12.5, True)
    assert len({"", first, store.edits_digest(IDENTIFIER, OBJECT_ID)}) == 3


def test_an_edit_makes_the_labels_given_before_it_stale_and_not_those_after(store):
    store.decide([decision(unit="3"), decision(unit="7", condition="pons removed")])
    edit(store)
    store.decide([decision(unit="12")])
    assert {key[0]: label.flags for key, label in labels(store).items()} == {"3": ("stale",), "7": (), "12": ()}
    assert labels(store)[KEY].type == "ramp-I"


def test_taking_an_edit_back_makes_labels_fresh_that_were_given_before_it_and_stale_those_after(store):
    store.decide([decision(unit="3")])
    edit(store, replace(EDIT, reviewer="ben"))
    store.decide([decision(unit="12")])
    store.undo("ben")
    assert {key[0]: label.flags for key, label in labels(store).items()} == {"3": (), "12": ("stale",)}
    assert store.edits_for(IDENTIFIER, OBJECT_ID) == ()


def test_a_stale_label_is_fresh_again_once_one_reviewer_confirms_it(store):
    store.decide([decision(reviewer="anna")])
    edit(store)
    store.decide([decision(reviewer="ben")])
    assert labels(store)[KEY].flags == ()


def test_a_redone_decision_is_as_old_as_it_was(store):
    store.decide([decision()])
    store.undo("anna")
    edit(store, replace(EDIT, reviewer="ben"))
    store.redo("anna")
    assert labels(store)[KEY].flags == ("stale",)


@pytest.mark.parametrize(("changes", "said"), [({"action": "stretch"}, "stretch"),
                                               ({"action": "drop"}, "lacks its number"),
                                               ({"value": math.nan}, "lacks its number")])
def test_an_edit_that_says_nothing_is_refused(store, changes, said):
    with pytest.raises(UsageError, match=said):
        edit(store, replace(EDIT, **changes))
