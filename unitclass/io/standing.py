"""Which label stands for a unit, after all opinions on it are weighed. No files here."""

from __future__ import annotations

from collections.abc import Collection, Iterable, Mapping, Sequence

from unitclass.io.store_records import (
    ASKS_AGAIN,
    BATCH,
    BLIND,
    DISAGREEMENT,
    SETTLED,
    STALE,
    VIEWED,
    LoggedDecision,
    LoggedEdit,
    LoggedNote,
    SessionLog,
)
from unitclass.records import Decision, Label, Labels

_CARE = (BATCH, VIEWED, BLIND, SETTLED)
"""Ways of deciding, least careful first; agreeing opinions count as the most careful one."""


def standing_labels(log: SessionLog, object_id: str, digests: Mapping[str, str],
                    other_sessions: Collection[str] = ()) -> Labels:
    """Return the standing label per unit and condition; see `DecisionStore.labels_for`."""
    decisions = _grouped(d for d in log.decisions
                         if _concerns(d.decision, object_id, digests, other_sessions))
    notes = _grouped_notes(log.notes, digests)
    labels = {}
    for key in dict.fromkeys([*decisions, *notes]):
        label = _weighed(decisions.get(key, []), digests.get(key[0]), log.edits, notes.get(key, []))
        if label is not None:
            labels[key] = label
    return labels


def opinions(log: SessionLog, digests: Mapping[str, str]) -> Mapping[tuple[str, str], tuple[Decision, ...]]:
    """Return each reviewer's newest opinion on the present spike train, settlements left out."""
    newest: dict[tuple[str, str], dict[str, Decision]] = {}
    for logged in log.decisions:
        d = logged.decision
        if d.how != SETTLED and d.digest == digests.get(d.unit):
            newest.setdefault((d.unit, d.condition), {})[d.reviewer] = d
    return {key: tuple(by_reviewer.values()) for key, by_reviewer in newest.items()}


def latest_digests(log: SessionLog) -> Mapping[str, str]:
    """Return unit to the digest of the spike train that was decided on last."""
    return {logged.decision.unit: logged.decision.digest
            for logged in sorted(log.decisions, key=lambda d: d.act)}


def newest_of(log: SessionLog, reviewer: str,
              digests: Mapping[str, str]) -> Mapping[tuple[str, str], Decision]:
    """Return what the reviewer decided last, settlements included, on the present spike trains."""
    newest: dict[tuple[str, str], LoggedDecision] = {}
    for logged in log.decisions:
        d = logged.decision
        key = d.unit, d.condition
        if d.reviewer == reviewer and d.digest == digests.get(d.unit) and (
                key not in newest or newest[key].act < logged.act):
            newest[key] = logged
    return {key: logged.decision for key, logged in newest.items()}


def _concerns(d: Decision, object_id: str, digests: Mapping[str, str],
              other_sessions: Collection[str]) -> bool:
    """Tell whether a decision speaks of this session: its own, or a copy of it under a new id."""
    if d.unit not in digests:
        return False
    return d.object_id == object_id or d.digest == digests[d.unit] or d.object_id not in other_sessions


def _grouped(decisions: Iterable[LoggedDecision]) -> dict[tuple[str, str], list[LoggedDecision]]:
    groups: dict[tuple[str, str], list[LoggedDecision]] = {}
    for logged in decisions:
        groups.setdefault((logged.decision.unit, logged.decision.condition), []).append(logged)
    return groups


def _grouped_notes(notes: Iterable[LoggedNote],
                   digests: Mapping[str, str]) -> dict[tuple[str, str], list[LoggedNote]]:
    groups: dict[tuple[str, str], list[LoggedNote]] = {}
    for note in notes:
        if note.ref.digest == digests.get(note.ref.unit):
            groups.setdefault((note.ref.unit, note.ref.condition), []).append(note)
    return groups


def _weighed(decisions: Sequence[LoggedDecision], digest: str | None, edits: Sequence[LoggedEdit],
             notes: Sequence[LoggedNote]) -> Label | None:
    valid = [d for d in decisions if d.decision.digest == digest]
    note = _note(valid, notes)
    if not valid:
        flags = (ASKS_AGAIN,) if decisions else ()
        return Label("", "", "", "", note, flags) if flags or note else None
    voices = _voices(valid)
    if len({v.decision.type for v in voices}) > 1:
        return Label("", "", "", "", note, (DISAGREEMENT,))
    flags = (STALE,) if all(_is_stale(v, edits) for v in voices) else ()
    return _agreed(voices, note, flags)


def _voices(decisions: Sequence[LoggedDecision]) -> list[LoggedDecision]:
    """Return the newest settlement and what was decided after it; without one, every newest opinion."""
    settled = max((d.act for d in decisions if d.decision.how == SETTLED), default=0)
    newest: dict[str, LoggedDecision] = {}
    for logged in sorted(decisions, key=lambda d: d.act):
        if logged.act >= settled:
            newest[logged.decision.reviewer] = logged
    return list(newest.values())


def _agreed(voices: Sequence[LoggedDecision], note: str, flags: tuple[str, ...]) -> Label:
    last = max(voices, key=lambda v: v.act).decision
    how = max((v.decision.how for v in voices), key=lambda h: _CARE.index(h) if h in _CARE else 1)
    names = "; ".join(sorted({v.decision.reviewer for v in voices}))
    return Label(last.type, names, last.decided_at, how, note, flags)


def _is_stale(logged: LoggedDecision, edits: Sequence[LoggedEdit]) -> bool:
    """Tell whether the cycles are edited otherwise now than when the decision was made."""
    return any(edit.holds_at(logged.act) != edit.holds for edit in edits
               if edit.edit.condition == logged.decision.condition)


def _note(decisions: Sequence[LoggedDecision], notes: Sequence[LoggedNote]) -> str:
    """Return the notes that stand: a reviewer's newest one, else the one given with the decision."""
    texts = {logged.decision.reviewer: logged.decision.note
             for logged in sorted(decisions, key=lambda d: d.act)}
    texts |= {note.reviewer: note.text for note in sorted(notes, key=lambda n: n.act)}
    told = {name: text for name, text in texts.items() if text}
    if len(told) == 1:
        return next(iter(told.values()))
    return "; ".join(f"{name}: {text}" for name, text in sorted(told.items()))
