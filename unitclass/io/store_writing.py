"""The rows of one act: the only statements that write to the store, all of them INSERT."""

from __future__ import annotations

import math
import sqlite3
from collections.abc import Sequence

from unitclass.io.store_records import UnitRef
from unitclass.io.store_text import now_utc, storable
from unitclass.records import CycleEdit, Decision


def add_act(db: sqlite3.Connection, reviewer: str, kind: str, target: int | None = None) -> int:
    """Add an act, or the taking-back or bringing-back of `target`, and return its number."""
    cursor = db.execute("INSERT INTO acts (reviewer, made_at, kind, target) VALUES (?, ?, ?, ?)",
                        (storable(reviewer), now_utc(), kind, target))
    return int(cursor.lastrowid or 0)


def add_decisions(db: sqlite3.Connection, act: int, decisions: Sequence[Decision]) -> None:
    """Add the decisions of one act."""
    for d in decisions:
        words = {name: storable(value) for name, value in vars(d).items() if isinstance(value, str)}
        _insert(db, "decisions", {"act": act, **words,
                                  "suggested_probability": _number(d.suggested_probability)})


def add_note(db: sqlite3.Connection, act: int, ref: UnitRef, reviewer: str, text: str) -> None:
    """Add a note on a unit."""
    _insert(db, "notes", {"act": act, **_words(ref, reviewer), "text": storable(text)})


def add_later_mark(db: sqlite3.Connection, act: int, ref: UnitRef, reviewer: str, is_later: bool) -> None:
    """Add that a unit is put off, or no longer."""
    _insert(db, "later_marks", {"act": act, **_words(ref, reviewer), "is_later": int(is_later)})


def add_edit(db: sqlite3.Connection, act: int, identifier: str, object_id: str, edit: CycleEdit) -> None:
    """Add a change to the cycles of one condition."""
    words = {"identifier": identifier, "object_id": object_id, "condition": edit.condition,
             "action": edit.action, "reviewer": edit.reviewer, "made_at": edit.made_at or now_utc(),
             "note": edit.note}
    _insert(db, "cycle_edits", {"act": act, **{name: storable(word) for name, word in words.items()},
                                "at_s": _number(edit.at_s), "value": _number(edit.value)})


def _words(ref: UnitRef, reviewer: str) -> dict[str, str]:
    return {name: storable(value) for name, value in {**vars(ref), "reviewer": reviewer}.items()}


def _number(value: float) -> float | None:
    return None if math.isnan(value) else float(value)


def _insert(db: sqlite3.Connection, table: str, row: dict[str, str | int | float | None]) -> None:
    names = ", ".join(row)
    marks = ", ".join("?" * len(row))
    db.execute(f"INSERT INTO {table} ({names}) VALUES ({marks})", tuple(row.values()))
