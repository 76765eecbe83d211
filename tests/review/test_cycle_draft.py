"""Changes to cycles before they are stored."""

import numpy as np
import pytest

from tests.results import cycles
from unitclass.records import CycleEdit
from unitclass.review.cycle_draft import LEAST, MOST, CycleDraft

DRAFT = CycleDraft.of("baseline", cycles(), 0.04, ())


def test_a_fresh_draft_has_nothing_to_apply():
    assert not DRAFT.is_changed
    assert DRAFT.edits() == ()
    assert DRAFT.level == 0.04


def test_a_step_raises_the_threshold_by_a_tenth_of_itself():
    assert DRAFT.moved(1).level == pytest.approx(0.044)
    assert DRAFT.moved(2).moved(-2).level == pytest.approx(0.04, rel=1e-3)


def test_the_stored_factor_is_on_the_detectors_own_level_not_on_the_present_one():
    edits = (CycleEdit("baseline", "threshold", value=2.0), CycleEdit("other", "threshold", value=9.0))
    draft = CycleDraft.of("baseline", cycles(), 0.08, edits)
    assert not draft.is_changed
    raised = draft.moved(1)
    assert raised.level == pytest.approx(0.088)
    assert [e.value for e in raised.edits()] == [pytest.approx(2.2)]


def test_the_threshold_stays_within_bounds():
    assert DRAFT.moved(1000).scale == MOST
    assert DRAFT.moved(-1000).scale == LEAST


def test_dropping_a_used_cycle_and_restoring_one_left_out():
    draft = DRAFT.toggled(2).toggled(5)
    assert not draft.accepted[2]
    assert draft.accepted[5]
    assert [(e.action, e.at_s) for e in draft.edits()] == [("drop", 8.0), ("restore", 17.0)]
    assert {e.condition for e in draft.edits()} == {"baseline"}


def test_the_moment_of_an_edit_lies_inside_its_cycle():
    c = cycles()
    for index in range(c.n_cycles - 1):
        at = DRAFT.toggled(index).edits()[0].at_s
        assert c.onset_s[index] < at < c.end_s[index]


def test_turning_a_cycle_twice_changes_nothing():
    assert not DRAFT.toggled(3).toggled(3).is_changed
    assert np.array_equal(DRAFT.toggled(3).toggled(3).accepted, DRAFT.accepted)


def test_changes_are_taken_back_one_by_one():
    draft = DRAFT.toggled(3).moved(1)
    assert draft.undone().turned == (3,)
    assert draft.undone().scale == 1.0
    assert not draft.undone().undone().is_changed
    assert DRAFT.undone() == DRAFT
