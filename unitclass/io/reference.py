"""Which signal defines inspiration, and why."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from unitclass.io.roles import OTHER_NERVE, POPULATION, tokens
from unitclass.records import Signal

# A phrenic is inspiration itself; a cervical root carries it; the hypoglossal leads it a little; the
# diaphragm follows it. Airflow and pressure only when the user names them. Common practice.
ORDER = ("phrenic", "cervical", "hypoglossal", "muscle")
_SIDES = {"left": {"left", "l", "lt"}, "right": {"right", "r", "rt"}}


@dataclass(frozen=True)
class Choice:
    """The reference's name and the reason; the name is empty when nothing, or too much, fits."""

    name: str
    reason: str


def choose_reference(nerves: Sequence[Signal], asked: str, remembered: str) -> Choice:
    """Return the reference nerve.

    Parameters
    ----------
    nerves : sequence of Signal
    asked : str
        Name from the command line; must exist.
    remembered : str
        Name from the settings of the rig; used where it exists.
    """
    if asked:
        return _named(nerves, asked)
    kept = next((s for s in nerves if s.name == remembered), None)
    if remembered and kept is not None:
        return Choice(kept.name, "named in the settings (rig.nerve)")
    for role in ORDER:
        candidates = [s for s in nerves if s.role == role]
        if candidates:
            return _best(candidates)
    return _only_unknown(nerves)


def _named(nerves: Sequence[Signal], asked: str) -> Choice:
    for signal in nerves:
        if signal.name == asked or signal.location == asked:
            return Choice(signal.name, "named with --nerve")
    loose = [s for s in nerves if s.name.lower() == asked.lower()]
    if len(loose) == 1:
        return Choice(loose[0].name, "named with --nerve")
    return Choice("", f"no nerve called {asked!r}")


def _best(candidates: Sequence[Signal]) -> Choice:
    """Return the one candidate, or the raw one of a raw and an integrated copy; else say which there are."""
    if len(candidates) == 1:
        return Choice(candidates[0].name, candidates[0].reason)
    if len({_side(s) for s in candidates}) == 1:
        raw = [s for s in candidates if not s.is_integrated]
        acquired = [s for s in raw if s.location.startswith("/acquisition")] or raw
        if len(acquired) == 1:
            return Choice(acquired[0].name, f"{acquired[0].reason}; raw, so preferred to its other copies")
        if not raw and len({s.location.rsplit("/", 1)[-1] for s in candidates}) == len(candidates):
            finest = sorted(candidates, key=lambda s: -s.rate_hz)
            if finest[0].rate_hz > finest[1].rate_hz:
                return Choice(finest[0].name, f"{finest[0].reason}; the finest of {len(finest)} integrated copies")
    names = " and ".join(s.name for s in candidates)
    return Choice("", f"equally good nerves: {names}")


def _side(signal: Signal) -> str:
    said = {t.lower() for t in (*tokens(signal.name), *tokens(signal.location))}
    return next((side for side, words in _SIDES.items() if said & words), "")


def _only_unknown(nerves: Sequence[Signal]) -> Choice:
    unknown = [s for s in nerves if s.role == "unknown" and OTHER_NERVE not in s.reason]
    population = [s for s in unknown if POPULATION in s.reason]
    pool = population if len(population) == 1 else unknown
    if len(pool) == 1:
        why = "population activity, the only rhythm there is" if population else "the only signal of its kind"
        return Choice(pool[0].name, f"{why}; nothing says which nerve it is")
    return Choice("", "no nerve was recognised")
