"""The queue: rows in an order that stays put, a filter, and a cursor that stays on its unit."""

from __future__ import annotations

from bisect import bisect_left
from collections.abc import Callable, Iterable, Iterator
from dataclasses import replace
from typing import Any

from unitclass.errors import UsageError
from unitclass.review.entry import EntryKey, QueueEntry, natural
from unitclass.review.filters import Filter, matches, values_of
from unitclass.review.ordering import INFORMATIVE, SORTS, Rank, rank


class ReviewQueue:
    """All rows by key, and the keys in view in their order.

    An entry's place is fixed when it arrives, and again only by `sort` or `show`: a decision or a
    new suggestion never moves a row. The cursor is on a key, so arrivals do not move it either.
    """

    def __init__(self, sure_probability: float) -> None:
        self._sure_probability = sure_probability
        self._rows: dict[EntryKey, QueueEntry] = {}
        self._ranks: dict[EntryKey, Rank] = {}
        self._view: list[EntryKey] = []
        self._seen: tuple[QueueEntry, ...] | None = None
        self._places: dict[EntryKey, int] = {}
        self._current: EntryKey | None = None
        self.sorted_by = INFORMATIVE
        self.is_reversed = False
        self.filter = Filter()

    # ---------------------------------------------------------------------------- rows

    def put(self, rows: Iterable[QueueEntry]) -> None:
        """Add rows, or replace those with the same key in their places."""
        new = []
        for row in rows:
            if row.key not in self._rows:
                self._ranks[row.key] = rank(row, self.sorted_by, self._sure_probability)
                new.append(row)
            self._rows[row.key] = row
        shows_all = self.filter.is_empty
        shown = [row.key for row in new if shows_all or self.filter.lets_through(row)]
        if shown:
            self._view = self._ordered([*self._view, *shown])
        self._settle_cursor()

    def drop(self, keys: Iterable[EntryKey]) -> None:
        """Remove rows; a cursor on one of them goes to the row that takes its place."""
        gone = set(keys) & set(self._rows)
        if not gone:
            return
        index = self.index
        for key in gone:
            del self._rows[key], self._ranks[key]
        self._view = [key for key in self._view if key in self._rows]
        if self._current not in self._rows and self._view:
            self._current = self._view[max(0, min(index, len(self._view) - 1))]
        self._settle_cursor()

    def row(self, key: EntryKey) -> QueueEntry:
        """Return a row, in view or not; raises KeyError."""
        return self._rows[key]

    def __contains__(self, key: EntryKey) -> bool:
        return key in self._rows

    def rows(self) -> Iterator[QueueEntry]:
        """Yield every row, in view or not, in no promised order."""
        yield from self._rows.values()

    @property
    def view(self) -> tuple[QueueEntry, ...]:
        """Return the rows in view, in order."""
        if self._seen is None:
            self._seen = tuple(self._rows[key] for key in self._view)
            self._places = {key: i for i, key in enumerate(self._view)}
        return self._seen

    # ------------------------------------------------------------------ order and filter

    def sort(self, by: str = INFORMATIVE, *, is_reversed: bool = False) -> None:
        """Order anew by one of SORTS or INFORMATIVE; raises UsageError for anything else."""
        if by != INFORMATIVE and by not in SORTS:
            raise UsageError(f"the queue cannot be sorted by {by!r}",
                             remedy="use one of " + ", ".join([INFORMATIVE, *SORTS]))
        self.sorted_by, self.is_reversed = by, is_reversed
        self._ranks = {key: rank(row, by, self._sure_probability) for key, row in self._rows.items()}
        self.show(self.filter)

    def show(self, chosen: Filter) -> None:
        """Show only what the filter lets through; the cursor stays if its row is among it.

        Otherwise it goes to the row that comes next in the order.
        """
        self.filter = chosen
        self._view = self._ordered(key for key, row in self._rows.items() if chosen.lets_through(row))
        self._settle_cursor()

    def choices(self, name: str) -> tuple[tuple[str, int], ...]:
        """Return the values under a tuple field of Filter, sorted, with the rows that choosing one would show."""
        counts: dict[str, int] = {}
        others: dict[str, Any] = {name: ()}
        rest = replace(self.filter, **others)
        for row in self._rows.values() if rest.is_empty else filter(rest.lets_through, self._rows.values()):
            for value in values_of(row, name)[:1] if name == "files" else values_of(row, name):
                if value:
                    counts[value] = counts.get(value, 0) + 1
        return tuple(sorted(counts.items(), key=lambda found: natural(found[0])))

    def _ordered(self, keys: Iterable[EntryKey]) -> list[EntryKey]:
        return sorted(keys, key=self._ranks.__getitem__, reverse=self.is_reversed)

    def _nearest(self, place: Rank) -> EntryKey:
        ranks = [self._ranks[key] for key in self._view]
        index = len(ranks) - bisect_left(ranks[::-1], place) if self.is_reversed else bisect_left(ranks, place)
        return self._view[min(index, len(ranks) - 1)]

    # -------------------------------------------------------------------------- cursor

    @property
    def current(self) -> QueueEntry | None:
        """Return the row under the cursor; None while nothing is in view."""
        return self._rows[self._current] if self._current is not None and self._view else None

    @property
    def index(self) -> int:
        """Return the cursor's place in view, from 0; -1 while nothing is in view."""
        current = self.current
        return self._places[current.key] if current is not None and self.view else -1

    def move(self, steps: int) -> QueueEntry | None:
        """Move the cursor, stopping at the ends of the queue."""
        return self.jump(self.index + steps)

    def jump(self, index: int) -> QueueEntry | None:
        """Put the cursor on a place in view; outside it, on the nearest end."""
        if self._view:
            self._current = self._view[max(0, min(index, len(self._view) - 1))]
        return self.current

    def go_to(self, key: EntryKey) -> QueueEntry | None:
        """Put the cursor on a row, bringing it into view if the filter hid it; raises KeyError."""
        if key not in self._rows:
            raise KeyError(key)
        if (self.view and key not in self._places) or not self._view:
            self._view = self._ordered([*self._view, key])
            self._seen = None
        self._current = key
        return self.current

    def find(self, text: str) -> QueueEntry | None:
        """Put the cursor on the next row that holds all words of `text`; None if there is none.

        Looks from the row after the cursor round to the cursor itself, a unit of exactly that
        name first.
        """
        exact = self._next(lambda row: row.unit.lower() == text.strip().lower())
        found = exact or self._next(lambda row: matches(row, text))
        if found is not None:
            self._current = found.key
        return found

    def next_open(self) -> QueueEntry | None:
        """Go to the next row without a decision, those put off last; None when none is left."""
        found = (self._next(lambda row: not row.is_reviewed and not row.is_later)
                 or self._next(lambda row: not row.is_reviewed))
        if found is not None:
            self._current = found.key
        return found

    def _next(self, wanted: Callable[[QueueEntry], bool]) -> QueueEntry | None:
        start = self.index + 1
        rows = self.view
        return next((row for row in (*rows[start:], *rows[:start]) if wanted(row)), None)

    def _settle_cursor(self) -> None:
        self._seen = None
        if not self._view:
            return
        if self._current not in self._rows:
            still_open = (row.key for row in self.view if not row.is_reviewed and not row.is_later)
            self._current = next(still_open, self._view[0])
        elif self.view and self._current not in self._places:
            self._current = self._nearest(self._ranks[self._current])
