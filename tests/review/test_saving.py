"""When a decision cannot be saved: said at once, nothing changed, nothing lost."""

from __future__ import annotations

import sqlite3

import pytest

from tests.review.reviews import review, row
from unitclass.errors import TargetError
from unitclass.io.decisions import DecisionStore
from unitclass.records import CycleEdit


@pytest.fixture
def session(tmp_path):
    return review(tmp_path)


def fill_disk(session):
    """Let no page be added, and take the free room in those there are."""
    db = session._board.store._connection
    db.execute(f"PRAGMA max_page_count = {db.execute('PRAGMA page_count').fetchone()[0]}")


def free_disk(session):
    session._board.store._connection.execute("PRAGMA max_page_count = 1000000")


LONG = "x" * 50_000


def test_a_failure_leaves_everything_as_it_was(session):
    decided = session.accept()
    before, here = session.entries, session.current
    fill_disk(session)
    edit = CycleEdit("baseline", "threshold", value=1.4, note=LONG)
    batch = session.batch_candidates()
    for act in (lambda: session.note(LONG), lambda: session.name_type(LONG), lambda: session.settle(decided, LONG),
                lambda: session.edit_cycles("rig/a.nwb", edit)):
        with pytest.raises(TargetError, match="disk is full"):
            act()
        assert session.entries == before
        assert session.current == here
        assert session.has_unsaved
    assert session.batch_candidates() == batch
    free_disk(session)
    assert session.undo().entries[0].key == decided.key
    assert session.undo() is None


def test_what_failed_can_be_tried_again(session):
    entry = session.current
    fill_disk(session)
    with pytest.raises(TargetError):
        session.note(LONG)
    with pytest.raises(TargetError):
        session.retry()
    assert session.has_unsaved
    free_disk(session)
    assert session.retry()
    assert row(session, entry.unit).note == LONG
    assert not session.has_unsaved
    assert not session.retry()


def test_the_work_can_go_on_in_another_file(session, tmp_path):
    decided = session.accept()
    entry = session.current
    fill_disk(session)
    with pytest.raises(TargetError):
        session.note(LONG)
    session.move_store(tmp_path / "other.sqlite")
    assert session.store_path == tmp_path / "other.sqlite"
    assert row(session, entry.unit).note == LONG
    session.accept()
    with DecisionStore(tmp_path / "other.sqlite", is_read_only=True) as store:
        kept = store.history(decided.identifier, decided.object_id)
    assert [d.unit for d in kept] == [decided.unit, entry.unit]


def test_a_store_that_is_held_by_another_program_is_said_and_the_key_can_be_pressed_again(tmp_path):
    session = review(tmp_path)
    session._board.store._connection.execute("PRAGMA busy_timeout = 20")
    other = sqlite3.connect(tmp_path / "unitclass.sqlite", isolation_level=None)
    other.execute("BEGIN IMMEDIATE")
    here = session.current
    for _ in range(2):
        with pytest.raises(TargetError, match="another program holds the store"):
            session.accept()
    assert session.current == here
    other.execute("ROLLBACK")
    other.close()
    assert session.accept().key == here.key
    assert not session.has_unsaved
    assert len(session.opinions(here)) == 1
