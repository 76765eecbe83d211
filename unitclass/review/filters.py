"""Which entries of the queue are shown."""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping
from dataclasses import dataclass

from unitclass.review.entry import QueueEntry, flag_kind


@dataclass(frozen=True)
class Filter:
    """Conditions that an entry must meet, all of them; an empty one lets everything through.

    A tuple lets an entry through that has one of its values. `types` looks at the reviewer's
    own label where there is one, else at the suggestion. `low` and `high` bound the
    probability; a state such as "silent" has none and is let through only without bounds.
    `flags` are kinds of flags, without their numbers (see `flag_kind`).
    """

    types: tuple[str, ...] = ()
    files: tuple[str, ...] = ()
    conditions: tuple[str, ...] = ()
    regions: tuple[str, ...] = ()
    flags: tuple[str, ...] = ()
    shape_groups: tuple[str, ...] = ()
    states: tuple[str, ...] = ()
    is_reviewed: bool | None = None
    is_labelled: bool | None = None
    is_later: bool | None = None
    is_changed: bool | None = None
    low: float = 0.0
    high: float = 1.0
    text: str = ""

    def lets_through(self, entry: QueueEntry) -> bool:
        """Return whether the entry meets every condition."""
        return (all(not getattr(self, name) or _overlaps(getattr(self, name), values(entry))
                    for name, values in _VALUES.items())
                and all(getattr(self, name) in (None, getattr(entry, name)) for name in _YES_NO)
                and self._holds_probability(entry)
                and matches(entry, self.text))

    @property
    def is_empty(self) -> bool:
        """Return whether everything is let through."""
        return self == Filter()

    def _holds_probability(self, entry: QueueEntry) -> bool:
        if (self.low, self.high) == (0.0, 1.0):
            return True
        return not math.isnan(entry.probability) and self.low <= entry.probability <= self.high


_YES_NO = ("is_reviewed", "is_labelled", "is_later", "is_changed")

_VALUES: Mapping[str, Callable[[QueueEntry], tuple[str, ...]]] = {
    "types": lambda e: (e.own_type or e.suggested_type,),
    "files": lambda e: (e.path, e.file),
    "conditions": lambda e: (e.condition,),
    "regions": lambda e: (e.region,),
    "flags": lambda e: tuple(dict.fromkeys(map(flag_kind, e.all_flags))),
    "shape_groups": lambda e: (e.shape_group,),
    "states": lambda e: (e.state,),
}


def values_of(entry: QueueEntry, name: str) -> tuple[str, ...]:
    """Return the entry's values under a tuple field of Filter, e.g. "conditions"."""
    return _VALUES[name](entry)


def matches(entry: QueueEntry, text: str) -> bool:
    """Return whether every word of `text` is in the unit's name, file, condition or region."""
    if not text:
        return True
    told = f"{entry.unit} {entry.file} {entry.condition} {entry.region} {entry.session}".lower()
    return all(word in told for word in text.lower().split())


def _overlaps(wanted: tuple[str, ...], found: tuple[str, ...]) -> bool:
    return any(value in wanted for value in found)
