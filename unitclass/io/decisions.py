"""The store of decisions: one append-only SQLite file that several people may use at once.

Everything a reviewer does is an act with rows of its own. Undo and redo are acts too, which
point at the act they take back or bring back; no row is ever changed or removed.
"""

from __future__ import annotations

import math
import sqlite3
import threading
from collections.abc import Callable, Collection, Mapping, Sequence
from pathlib import Path
from types import TracebackType
from typing import Any

from unitclass.errors import UsageError
from unitclass.io import store_history, store_reading, store_writing
from unitclass.io.standing import standing_labels
from unitclass.io.store_records import Act, SessionLog, UnitRef
from unitclass.io.store_schema import open_connection, transaction, translated_errors
from unitclass.io.store_text import storable
from unitclass.records import CycleEdit, Decision, Labels


class DecisionStore:
    """One SQLite file of decisions, notes, later marks and cycle edits.

    A method that writes returns only after the operating system has confirmed the data on disk.
    The object may be used from several threads.

    Parameters
    ----------
    path : Path
        Created with its schema when missing, unless `is_read_only`.
    is_read_only : bool
        Read an existing store without ever writing to it or its folder.
    busy_timeout_s : float
        How long to wait for another program that is writing.

    Raises
    ------
    TargetError
        If the file cannot be created or written.
    FileError
        If the file is no store, is damaged, or was written by a newer version.
    """

    def __init__(self, path: Path | str, *, is_read_only: bool = False, busy_timeout_s: float = 5.0) -> None:
        self.path = Path(path)
        self._lock = threading.RLock()
        self._connection = open_connection(self.path, is_read_only=is_read_only,
                                           busy_timeout_s=busy_timeout_s)

    def __enter__(self) -> DecisionStore:
        return self

    def __exit__(self, kind: type[BaseException] | None, error: BaseException | None,
                 trace: TracebackType | None) -> None:
        self.close()

    def close(self) -> None:
        """Close the file; every decision is on disk already."""
        with self._lock:
            self._connection.close()

    # ------------------------------------------------------------------------- writing

    def decide(self, decisions: Sequence[Decision], *, kind: str = "decide") -> Act:
        """Append decisions of one reviewer as a single act, undone as one.

        Raises
        ------
        UsageError
            If there are none, they are of several reviewers, or one has no type.
        TargetError
            If they could not be committed; then none is stored.
        """
        reviewer = _checked_decisions(decisions)
        return self._append(reviewer, kind, lambda db, act: store_writing.add_decisions(db, act, decisions))

    def add_note(self, ref: UnitRef, text: str, reviewer: str) -> Act:
        """Append a note on a unit; an empty one removes the note. Raises TargetError."""
        return self._append(reviewer, "note",
                            lambda db, act: store_writing.add_note(db, act, ref, reviewer, text))

    def mark_later(self, ref: UnitRef, is_later: bool, reviewer: str) -> Act:
        """Append that a unit is put off, or no longer. Raises TargetError."""
        return self._append(reviewer, "later" if is_later else "no longer later",
                            lambda db, act: store_writing.add_later_mark(db, act, ref, reviewer, is_later))

    def edit_cycles(self, identifier: str, object_id: str, edit: CycleEdit) -> Act:
        """Append a change to the cycles of `edit.condition`. Raises TargetError, UsageError."""
        _checked_edit(edit)
        return self._append(edit.reviewer, "cycles",
                            lambda db, act: store_writing.add_edit(db, act, identifier, object_id, edit))

    def undo(self, reviewer: str, object_ids: Collection[str] | None = None) -> Act | None:
        """Append the taking-back of the reviewer's newest act that is in force.

        Parameters
        ----------
        object_ids : collection of str, optional
            Only acts that touch nothing but these sessions count.

        Returns
        -------
        Act or None
            The act that was taken back; None when there is none. Raises TargetError.
        """
        return self._turn(reviewer, "undo", store_history.next_to_undo, object_ids)

    def redo(self, reviewer: str, object_ids: Collection[str] | None = None) -> Act | None:
        """Append the bringing-back of the act that the reviewer took back last; like `undo`."""
        return self._turn(reviewer, "redo", store_history.next_to_redo, object_ids)

    def _append(self, reviewer: str, kind: str, insert: Callable[[sqlite3.Connection, int], object]) -> Act:
        with self._lock, transaction(self._connection, self.path) as db:
            seq = store_writing.add_act(db, reviewer, kind)
            insert(db, seq)
            act = store_history.act(db, seq)
        return act

    def _turn(self, reviewer: str, kind: str,
              choose: Callable[[sqlite3.Connection, str, Collection[str] | None], int | None],
              object_ids: Collection[str] | None) -> Act | None:
        with self._lock, transaction(self._connection, self.path) as db:
            target = choose(db, storable(reviewer), object_ids)
            if target is None:
                return None
            store_writing.add_act(db, reviewer, kind, target)
            return store_history.act(db, target)

    # ------------------------------------------------------------------------- reading

    def read(self, identifier: str, object_id: str, *, unit: str | None = None,
             condition: str | None = None) -> SessionLog:
        """Return what stands for a session, or for one unit in one condition of it."""
        with self._lock, translated_errors(self.path):
            return store_reading.session_log(self._connection, storable(identifier), storable(object_id),
                                             None if unit is None else storable(unit),
                                             None if condition is None else storable(condition))

    def labels_for(self, identifier: str, object_id: str, digests: Mapping[str, str], *,
                   other_sessions: Collection[str] = ()) -> Labels:
        """Return the standing label of every unit and condition that somebody said something of.

        Parameters
        ----------
        identifier, object_id : str
            Of the NWB session.
        digests : Mapping
            Unit id to the digest of its present spike train. A decision on another train is
            not used; its unit gets an empty label with the flag "asks again".
        other_sessions : collection of str
            Object ids that are known to be other sessions, even with the same identifier.

        Returns
        -------
        Labels
            (unit, condition) to Label. `type` is empty, with a flag, while reviewers differ or
            the unit asks again, and without a flag where there is only a note. The flag
            "stale" marks a label that was given before a change of its cycles.
        """
        return standing_labels(self.read(identifier, object_id), object_id, digests, other_sessions)

    def edits_for(self, identifier: str, object_id: str) -> tuple[CycleEdit, ...]:
        """Return the cycle edits of a session that are in force, oldest first."""
        with self._lock, translated_errors(self.path):
            logged = store_reading.logged_edits(self._connection, storable(object_id))
        return tuple(edit.edit for edit in logged if edit.holds)

    def edits_digest(self, identifier: str, object_id: str) -> str:
        """Return a digest of the cycle edits in force; empty when there are none."""
        return store_reading.digest_of_edits(self.edits_for(identifier, object_id))

    def history(self, identifier: str, object_id: str) -> tuple[Decision, ...]:
        """Return every decision ever made on a session, in order; taking back has an empty type."""
        with self._lock, translated_errors(self.path):
            return store_history.history(self._connection, storable(identifier), storable(object_id))

    def reviewers(self) -> tuple[str, ...]:
        """Return the names of everybody who decided anything, sorted."""
        rows = self._rows("SELECT DISTINCT reviewer FROM decisions ORDER BY reviewer")
        return tuple(row[0] for row in rows)

    def version(self) -> int:
        """Return a number that grows whenever anybody adds anything: cheap to poll."""
        return int(self._rows("SELECT coalesce(max(seq), 0) FROM acts")[0][0])

    def copy_to(self, path: Path | str) -> DecisionStore:
        """Write all that is in this store to a new file and return the store there.

        For a disk that has become full or unwritable. Raises TargetError, also when the file exists.
        """
        with self._lock:
            store_history.copy(self._connection, Path(path))
        return DecisionStore(path)

    def _rows(self, query: str) -> list[tuple[Any, ...]]:
        with self._lock, translated_errors(self.path):
            return self._connection.execute(query).fetchall()


def _checked_decisions(decisions: Sequence[Decision]) -> str:
    reviewers = {d.reviewer for d in decisions}
    if len(reviewers) != 1:
        raise UsageError(f"decisions of {len(reviewers)} reviewers in one act",
                         remedy="give at least one decision, all of one reviewer")
    if not all(d.type.strip() for d in decisions):
        raise UsageError("a decision without a type",
                         remedy="name a type, or take the decision back with undo")
    return reviewers.pop()


def _checked_edit(edit: CycleEdit) -> None:
    needed = {"drop": edit.at_s, "restore": edit.at_s, "threshold": edit.value}
    if edit.action not in needed:
        raise UsageError(f"unknown cycle edit {edit.action!r}", remedy="use drop, restore or threshold")
    if not math.isfinite(needed[edit.action]):
        raise UsageError(f"the cycle edit {edit.action!r} lacks its number",
                         remedy="give at_s for drop and restore, value for threshold")
