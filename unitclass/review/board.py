"""Rows kept in step with the results and the store, as one reviewer may see them."""

from __future__ import annotations

import gc
from collections.abc import Iterable, Iterator, Mapping, Sequence
from contextlib import contextmanager
from dataclasses import replace

from unitclass.io.decisions import DecisionStore
from unitclass.io.session_view import SessionView
from unitclass.io.store_records import Act
from unitclass.review.entry import EntryKey, QueueEntry
from unitclass.review.ordering import INFORMATIVE, rank
from unitclass.review.queue import ReviewQueue
from unitclass.review.rows import Standing, hidden, row_of, standing_of
from unitclass.review.shelf import ResultShelf

_FEW = 20


class Board:
    """The queue, the results and the store, and the way from the last two to the first."""

    def __init__(self, store: DecisionStore, reviewer: str, sure_probability: float, is_blind: bool) -> None:
        self.store = store
        self.reviewer = reviewer
        self.sure_probability = sure_probability
        self.is_blind = is_blind
        self.shelf = ResultShelf()
        self.queue = ReviewQueue(sure_probability)
        self._seen_version = store.version()

    def put(self, views: Sequence[SessionView]) -> None:
        """Take in the results of sessions."""
        with _collector_paused():
            self.queue.drop([key for view in views for key in self.shelf.put(view)])
            self.reload([view.head.path for view in views])

    def reload(self, paths: Iterable[str]) -> None:
        """Make the rows of some files anew from the results and the store."""
        self.queue.put([row for path in paths for row in self._rows_of_file(path)])

    def reload_units(self, keys: Iterable[EntryKey]) -> None:
        """Make some rows anew."""
        self.queue.put([self._row_of_unit(key) for key in keys])

    def suggest(self, keys: Iterable[EntryKey]) -> None:
        """Show the suggestions now in force for some rows; the store is not asked."""
        rows = [self.queue.row(key) for key in keys]
        self.queue.put([row if row.is_hidden else self._with_suggestion(row) for row in rows])

    def group(self, groups: Mapping[EntryKey, str]) -> None:
        """Show these shape groups; the store is not asked."""
        self.shelf.group(groups)
        self.queue.put([row if row.is_hidden else replace(row, shape_group=self.shelf.light(row.key).shape_group)
                        for row in self.queue.rows()])

    def _with_suggestion(self, row: QueueEntry) -> QueueEntry:
        light, change = self.shelf.light(row.key), self.shelf.change(row.key)
        return replace(row, suggested_type=light.suggested_type, ranked=light.ranked, is_changed=bool(change),
                       change=change)

    def took(self, act: Act) -> tuple[EntryKey, ...]:
        """Show what an act changed, and what others did meanwhile; return the keys it touched."""
        keys = [key for ref in act.refs for key in self.keys_of(ref.object_id, ref.unit, ref.condition)]
        touched = tuple(dict.fromkeys(keys))
        version = self.store.version()
        if version == self._seen_version + 1 and len(touched) <= _FEW:
            self.reload_units(touched)
        else:
            self.reload(self.shelf.views)
        self._seen_version = version
        return touched

    def refresh(self) -> bool:
        """Take in what others added to the store; return whether there was anything."""
        version = self.store.version()
        if version == self._seen_version:
            return False
        self._seen_version = version
        self.reload(self.shelf.views)
        return True

    def keys_of(self, object_id: str, unit: str, condition: str) -> list[EntryKey]:
        """Return the keys that an act on a unit touches; an empty unit means all of the condition.

        Copies of a session share their decisions, so more than one file may be touched.
        """
        paths = self.paths_of(object_id)
        if not unit:
            return [key for path in paths for key in self.shelf.keys(path) if key[2] == condition]
        return [key for path in paths if (key := (path, unit, condition)) in self.queue]

    def paths_of(self, object_id: str) -> list[str]:
        """Return the files of a session and of its copies: the same object id or identifier."""
        heads = [view.head for view in self.shelf.views.values()]
        names = {head.identifier for head in heads if head.object_id == object_id} - {""}
        return [head.path for head in heads if head.object_id == object_id or head.identifier in names]

    def digests(self, path: str) -> dict[str, str]:
        """Return unit id to the digest of its present spike train."""
        return {unit.unit: unit.digest for unit in self.shelf.views[path].units}

    def other_sessions(self, object_id: str) -> set[str]:
        """Return the object ids of the other sessions that are open."""
        return {view.head.object_id for view in self.shelf.views.values()} - {object_id}

    def ordered(self) -> Sequence[QueueEntry]:
        """Return every row, whatever the filter, most informative first."""
        return sorted(self.queue.rows(), key=lambda row: rank(row, INFORMATIVE, self.sure_probability))

    # ---------------------------------------------------------------------------- rows

    def _rows_of_file(self, path: str) -> Iterable[QueueEntry]:
        head = self.shelf.views[path].head
        log = self.store.read(head.identifier, head.object_id)
        standing = standing_of(log, head, self.digests(path), self.reviewer, self.other_sessions(head.object_id))
        return [self._row(key, standing) for key in self.shelf.keys(path)]

    def _row_of_unit(self, key: EntryKey) -> QueueEntry:
        path, unit, condition = key
        head = self.shelf.views[path].head
        log = self.store.read(head.identifier, head.object_id, unit=unit, condition=condition)
        digests = {unit: self.shelf.light(key).digest}
        return self._row(key, standing_of(log, head, digests, self.reviewer, self.other_sessions(head.object_id)))

    def _row(self, key: EntryKey, standing: Standing) -> QueueEntry:
        row = row_of(self.shelf.views[key[0]].head, self.shelf.light(key), standing)
        if self.is_blind and not row.is_reviewed:
            return hidden(row, standing.notes.get(key[1:], ""))
        change = self.shelf.change(key)
        return replace(row, is_changed=bool(change), change=change) if change else row


@contextmanager
def _collector_paused() -> Iterator[None]:
    """Spare the collector's passes over thousands of new rows, none of which is garbage."""
    was_enabled = gc.isenabled()
    gc.disable()
    try:
        yield
    finally:
        if was_enabled:
            gc.enable()
