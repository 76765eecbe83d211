"""Which labels may teach the suggestions."""

from __future__ import annotations

from dataclasses import dataclass

from unitclass.io.store_records import BATCH, STALE
from unitclass.records import NOT_ONE_CELL
from unitclass.review.entry import STATES, EntryKey, QueueEntry


@dataclass(frozen=True)
class Lesson:
    """A label by a person who looked at the unit; `how` is "viewed", "blind" or "settled"."""

    key: EntryKey
    type: str
    how: str


def lesson_from(row: QueueEntry) -> Lesson | None:
    """Return what a row teaches; None where it must not.

    Batch acceptances do not teach, or the engine would learn from itself; nor does a label
    given on cycles that have changed since, one that reviewers dispute, or one that names no
    firing type.
    """
    label = row.label
    if label is None or not label.type or label.how == BATCH or STALE in label.flags:
        return None
    if label.type in (NOT_ONE_CELL, *STATES):
        return None
    return Lesson(row.key, label.type, label.how)
