"""From a row and a type to the decision that the store keeps."""

from __future__ import annotations

from unitclass.errors import UsageError
from unitclass.io.store_records import UnitRef
from unitclass.io.store_text import now_utc
from unitclass.records import Decision
from unitclass.review.entry import QueueEntry


def decision_on(entry: QueueEntry, type_id: str, reviewer: str, how: str) -> Decision:
    """Return the decision; what is suggested in `entry` is what the reviewer could see."""
    return Decision(
        identifier=entry.identifier, object_id=entry.object_id, unit=entry.unit, digest=entry.digest,
        condition=entry.condition, type=type_id, reviewer=reviewer, decided_at=now_utc(), how=how,
        note=entry.note, suggested_type=entry.suggested_type, suggested_probability=entry.probability,
        settings_digest=entry.settings_digest, template_digest=entry.template_digest)


def ref_of(entry: QueueEntry) -> UnitRef:
    """Return how the store knows the entry's unit."""
    return UnitRef(entry.identifier, entry.object_id, entry.unit, entry.digest, entry.condition)


def is_decided_so(entry: QueueEntry, type_id: str, how: str) -> bool:
    """Return whether deciding again would add nothing: the same type, as carefully, still fresh."""
    return entry.own_type == type_id and entry.own_how in (how, "blind", "settled") and not entry.label_flags


def checked_type(type_id: str) -> str:
    """Return the type without spaces around; raises UsageError for an empty or unprintable one."""
    clean = type_id.strip()
    if not clean or not clean.isprintable():
        raise UsageError(f"{type_id!r} cannot be a type", remedy="name one of `unitclass types list`")
    return clean
