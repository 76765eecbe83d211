"""Acts in their order: what can be undone or redone, and the history of decisions."""

from __future__ import annotations

import math
import sqlite3
from collections.abc import Collection
from contextlib import closing
from dataclasses import replace
from pathlib import Path

from unitclass.errors import TargetError
from unitclass.io.store_records import Act, UnitRef
from unitclass.io.store_schema import translated_errors
from unitclass.records import Decision

_REFS = " UNION ALL ".join(
    f"SELECT identifier, object_id, {unit}, {digest}, condition FROM {table} WHERE act = ?1"
    for table, unit, digest in (("decisions", "unit", "digest"), ("notes", "unit", "digest"),
                                ("later_marks", "unit", "digest"), ("cycle_edits", "''", "''")))

_TOUCHED = " UNION ALL ".join(f"SELECT act, object_id FROM {table}"
                              for table in ("decisions", "notes", "later_marks", "cycle_edits"))

DECISION_COLUMNS = ("identifier, object_id, unit, digest, condition, type, reviewer, decided_at, how, note,"
                    " suggested_type, suggested_probability, settings_digest, template_digest")


def act(db: sqlite3.Connection, seq: int) -> Act:
    """Return an act with the units it touched."""
    reviewer, made_at, kind = db.execute("SELECT reviewer, made_at, kind FROM acts WHERE seq = ?",
                                         (seq,)).fetchone()
    return Act(seq, reviewer, made_at, kind, tuple(UnitRef(*row) for row in db.execute(_REFS, (seq,))))


def next_to_undo(db: sqlite3.Connection, reviewer: str, object_ids: Collection[str] | None) -> int | None:
    """Return the newest act of the reviewer that is in force, among those within the sessions."""
    done, _ = _stacks(db, reviewer, object_ids)
    return done[-1] if done else None


def next_to_redo(db: sqlite3.Connection, reviewer: str, object_ids: Collection[str] | None) -> int | None:
    """Return the act taken back last; None after anything new was done."""
    _, undone = _stacks(db, reviewer, object_ids)
    return undone[-1] if undone else None


def _stacks(db: sqlite3.Connection, reviewer: str,
            object_ids: Collection[str] | None) -> tuple[list[int], list[int]]:
    """Replay the reviewer's acts: those in force, and those that can be brought back."""
    within = _acts_within(db, reviewer, object_ids)
    done: list[int] = []
    undone: list[int] = []
    for seq, kind, target in db.execute("SELECT seq, kind, target FROM acts WHERE reviewer = ? ORDER BY seq",
                                        (reviewer,)):
        if (seq if target is None else target) not in within:
            continue
        if target is None:
            done.append(seq)
            undone.clear()
        else:
            here, there = (done, undone) if kind == "undo" else (undone, done)
            if target in here:
                here.remove(target)
            there.append(target)
    return done, undone


def _acts_within(db: sqlite3.Connection, reviewer: str, object_ids: Collection[str] | None) -> set[int]:
    rows = db.execute(f"SELECT t.act, t.object_id FROM ({_TOUCHED}) t JOIN acts a ON a.seq = t.act"
                      " WHERE a.reviewer = ?", (reviewer,)).fetchall()
    acts = {seq for seq, _ in rows}
    if object_ids is None:
        return acts
    wanted = set(object_ids)
    return acts - {seq for seq, object_id in rows if object_id not in wanted}


def history(db: sqlite3.Connection, identifier: str, object_id: str) -> tuple[Decision, ...]:
    """Return every decision on a session in the order of acts; undo shows as an empty type."""
    query = (f"SELECT a.seq, a.kind, a.made_at, {DECISION_COLUMNS.replace('reviewer', 'd.reviewer')}"
             " FROM decisions d JOIN acts a ON a.seq = d.act OR a.target = d.act"
             " WHERE d.identifier = ? AND d.object_id = ? ORDER BY a.seq, d.seq")
    return tuple(_as_told(kind, made_at, decision_from(row))
                 for _, kind, made_at, *row in db.execute(query, (identifier, object_id)))


def _as_told(kind: str, made_at: str, decision: Decision) -> Decision:
    if kind == "undo":
        return replace(decision, type="", decided_at=made_at)
    return replace(decision, decided_at=made_at) if kind == "redo" else decision


def decision_from(row: Collection[object]) -> Decision:
    """Return the decision of a row with DECISION_COLUMNS."""
    values = list(row)
    if values[11] is None:
        values[11] = math.nan
    return Decision(*values)  # type: ignore[arg-type]


def copy(db: sqlite3.Connection, target: Path) -> None:
    """Copy a whole store to a new file; raises TargetError, also when it exists."""
    if target.exists():
        raise TargetError("exists already", where=str(target), remedy="name a new file")
    with translated_errors(target), closing(sqlite3.connect(target)) as new:
        db.backup(new)
