"""What the store hands out: whom an act touched, and the log of one session."""

from __future__ import annotations

from dataclasses import dataclass

from unitclass.records import CycleEdit, Decision

DISAGREEMENT = "disagreement"
STALE = "stale"
ASKS_AGAIN = "asks again"

SETTLED = "settled"
BATCH = "batch"
BLIND = "blind"
VIEWED = "viewed"


@dataclass(frozen=True)
class UnitRef:
    """One unit in one condition of one session, as the store knows it."""

    identifier: str
    object_id: str
    unit: str
    digest: str
    condition: str


@dataclass(frozen=True)
class Act:
    """One thing a reviewer did: a decision, a batch, a note, a later mark, a cycle edit.

    `seq` orders everything that ever happened in the store, whatever the clocks say. `refs` are
    the units it touched; a cycle edit touches a condition, so its only ref has an empty unit.
    """

    seq: int
    reviewer: str
    made_at: str
    kind: str
    refs: tuple[UnitRef, ...]


@dataclass(frozen=True)
class LoggedDecision:
    """A decision that has not been taken back, with its place in the order of acts."""

    act: int
    decision: Decision


@dataclass(frozen=True)
class LoggedNote:
    """A reviewer's newest note on a unit; an empty text has removed it."""

    act: int
    ref: UnitRef
    reviewer: str
    text: str


@dataclass(frozen=True)
class LoggedEdit:
    """A cycle edit with the acts at which it was made, taken back, brought back, in order."""

    acts: tuple[int, ...]
    object_id: str
    edit: CycleEdit

    @property
    def holds(self) -> bool:
        """Return whether the edit is in force now."""
        return len(self.acts) % 2 == 1

    def holds_at(self, act: int) -> bool:
        """Return whether the edit was in force right after `act`."""
        return sum(turn <= act for turn in self.acts) % 2 == 1


@dataclass(frozen=True)
class SessionLog:
    """All that stands in the store for one session.

    `decisions` holds, for each reviewer, unit, condition and spike train, the newest opinion and
    the newest settlement; `later` the reviewer's marks that are in force.
    """

    decisions: tuple[LoggedDecision, ...]
    notes: tuple[LoggedNote, ...]
    later: tuple[tuple[str, UnitRef], ...]
    edits: tuple[LoggedEdit, ...]
