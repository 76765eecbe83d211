"""The order of the queue: most informative first, then the sure ones; or by what the user names."""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping

from unitclass.review.entry import STATES, QueueEntry, natural

Rank = tuple[object, ...]

INFORMATIVE = "informative"

_UNCERTAIN, _CONTRADICTED, _STATE, _SURE = range(4)


def rank(entry: QueueEntry, by: str, sure_probability: float) -> Rank:
    """Return the sort key of an entry. Raises KeyError for an unknown `by`."""
    if by == INFORMATIVE:
        return (*informative_rank(entry, sure_probability), *_place(entry))
    return (*SORTS[by](entry), *_place(entry))


def informative_rank(entry: QueueEntry, sure_probability: float) -> Rank:
    """Rank by what a look at the unit would teach.

    Uncertain suggestions first, the smallest margin over the second type at the front; then the
    sure ones that something speaks against; then units with too few spikes; at the end the sure
    ones, type by type, to be accepted as a batch. Hidden suggestions keep the order of the file,
    which tells nothing.
    """
    if entry.is_hidden:
        return (_UNCERTAIN, 0.0)
    if entry.suggested_type in STATES:
        return (_STATE, entry.suggested_type)
    if not entry.probability >= sure_probability:
        return (_UNCERTAIN, margin(entry))
    if entry.flags or entry.label_flags:
        return (_CONTRADICTED, entry.probability)
    return (_SURE, entry.suggested_type, -entry.probability)


def margin(entry: QueueEntry) -> float:
    """Return by how much the suggested type leads the second one; 0 when unknown."""
    first = 0.0 if math.isnan(entry.probability) else entry.probability
    second = 0.0 if math.isnan(entry.second_probability) else entry.second_probability
    return first - second


def _by_probability(entry: QueueEntry) -> Rank:
    return (math.inf if math.isnan(entry.probability) else entry.probability,)


def _place(entry: QueueEntry) -> Rank:
    return (natural(entry.path), natural(entry.unit), natural(entry.condition))


SORTS: Mapping[str, Callable[[QueueEntry], Rank]] = {
    "type": lambda e: (e.own_type or e.suggested_type, -math.inf if math.isnan(e.probability) else -e.probability),
    "probability": _by_probability,
    "file": lambda e: (natural(e.path),),
    "condition": lambda e: (natural(e.condition),),
    "region": lambda e: (natural(e.region),),
    "shape group": lambda e: (natural(e.shape_group),),
    "unit": lambda e: (natural(e.unit),),
    "reviewed": lambda e: (e.is_reviewed, e.is_later),
}
"""Name of a sort to its key; INFORMATIVE is one more."""
