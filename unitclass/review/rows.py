"""From results and the store's log to the rows of the queue."""

from __future__ import annotations

from collections.abc import Collection, Iterable, Mapping
from dataclasses import dataclass, replace

import numpy as np

from unitclass.io.session_view import N_RANKED, LightUnit, SessionHead
from unitclass.io.standing import newest_of, standing_labels
from unitclass.io.store_records import SessionLog
from unitclass.records import Decision, Labels, Suggestion, UnitResult
from unitclass.review.entry import QueueEntry

_OF_DATA = ("few cycles", "intervals under", "rate drifts", "halves of the session", "bias current", "heart", "pump")
"""Words of flags that may be read before a blind judgement."""

UnitKey = tuple[str, str]
"""(unit, condition) within one session."""


@dataclass(frozen=True)
class Standing:
    """What stands for the units of one session, for one reviewer's eyes."""

    labels: Labels
    own: Mapping[UnitKey, Decision]
    notes: Mapping[UnitKey, str]
    later: frozenset[UnitKey]


def standing_of(log: SessionLog, head: SessionHead, digests: Mapping[str, str], reviewer: str,
                other_sessions: Collection[str]) -> Standing:
    """Weigh a session's log for `reviewer`."""
    notes = {(n.ref.unit, n.ref.condition): n.text for n in log.notes
             if n.reviewer == reviewer and n.ref.digest == digests.get(n.ref.unit)}
    later = frozenset((ref.unit, ref.condition) for name, ref in log.later
                      if name == reviewer and ref.digest == digests.get(ref.unit))
    return Standing(standing_labels(log, head.object_id, digests, other_sessions),
                    newest_of(log, reviewer, digests), notes, later)


def row_of(head: SessionHead, unit: LightUnit, standing: Standing) -> QueueEntry:
    """Return the row of one unit as it is, nothing hidden."""
    key = unit.unit, unit.condition
    own, label = standing.own.get(key), standing.labels.get(key)
    return QueueEntry(
        path=head.path, session=head.session, animal=head.animal, identifier=head.identifier,
        object_id=head.object_id, unit=unit.unit, condition=unit.condition, digest=unit.digest,
        suggested_type=unit.suggested_type, ranked=unit.ranked, n_cycles=unit.n_cycles, n_spikes=unit.n_spikes,
        regime=unit.regime, shape_group=unit.shape_group, flags=unit.flags, columns=unit.columns,
        settings_digest=head.settings_digest, template_digest=head.template_digest,
        own_type=own.type if own else "", own_how=own.how if own else "",
        own_at=own.decided_at if own else "", label=label,
        note=standing.notes.get(key, label.note if label else ""), is_later=key in standing.later)


def suggested_anew(unit: LightUnit, suggestion: Suggestion) -> LightUnit:
    """Return the light unit with another suggestion."""
    return replace(unit, suggested_type=suggestion.type, ranked=suggestion.ranked[:N_RANKED])


def change_in_words(before: LightUnit, after: LightUnit) -> str:
    """Return what the suggestion was, or nothing when it did not change to speak of.

    A change to speak of is another type, or a probability that moved by a tenth.
    """
    old, new = dict(before.ranked).get(before.suggested_type), dict(after.ranked).get(after.suggested_type)
    if before.suggested_type == after.suggested_type and abs((old or 0.0) - (new or 0.0)) < 0.1:
        return ""
    return f"was {before.suggested_type}" + ("" if old is None else f" {old:.2f}")


def hidden(row: QueueEntry, own_note: str) -> QueueEntry:
    """Return the row without anything that tells a suggestion or another's opinion."""
    return replace(row, suggested_type="", ranked=(), label=None, change="", is_changed=False,
                   flags=flags_of_data(row.flags), shape_group="", note=own_note, is_hidden=True)


def flags_of_data(flags: Iterable[str]) -> tuple[str, ...]:
    """Return the flags that speak of the data alone; any other may betray a suggestion."""
    return tuple(flag for flag in flags if any(word in flag for word in _OF_DATA))


def without_suggestion(unit: UnitResult) -> UnitResult:
    """Return the unit's data without the engine's opinion of it."""
    nothing = np.empty(0)
    blank = Suggestion("", {}, (), {}, nothing, nothing, nothing)
    return replace(unit, suggestion=blank, flags=flags_of_data(unit.flags), shape_group="")
