"""Which signal defines inspiration, and why."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

from unitclass.io.roles import DIAPHRAGM, OTHER_NERVE, POPULATION, role_of, tokens
from unitclass.records import Signal

# A phrenic is inspiration itself; a cervical root and the diaphragm carry the same command; the
# hypoglossal leads it a little. A vagus or an abdominal nerve never defines inspiration, and airflow
# and pressure only when the user names them. Common practice.
ORDER = ("phrenic", "cervical", "diaphragm", "hypoglossal", "muscle")
_REMARKS = {"cervical": "; no phrenic in the file", "diaphragm": "; no phrenic in the file",
            "hypoglossal": "; no phrenic in the file, and it may lead inspiration a little",
            "muscle": "; no phrenic, diaphragm or hypoglossal in the file"}
_SIDES = {"left": {"left", "l", "lt"}, "right": {"right", "r", "rt"}}
_FORM_WORDS = frozenset(
    ("raw", "int", "integrated", "integ", "rect", "rectified", "filtered", "filt", "smooth", "smoothed", "env",
     "envelope", "rms", "ma", "moving", "average", "nerve", "activity", "signal", "neurogram", "recording",
     "discharge", "ch", "channel", "hz", "khz", "ms", "bp", "proc", "processed", "and"))


@dataclass(frozen=True)
class Choice:
    """The reference's name and the reason; the name is empty when nothing, or too much, fits."""

    name: str
    reason: str


@dataclass(frozen=True)
class Lost:
    """A signal that the file names but that cannot be read, and why."""

    name: str
    problem: str


def choose_reference(nerves: Sequence[Signal], asked: str, remembered: str, *, strengths: Mapping[str, int] | None = None,
                     lost: Sequence[Lost] = ()) -> Choice:
    """Return the reference nerve.

    Parameters
    ----------
    nerves : sequence of Signal
    asked : str
        Name from the command line; must exist.
    remembered : str
        Name from the settings of the rig; used where it exists.
    strengths : Mapping, optional
        Signal name to how well its role is grounded (see `roles.Guess`), to tell equals apart.
    lost : sequence of Lost
        Signals that could not be read: another nerve does not silently stand in for a better one.
    """
    if asked:
        return _asked(nerves, asked, lost)
    kept = named_signal(nerves, remembered) if remembered else None
    if kept is not None:
        return Choice(kept.name, "named in the settings (rig.nerve)")
    choice = _guessed(nerves, strengths or {}, lost)
    unmet = f"; the settings' rig.nerve {remembered!r} is not in this file" if remembered else ""
    return Choice(choice.name, choice.reason + unmet)


def named_signal(nerves: Sequence[Signal], name: str) -> Signal | None:
    """Return the signal a user means: by name, location, series or column, the case of letters apart."""
    ways = (lambda s: s.name == name or s.location == name,
            lambda s: s.name.lower() == name.lower(),
            lambda s: name.lower() in (part.lower() for part in s.name.split("/")),
            lambda s: name.lower() == f"{s.name.split('/')[0]}/{_column(s)}".lower(),
            lambda s: s.role == name.lower())
    for way in ways:
        hits = [s for s in nerves if way(s)]
        if len(hits) == 1:
            return hits[0]
        if hits:
            return next((s for s in nerves if s.name == _best(hits, {}).name), None)
    return None


def _column(signal: Signal) -> int:
    """Return the number of the column a signal is read from, -1 when it is no column of one series."""
    return int(getattr(getattr(signal.reader, "source", None), "column", -1))


def _asked(nerves: Sequence[Signal], asked: str, lost: Sequence[Lost]) -> Choice:
    signal = named_signal(nerves, asked)
    if signal is not None:
        return Choice(signal.name, "named with --nerve")
    gone = next((entry for entry in lost if entry.name.lower() == asked.lower()), None)
    return Choice("", f"{gone.name} {gone.problem}" if gone else f"no nerve called {asked!r}")


def _guessed(nerves: Sequence[Signal], strengths: Mapping[str, int], lost: Sequence[Lost]) -> Choice:
    for place in ORDER:
        gone = next((entry for entry in lost if _place(*_role_of_name(entry.name)) == place), None)
        candidates = [s for s in nerves if _place(s.role, s.reason) == place]
        if candidates:
            choice = _best(candidates, strengths)
            return Choice(choice.name, choice.reason + (_REMARKS.get(place, "") if choice.name else ""))
        if gone is not None:
            return Choice("", f"{gone.name} {gone.problem}")
    return _only_unknown(nerves)


def _place(role: str, reason: str) -> str:
    return DIAPHRAGM if role == "muscle" and DIAPHRAGM in reason else role


def _role_of_name(name: str) -> tuple[str, str]:
    guess = role_of(name, {}, "", "")
    return guess.role, guess.reason


def _best(candidates: Sequence[Signal], strengths: Mapping[str, int]) -> Choice:
    """Return the one candidate, or the best copy of one nerve; else say which there are.

    Raw before integrated, as acquired before processed, named before merely described, then the
    higher rate: but only among copies of one nerve, never between the left and the right.
    """
    if len(candidates) == 1:
        return Choice(candidates[0].name, candidates[0].reason)
    pool = list(candidates)
    if len({_side(s) for s in candidates} - {""}) < 2:
        for is_better in (lambda s: not s.is_integrated, lambda s: s.location.startswith("/acquisition"),
                          lambda s: strengths.get(s.name, 0) == max(strengths.get(c.name, 0) for c in candidates)):
            pool = [s for s in pool if is_better(s)] or pool
        if len(pool) > 1 and len({_identity(s) for s in pool}) == 1 and len({s.name for s in pool}) == len(pool):
            finest = max(s.rate_hz for s in pool)
            pool = sorted((s for s in pool if s.rate_hz == finest), key=lambda s: len(s.name))[:1]
    if len(pool) == 1:
        others = [s.name for s in candidates if s is not pool[0]]
        form = "integrated" if pool[0].is_integrated else "raw"
        return Choice(pool[0].name, f"{pool[0].reason}; {form}, and preferred to its other copies ({', '.join(others)})")
    return Choice("", "equally good nerves: " + " and ".join(s.name for s in pool))


def _side(signal: Signal) -> str:
    said = {t.lower() for t in (*tokens(signal.name), *tokens(signal.location), *tokens(signal.reason))}
    glued = {t[0].lower() for t in tokens(signal.name) if len(t) > 2 and role_of(t[1:], {}, "", "").role == signal.role
             and t[0] in "lrLR"}
    return next((side for side, words in _SIDES.items() if said & words or side[0] in glued), "")


def _identity(signal: Signal) -> frozenset[str]:
    """Return what is left of a name without the words of form: equal for copies of one nerve."""
    parts = [t for t in tokens(signal.name.rsplit("/", 1)[-1]) if len(tokens(t)) == 1]
    kept = {t.lower() for t in parts} - _FORM_WORDS
    return frozenset(t for t in kept if role_of(t, {}, "", "").role != signal.role)


def _only_unknown(nerves: Sequence[Signal]) -> Choice:
    unknown = [s for s in nerves if s.role == "unknown" and OTHER_NERVE not in s.reason and "measure" not in s.reason]
    population = [s for s in unknown if POPULATION in s.reason]
    pool = population or unknown
    if not pool:
        return Choice("", "no nerve was recognised")
    choice = _best(pool, {})
    if not choice.name:
        return Choice("", "no nerve was recognised")
    why = "population activity, the only rhythm there is" if population else "the only signal of its kind"
    return Choice(choice.name, f"{why}; nothing says which nerve it is")
