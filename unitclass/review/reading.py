"""What a screen can look at: files, the queue and its cursor, results, and where it all stands."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Sequence
from pathlib import Path
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from unitclass.io.decisions import DecisionStore
from unitclass.io.session_view import MemorySession, SessionView
from unitclass.io.standing import opinions
from unitclass.io.store_records import DISAGREEMENT
from unitclass.records import (
    ConditionResult,
    CycleEdit,
    Decision,
    Labels,
    SessionResult,
    Suggestion,
    UnitResult,
)
from unitclass.review import batch_accept, rows
from unitclass.review.board import Board
from unitclass.review.entry import EntryKey, QueueEntry
from unitclass.review.filters import Filter
from unitclass.review.ordering import INFORMATIVE
from unitclass.review.progress import ExportItem, Progress, export_plan, progress_of
from unitclass.review.shelf import FileState
from unitclass.review.teaching import Lesson, lesson_from

if TYPE_CHECKING:
    from unitclass.review.agreement import AgreementReport


class ReviewReader:
    """Everything of a review that changes no decision; see `ReviewSession` for the parameters."""

    def __init__(self, store: DecisionStore, reviewer: str, *, sure_probability: float = 0.95,
                 is_blind: bool = False) -> None:
        self._board = Board(store, reviewer, sure_probability, is_blind)
        self._held: dict[EntryKey, Suggestion] = {}
        self._in_sight: set[EntryKey] = set()
        self.reviewer = reviewer
        self.sure_probability = sure_probability

    @property
    def is_blind(self) -> bool:
        """Return whether suggestions are hidden until this reviewer has decided."""
        return self._board.is_blind

    def set_blind(self, is_blind: bool) -> None:
        """Hide suggestions until this reviewer has decided, or show them again; places stay.

        A unit whose suggestion was under the cursor before counts as viewed, hidden or not.
        """
        self._note_sight()
        self._board.is_blind = is_blind
        self._board.reload(self._board.shelf.views)

    @property
    def store_path(self) -> Path:
        """Return where decisions are kept."""
        return self._board.store.path

    # ---------------------------------------------------------------------------- files

    def expect(self, paths: Iterable[str]) -> None:
        """List files whose analysis is under way."""
        for path in paths:
            self._board.shelf.expect(path)

    def add_result(self, result: SessionResult) -> None:
        """Take in a session's results; results of the same path are replaced."""
        self.add_session(MemorySession(result))

    def add_session(self, *views: SessionView) -> None:
        """Take in sessions, e.g. those found in the result cache; like `add_result`.

        Many at once are quicker than one by one.
        """
        paths = {view.head.path for view in views}
        self._held = {key: held for key, held in self._held.items() if key[0] not in paths}
        self._board.put(views)

    def add_failure(self, path: str, reason: str) -> None:
        """List a file that could not be analysed, with the reason."""
        self._board.shelf.fail(path, reason)

    @property
    def files(self) -> tuple[FileState, ...]:
        """Return every input file with its state."""
        return self._board.shelf.files

    # ---------------------------------------------------------------------------- queue

    @property
    def entries(self) -> tuple[QueueEntry, ...]:
        """Return the rows in view, in the order of the queue."""
        return self._board.queue.view

    @property
    def all_entries(self) -> tuple[QueueEntry, ...]:
        """Return every row, whatever the filter."""
        return tuple(self._board.queue.rows())

    @property
    def current(self) -> QueueEntry | None:
        """Return the row under the cursor; None while there is nothing to show."""
        return self._board.queue.current

    @property
    def index(self) -> int:
        """Return the cursor's place in `entries`; -1 while there is nothing to show."""
        return self._board.queue.index

    def entry(self, key: EntryKey) -> QueueEntry:
        """Return the row under a key as it is now; raises KeyError."""
        return self._board.queue.row(key)

    def move_next(self) -> QueueEntry | None:
        """Go to the next row."""
        return self._moved(lambda: self._board.queue.move(1))

    def move_previous(self) -> QueueEntry | None:
        """Go to the row before."""
        return self._moved(lambda: self._board.queue.move(-1))

    def jump(self, index: int) -> QueueEntry | None:
        """Go to a place in `entries`, or the end nearest to it."""
        return self._moved(lambda: self._board.queue.jump(index))

    def go_to(self, key: EntryKey) -> QueueEntry | None:
        """Go to a row, bringing it into view if the filter hid it; raises KeyError."""
        return self._moved(lambda: self._board.queue.go_to(key))

    def next_open(self) -> QueueEntry | None:
        """Go to the next row this reviewer has not decided on; None when none is left."""
        return self._moved(self._board.queue.next_open)

    def find(self, text: str) -> QueueEntry | None:
        """Go to the next row whose unit, file, condition or region holds all words of `text`."""
        return self._moved(lambda: self._board.queue.find(text))

    def sort(self, by: str = INFORMATIVE, *, is_reversed: bool = False) -> None:
        """Order the queue anew; `by` is "informative" or a key of ordering.SORTS."""
        self._board.queue.sort(by, is_reversed=is_reversed)

    def show(self, chosen: Filter) -> None:
        """Show only what a filter lets through; `Filter()` shows everything."""
        self._moved(lambda: self._board.queue.show(chosen))

    @property
    def filter(self) -> Filter:
        """Return the filter in force."""
        return self._board.queue.filter

    @property
    def sorted_by(self) -> str:
        """Return the name of the sort in force."""
        return self._board.queue.sorted_by

    @property
    def is_reversed(self) -> bool:
        """Return whether the sort in force runs backwards."""
        return self._board.queue.is_reversed

    def choices(self, name: str) -> tuple[tuple[str, int], ...]:
        """Return the values a tuple field of Filter can take, each with its number of rows."""
        return self._board.queue.choices(name)

    def _moved(self, move: Callable[[], QueueEntry | None]) -> QueueEntry | None:
        """Move the cursor; what it leaves has been seen, and gets the suggestion held back for it."""
        self._note_sight()
        before = self._board.queue.current
        found = move()
        after = self._board.queue.current
        if before is not None and (after is None or after.key != before.key):
            self._leave(before.key)
        return found

    def _note_sight(self) -> None:
        if self.current is not None and not self.current.is_hidden:
            self._in_sight.add(self.current.key)

    def _leave(self, key: EntryKey) -> None:
        was_marked = self._board.shelf.seen(key)
        held = self._held.pop(key, None)
        if held is not None:
            self._board.shelf.replace_suggestion(key, held)
        if was_marked or held is not None:
            self._board.suggest([key])

    # -------------------------------------------------------------------------- results

    def unit_result(self, entry: QueueEntry) -> UnitResult:
        """Return all about a unit; while it is hidden, without the engine's opinion."""
        unit = self._board.shelf.unit_result(entry.key)
        return rows.without_suggestion(unit) if self.entry(entry.key).is_hidden else unit

    def condition_result(self, entry: QueueEntry, *, with_envelopes: bool = False) -> ConditionResult:
        """Return the entry's condition without its units; the nerves' traces only on demand."""
        return self._board.shelf.condition_result(entry.path, entry.condition, with_envelopes)

    def session_result(self, path: str) -> SessionResult:
        """Return everything about a file, for an export; raises UnitclassError if not ready."""
        return self._board.shelf.session_result(path)

    def profiles(self, entries: Sequence[QueueEntry]) -> NDArray[np.float32]:
        """Return rates by phase, shape (n_entries, n_bins), spikes/s; NaN where not observed."""
        return self._board.shelf.rates_hz(tuple(entries))

    def conditions_of(self, entry: QueueEntry) -> tuple[QueueEntry, ...]:
        """Return the rows of the same unit in every condition of its file, in the file's order."""
        return tuple(self.entry(key) for key in self._board.shelf.keys(entry.path) if key[1] == entry.unit)

    def labels(self, path: str) -> Labels:
        """Return the standing labels of a file, for an export."""
        head = self._board.shelf.views[path].head
        return self._board.store.labels_for(head.identifier, head.object_id, self._board.digests(path),
                                      other_sessions=self._board.other_sessions(head.object_id))

    def batch_candidates(self) -> tuple[QueueEntry, ...]:
        """Return exactly the rows in view that `accept_batch` would accept, in their order."""
        return batch_accept.candidates(self.entries, self.sure_probability)

    def batch_objection(self, entry: QueueEntry) -> str:
        """Return why a row is no candidate; empty when it is one."""
        return batch_accept.objection(entry, self.sure_probability)

    def disagreements(self) -> tuple[QueueEntry, ...]:
        """Return the rows on which reviewers differ and nobody has settled."""
        return tuple(row for row in self._board.ordered() if DISAGREEMENT in row.label_flags)

    def opinions(self, entry: QueueEntry) -> tuple[Decision, ...]:
        """Return each reviewer's newest opinion, settlements left out; none while hidden."""
        if self.entry(entry.key).is_hidden:
            return ()
        log = self._board.store.read(entry.identifier, entry.object_id, unit=entry.unit, condition=entry.condition)
        return opinions(log, {entry.unit: entry.digest}).get((entry.unit, entry.condition), ())

    def agreement(self) -> AgreementReport:
        """Compare all reviewers over the open files; units that are hidden are left out."""
        heads = {path: view.head for path, view in self._board.shelf.views.items()}
        from unitclass.review.agreement import StoredSession, agreement, rated_units

        stored = [StoredSession(path, head.identifier, head.object_id, self._board.digests(path))
                  for path, head in heads.items()]
        found = rated_units(self._board.store, stored)
        return agreement([unit for unit in found if not self._is_hidden((unit.path, unit.unit, unit.condition))])

    def _is_hidden(self, key: EntryKey) -> bool:
        return key in self._board.queue and self.entry(key).is_hidden

    def cycle_edits(self, path: str) -> tuple[CycleEdit, ...]:
        """Return the cycle edits of a file that are in force, oldest first."""
        head = self._board.shelf.views[path].head
        return self._board.store.edits_for(head.identifier, head.object_id)

    def lessons(self) -> tuple[Lesson, ...]:
        """Return the labels that may teach: given by a person who looked, on the present train."""
        found = (lesson_from(row) for row in self._board.queue.rows())
        return tuple(lesson for lesson in found if lesson is not None)

    # -------------------------------------------------------------------- where it stands

    def progress(self) -> Progress:
        """Return what is done and what is left."""
        return progress_of(self.all_entries, self.files)

    def export_plan(self, out_dir: str | Path | None = None) -> tuple[ExportItem, ...]:
        """Return what an export would write, file by file."""
        return export_plan(self.all_entries, self.files, out_dir)

    def refresh(self) -> bool:
        """Look whether somebody else has added to the store; return whether anything was taken in."""
        return self._board.refresh()
