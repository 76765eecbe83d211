"""Units of all open sessions that fire alike are one group, whatever they are called."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from tests.results import session_result
from tests.review.reviews import result_with, review
from unitclass.analysis.groups import groups_of, shaped_rows
from unitclass.io.session_view import MemorySession
from unitclass.records import SessionResult
from unitclass.review.filters import Filter
from unitclass.review.grouping import grouped

PHASE = (np.arange(40) + 0.5) / 20


def result(path: str, humps: tuple[float, ...], n_each: int = 10, seed: int = 0) -> SessionResult:
    """Return a session whose units each fire in one of the humps."""
    rng = np.random.default_rng(seed)
    at = np.repeat(humps, n_each)
    session = session_result(path, units={str(i): "ramp-I" for i in range(at.size)})
    condition = session.conditions[0]
    rate = [np.exp(-0.5 * (((PHASE - a + 1) % 2 - 1) / 0.12) ** 2) for a in at]
    units = tuple(replace(u, histogram=replace(u.histogram, counts=rng.poisson(80 * r).astype(float),
                                               exposure_s=np.full(40, 2.0)))
                  for u, r in zip(condition.units, rate, strict=True))
    return replace(session, conditions=(replace(condition, units=units),))


def test_units_that_fire_alike_are_one_group_over_all_files():
    one, two = result("a.nwb", (0.3, 1.2)), result("b.nwb", (1.2, 1.7), seed=1)
    groups = grouped([MemorySession(one), MemorySession(two)])
    assert {groups["a.nwb", str(i), "baseline"] for i in range(10)} == {"G1"}
    assert {groups["a.nwb", str(i), "baseline"] for i in range(10, 20)} == {"G2"}
    assert {groups["b.nwb", str(i), "baseline"] for i in range(10)} == {"G2"}
    assert {groups["b.nwb", str(i), "baseline"] for i in range(10, 20)} == {"G3"}


def test_the_groups_are_those_that_the_table_shows():
    one = result("a.nwb", (0.3, 0.8, 1.2), seed=3)
    assert tuple(grouped([MemorySession(one)]).values()) == groups_of(list(shaped_rows(one))).names


def test_silent_units_and_very_few_units_have_no_group():
    few = result("a.nwb", (0.3,), n_each=4)
    assert grouped([MemorySession(few)]) == {}
    assert grouped([]) == {}


def test_rows_and_units_show_their_group_and_keep_it_when_a_file_is_analysed_again(tmp_path):
    session = review(tmp_path, result_with())
    here, key = session.current.key, session.entries[3].key
    session.update_groups({key: "G2"})
    assert session.current.key == here
    assert session.entry(key).shape_group == "G2"
    assert session.unit_result(session.entry(key)).shape_group == "G2"
    session.show(Filter(shape_groups=("G2",)))
    assert [e.key for e in session.entries] == [key]
    session.add_result(result_with())
    assert [e.key for e in session.entries] == [key]


def test_a_blind_reviewer_does_not_see_the_groups(tmp_path):
    session = review(tmp_path, is_blind=True)
    key = session.current.key
    session.update_groups({key: "G2"})
    assert session.entry(key).shape_group == ""
    assert session.unit_result(session.entry(key)).shape_group == ""
