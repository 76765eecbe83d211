"""Recordings that stop and start again: the pieces of one nerve, joined in time with their gaps."""

from __future__ import annotations

import re
from collections.abc import Iterable, Sequence
from dataclasses import replace
from itertools import pairwise

from unitclass.io.chunk_readers import JoinedChunks
from unitclass.records import Signal

_NUMBERED = re.compile(r"[ _.-]*(?:sweep|seg|segment|part|run|block|epoch|trial|file|rec|recording|no)?[ _.-]*\d+$", re.I)


def joined_sweeps(signals: Sequence[Signal]) -> tuple[Signal, ...]:
    """Return the signals with consecutive pieces of one nerve joined, the others as they are.

    Pieces have one name but for a number at its end (or the same name in different groups), the
    same unit, rate and form, and do not overlap in time: PN1 and PN2 recorded together stay two nerves.
    """
    groups: dict[tuple[object, ...], list[Signal]] = {}
    for signal in signals:
        groups.setdefault(_kin(signal), []).append(signal)
    taken = {s.name for s in signals}
    found = [_joined(group, taken) if len(group) > 1 and _follow_each_other(group) else group for group in groups.values()]
    return tuple(signal for group in found for signal in group)


def uniquely_named(signals: Iterable[Signal]) -> tuple[Signal, ...]:
    """Return the signals with the group in front of a name that was used before."""
    found: dict[str, Signal] = {}
    for signal in signals:
        name, parents = signal.name, signal.location.split("/")[1:-1]
        while name in found and parents:
            name = f"{parents.pop()}/{name}"
        n = 2
        while name in found:
            name, n = f"{signal.name} ({n})", n + 1
        found[name] = replace(signal, name=name)
    return tuple(found.values())


def stem(name: str) -> str:
    """Return a signal's name without the number of its sweep: "PNA_003" is "PNA", "PNA_1/left" "PNA/left"."""
    series, slash, column = name.partition("/")
    return (_NUMBERED.sub("", series) or series) + slash + column


def _kin(signal: Signal) -> tuple[object, ...]:
    return (stem(signal.name), signal.role, signal.unit, round(signal.rate_hz, 3), signal.is_integrated)


def _follow_each_other(group: list[Signal]) -> bool:
    ordered = sorted(group, key=lambda s: s.start_s)
    half = 0.5 / ordered[0].rate_hz
    return all(a.stop_s <= b.start_s + half for a, b in pairwise(ordered))


def _joined(group: list[Signal], taken: set[str]) -> list[Signal]:
    ordered = sorted(group, key=lambda s: s.start_s)
    first = ordered[0]
    name = stem(first.name)
    if name in taken and name not in {s.name for s in group}:
        name = first.name
    return [replace(first, name=name, stop_s=ordered[-1].stop_s, reader=JoinedChunks(tuple(s.reader for s in ordered)),
                    reason=f"{first.reason}; {len(ordered)} pieces joined in time")]
