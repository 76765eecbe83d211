"""Which suggestions are sure enough to be accepted together, and why the others are not."""

from __future__ import annotations

from collections.abc import Iterable

from unitclass.errors import UsageError
from unitclass.io.store_records import ASKS_AGAIN, DISAGREEMENT
from unitclass.review.entry import STATES, QueueEntry


def candidates(rows: Iterable[QueueEntry], sure_probability: float) -> tuple[QueueEntry, ...]:
    """Return the rows that would be accepted as a batch, in their order."""
    return tuple(row for row in rows if not objection(row, sure_probability))


def objection(row: QueueEntry, sure_probability: float) -> str:
    """Return why a row is not accepted unseen; empty for a candidate."""
    if row.is_hidden:
        return "suggestion hidden"
    if row.is_reviewed:
        return "reviewed"
    if row.is_later:
        return "put off"
    if row.suggested_type in STATES:
        return row.suggested_type
    if not row.probability >= sure_probability:
        return f"below {sure_probability:g}"
    return _spoken_against(row)


def _spoken_against(row: QueueEntry) -> str:
    for flag in (DISAGREEMENT, ASKS_AGAIN):
        if flag in row.label_flags:
            return flag
    if row.label is not None and row.label.type not in ("", row.suggested_type):
        return f"another reviewer says {row.label.type}"
    return ", ".join(row.flags)


def checked_batch(shown: Iterable[QueueEntry], now: Iterable[QueueEntry]) -> None:
    """Raise UsageError if what is to be accepted is no longer what was shown."""
    changed = [old.unit for old, new in zip(shown, now, strict=True)
               if (old.suggested_type, old.digest) != (new.suggested_type, new.digest) or new.is_hidden]
    if changed:
        raise UsageError(f"the suggestion changed for {len(changed)} of the listed units",
                         remedy="look at the list again")
