"""Labels teach the suggestions of other units, over all open sessions."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from tests.review.reviews import review
from tests.simulators.sessions import whole
from unitclass.analysis import analyse
from unitclass.io.session_view import MemorySession
from unitclass.io.template_files import read_library
from unitclass.review.relearning import relearned
from unitclass.review.teaching import Lesson
from unitclass.settings import Settings


@pytest.fixture(scope="module")
def view() -> MemorySession:
    recording, _ = whole("rates", "three-phase", 5, n_cycles=60, rng=np.random.default_rng(4), peak_hz=(15.0, 60.0),
                         types=("con-E", "aug-E", "post-I", "ramp-I"), hardness=0.3)
    return MemorySession(analyse(recording, read_library(""), Settings(), program_version="test"))


def key(unit: str) -> tuple[str, str, str]:
    return "rig/a.nwb", unit, "baseline"


def of_type(view: MemorySession, name: str) -> list[tuple[str, str, str]]:
    return [(view.head.path, u.unit, u.condition) for u in view.units if u.suggested_type == name]


def test_a_habit_seen_in_three_cells_reaches_the_others_of_their_shape(view):
    cells = of_type(view, "con-E")
    assert len(cells) >= 4
    changed = relearned([view], [Lesson(k, "aug-E", "viewed") for k in cells[:3]], read_library(""), Settings())
    assert changed[cells[3]].type == "aug-E"
    assert not changed.keys() & set(of_type(view, "post-I"))


def test_a_condition_without_a_cycle_in_use_is_no_obstacle(view):
    result = view.session_result()
    condition = result.conditions[0]
    cycles = condition.nerve_cycles.cycles
    nothing = replace(cycles, accepted=np.zeros(cycles.n_cycles, dtype=bool))
    idle = replace(condition, condition=replace(condition.condition, name="idle"),
                   nerve_cycles=replace(condition.nerve_cycles, cycles=nothing),
                   units=tuple(replace(unit, condition="idle") for unit in condition.units))
    both = MemorySession(replace(result, conditions=(condition, idle)))
    lessons = [Lesson(k, "aug-E", "viewed") for k in of_type(view, "con-E")[:3]]
    assert relearned([both], lessons, read_library(""), Settings()).keys() >= relearned(
        [view], lessons, read_library(""), Settings()).keys()


def test_no_labels_change_no_suggestion(view):
    assert relearned([view], (), read_library(""), Settings()) == {}


def test_labels_on_units_of_other_sessions_are_passed_over(view):
    lost = Lesson(("elsewhere.nwb", "1", ""), "aug-E", "blind")
    assert relearned([view], [lost], read_library(""), Settings()) == {}


def test_when_labels_are_taken_back_every_unit_gets_its_own_suggestion_back(tmp_path):
    session = review(tmp_path)
    own = session.unit_result(session.entry(key("3"))).suggestion
    other = session.unit_result(session.entry(key("10"))).suggestion
    session.update_suggestions({key("3"): other})
    assert session.entry(key("3")).suggested_type == other.type
    session.update_suggestions({})
    assert session.entry(key("3")).suggested_type == own.type
    assert session.unit_result(session.entry(key("3"))).suggestion is own
