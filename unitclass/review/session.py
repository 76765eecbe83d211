"""The review without its screens: a queue over many files, decisions, undo, suggestions.

Everything a screen needs is asked of a `ReviewSession`. A method that decides returns after the
decision is on disk; if it cannot be saved it raises, nothing has changed, and `retry` tries again.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, replace
from pathlib import Path

from unitclass.errors import UsageError
from unitclass.io.decisions import DecisionStore
from unitclass.io.store_records import BATCH, BLIND, SETTLED, VIEWED, Act
from unitclass.records import NOT_ONE_CELL, CycleEdit, Suggestion
from unitclass.review import batch_accept, deciding
from unitclass.review.entry import EntryKey, QueueEntry
from unitclass.review.reading import ReviewReader


@dataclass(frozen=True)
class Turn:
    """What an undo or redo did: the act, the rows it touched, and what to analyse again.

    `act.kind` is "decide", "batch", "settle", "note", "later", "no longer later" or "cycles";
    `paths` are the files whose cycle edits changed, to be analysed again by the caller.
    """

    act: Act
    entries: tuple[QueueEntry, ...]
    paths: tuple[str, ...] = ()


class ReviewSession(ReviewReader):
    """The state of one reviewer's work on many files.

    Parameters
    ----------
    store : DecisionStore
    reviewer : str
        See `reviewer_name`.
    sure_probability : float
        Suggestions at or over this may be accepted as a batch.
    is_blind : bool
        Hide suggestions and other people's opinions of a unit until this reviewer has decided on it.
    """

    def __init__(self, store: DecisionStore, reviewer: str, *, sure_probability: float = 0.95,
                 is_blind: bool = False) -> None:
        super().__init__(store, reviewer, sure_probability=sure_probability, is_blind=is_blind)
        self._unsaved: Callable[[], Act] | None = None

    # ------------------------------------------------------------------------ decisions

    def accept(self) -> QueueEntry:
        """Accept the current suggestion and go on; return the row decided on.

        Raises
        ------
        UsageError
            If there is nothing under the cursor, or its suggestion is hidden.
        TargetError
            If the decision could not be saved.
        """
        entry = self._at_cursor()
        if entry.is_hidden:
            raise UsageError("the suggestion is hidden until you have named a type", remedy="name a type")
        return self._decide(entry, entry.suggested_type)

    def take_alternative(self, n: int) -> QueueEntry:
        """Take the n-th of the ranked types, 1 for the first, and go on; raises like `accept`."""
        entry = self._at_cursor()
        if not 1 <= n <= len(entry.ranked):
            raise UsageError(f"there is no alternative {n}", where=entry.unit, remedy="name a type")
        return self._decide(entry, entry.ranked[n - 1][0])

    def name_type(self, type_id: str) -> QueueEntry:
        """Decide on any type and go on; raises like `accept`."""
        return self._decide(self._at_cursor(), deciding.checked_type(type_id))

    def not_one_cell(self) -> QueueEntry:
        """Decide that the train is not one cell's and go on; raises like `accept`."""
        return self._decide(self._at_cursor(), NOT_ONE_CELL)

    def _decide(self, entry: QueueEntry, type_id: str) -> QueueEntry:
        how = BLIND if entry.is_hidden and entry.key not in self._in_sight else VIEWED
        if not deciding.is_decided_so(entry, type_id, how):
            decision = deciding.decision_on(entry, type_id, self.reviewer, how)
            self._do(lambda: self._board.store.decide([decision]))
        if self._board.shelf.seen(entry.key):
            self._board.suggest([entry.key])
        decided = self.entry(entry.key)
        self.next_open()
        return decided

    def note(self, text: str) -> QueueEntry:
        """Leave a note on the current unit, or remove it with an empty text; the cursor stays."""
        entry = self._at_cursor()
        self._do(lambda: self._board.store.add_note(deciding.ref_of(entry), text.strip(), self.reviewer))
        return self.entry(entry.key)

    def later(self) -> QueueEntry:
        """Put the current unit off, or back among the open ones if it is put off; go on."""
        entry = self._at_cursor()
        self._do(lambda: self._board.store.mark_later(deciding.ref_of(entry), not entry.is_later, self.reviewer))
        if not entry.is_later:
            self.next_open()
        return self.entry(entry.key)

    def accept_batch(self, entries: Sequence[QueueEntry]) -> tuple[QueueEntry, ...]:
        """Accept the suggestions of the rows shown, in one act that is undone as one.

        Raises
        ------
        UsageError
            If a suggestion is no longer the one in `entries`.
        TargetError
            If they could not be saved; then none is.
        """
        if not entries:
            return ()
        batch_accept.checked_batch(entries, [self.entry(e.key) for e in entries])
        decisions = [deciding.decision_on(e, e.suggested_type, self.reviewer, BATCH) for e in entries]
        self._do(lambda: self._board.store.decide(decisions, kind="batch"))
        return tuple(self.entry(e.key) for e in entries)

    def settle(self, entry: QueueEntry, type_id: str) -> QueueEntry:
        """Let one label stand over differing opinions, which are kept; the cursor stays."""
        decision = deciding.decision_on(entry, deciding.checked_type(type_id), self.reviewer, SETTLED)
        self._do(lambda: self._board.store.decide([decision], kind="settle"))
        return self.entry(entry.key)

    def undo(self) -> Turn | None:
        """Take back this reviewer's newest act and go to its unit; None when there is none.

        Reaches back through earlier sessions, over the files that are open.
        """
        return self._turn(self._board.store.undo)

    def redo(self) -> Turn | None:
        """Bring back what was taken back last; like `undo`."""
        return self._turn(self._board.store.redo)

    def _turn(self, turn: Callable[[str, list[str]], Act | None]) -> Turn | None:
        scope = [view.head.object_id for view in self._board.shelf.views.values()]
        act = turn(self.reviewer, scope)
        if act is None:
            return None
        touched = self._board.took(act)
        if touched:
            self.go_to(touched[0])
        paths = tuple(dict.fromkeys(p for r in act.refs for p in self._board.paths_of(r.object_id)))
        return Turn(act, tuple(self.entry(key) for key in touched), paths if act.kind == "cycles" else ())

    # --------------------------------------------------------------------- cycle edits

    def edit_cycles(self, path: str, edit: CycleEdit) -> Act:
        """Store a change to the cycles of a condition; labels given before become stale.

        The caller analyses the file again with `cycle_edits(path)` and hands the result in.
        """
        head = self._board.shelf.views[path].head
        signed = replace(edit, reviewer=self.reviewer)
        return self._do(lambda: self._board.store.edit_cycles(head.identifier, head.object_id, signed))

    # ----------------------------------------------------------------------- suggestions

    def update_suggestions(self, suggestions: Mapping[EntryKey, Suggestion]) -> tuple[EntryKey, ...]:
        """Let these suggestions stand in place of the analysis's own; every other unit gets its own back.

        Rows keep their places and say what the suggestion was.
        The row under the cursor keeps what is on the screen until the cursor leaves it, so that
        nobody accepts what was not there a moment ago. Return the keys that changed at once.
        """
        current, shelf = self.current, self._board.shelf
        over = [key for key in shelf.replaced if key not in suggestions]
        changed = []
        for key in (key for key in (*over, *suggestions) if key in self._board.queue):
            if current is not None and key == current.key:
                self._held[key] = suggestions.get(key) or shelf.own_suggestion(key)
            elif key in suggestions:
                shelf.replace_suggestion(key, suggestions[key])
                changed.append(key)
            else:
                shelf.restore_suggestion(key)
                changed.append(key)
        self._board.suggest(changed)
        return tuple(changed)

    def update_groups(self, groups: Mapping[EntryKey, str]) -> None:
        """Let these be the shape groups of all units."""
        self._board.group({key: name for key, name in groups.items() if key in self._board.queue})

    # ---------------------------------------------------------------------------- saving

    @property
    def has_unsaved(self) -> bool:
        """Return whether the last thing done could not be saved."""
        return self._unsaved is not None

    def retry(self) -> bool:
        """Try again to save what could not be saved; return False when there is nothing."""
        if self._unsaved is None:
            return False
        self._do(self._unsaved)
        return True

    def move_store(self, path: str | Path) -> None:
        """Go on in a new store that holds everything of the old one, e.g. on another disk.

        What could not be saved is saved there. Raises TargetError.
        """
        self._board.store = self._board.store.copy_to(path)
        self.retry()

    def _do(self, write: Callable[[], Act]) -> Act:
        """Save an act, then show it; on failure nothing has changed but `has_unsaved`."""
        self._unsaved = write
        act = write()
        self._unsaved = None
        self._board.took(act)
        return act

    def _at_cursor(self) -> QueueEntry:
        if self.current is None:
            raise UsageError("there is no unit under the cursor", remedy="clear the filter or wait for a file")
        return self.current
