"""Reading what stands for a session: newest opinions, notes, later marks and cycle edits."""

from __future__ import annotations

import hashlib
import math
import sqlite3
from collections.abc import Iterator, Sequence

from unitclass.io.store_history import DECISION_COLUMNS, decision_from
from unitclass.io.store_records import LoggedDecision, LoggedEdit, LoggedNote, SessionLog, UnitRef
from unitclass.records import CycleEdit

_TAKEN_BACK = ("SELECT target FROM acts t WHERE kind = 'undo' AND seq ="
               " (SELECT max(seq) FROM acts WHERE target = t.target)")


def session_log(db: sqlite3.Connection, identifier: str, object_id: str, unit: str | None,
                condition: str | None) -> SessionLog:
    """Return what stands for a session, taken-back acts left out.

    Decisions and notes of other copies of the session (the same identifier under another object
    id) are returned too; whether they count depends on the spike train.
    """
    one = "" if unit is None else " AND unit = ?3 AND condition = ?4"
    given = (identifier, object_id, *(() if unit is None else (unit, condition)))
    return SessionLog(tuple(_decisions(db, one, given)), tuple(_notes(db, one, given)),
                      tuple(_later(db, one, given)), logged_edits(db, object_id, condition))


def _newest(table: str, columns: str, one: str, also: str = "") -> str:
    # SQLite takes the bare columns from the row that holds the maximum.
    return (f"SELECT act, {columns}, max(seq) FROM {table}"
            f" WHERE (object_id = ?2 OR (identifier = ?1 AND identifier != '')){one}"
            f" AND act NOT IN ({_TAKEN_BACK})"
            f" GROUP BY object_id, unit, condition, digest, reviewer{also} ORDER BY max(seq)")


def _decisions(db: sqlite3.Connection, one: str, given: Sequence[str | None]) -> Iterator[LoggedDecision]:
    query = _newest("decisions", DECISION_COLUMNS, one, ", how = 'settled'")
    for act, *row, _ in db.execute(query, given).fetchall():
        yield LoggedDecision(act, decision_from(row))


def _notes(db: sqlite3.Connection, one: str, given: Sequence[str | None]) -> Iterator[LoggedNote]:
    query = _newest("notes", "identifier, object_id, unit, digest, condition, reviewer, text", one)
    for act, *ref, reviewer, text, _ in db.execute(query, given).fetchall():
        yield LoggedNote(act, UnitRef(*ref), reviewer, text)


def _later(db: sqlite3.Connection, one: str, given: Sequence[str | None]) -> Iterator[tuple[str, UnitRef]]:
    query = _newest("later_marks", "identifier, object_id, unit, digest, condition, reviewer, is_later", one)
    for _, *ref, reviewer, is_later, _ in db.execute(query, given).fetchall():
        if is_later:
            yield reviewer, UnitRef(*ref)


def logged_edits(db: sqlite3.Connection, object_id: str,
                 condition: str | None = None) -> tuple[LoggedEdit, ...]:
    """Return the cycle edits of a session or of one condition, oldest first, taken-back ones included."""
    one = "" if condition is None else " AND condition = ?2"
    given = (object_id,) if condition is None else (object_id, condition)
    rows = db.execute("SELECT act, condition, action, at_s, value, reviewer, made_at, note FROM cycle_edits"
                      f" WHERE object_id = ?1{one} ORDER BY seq", given).fetchall()
    return tuple(LoggedEdit((act, *_turns(db, act)), object_id, _edit(row)) for act, *row in rows)


def _turns(db: sqlite3.Connection, act: int) -> list[int]:
    return [row[0] for row in db.execute("SELECT seq FROM acts WHERE target = ? ORDER BY seq", (act,))]


def _edit(row: Sequence[object]) -> CycleEdit:
    return CycleEdit(*(math.nan if value is None else value for value in row))  # type: ignore[arg-type]


def digest_of_edits(edits: Sequence[CycleEdit]) -> str:
    """Return a digest of what the edits change; empty when there are none."""
    if not edits:
        return ""
    told = repr([(e.condition, e.action, e.at_s, e.value) for e in edits])
    return hashlib.sha256(told.encode("utf-8", "backslashreplace")).hexdigest()[:12]
