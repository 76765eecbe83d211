"""Review sessions over small known results."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import replace
from pathlib import Path

from tests.results import session_result, suggestion, unit_result
from unitclass.io.decisions import DecisionStore
from unitclass.records import SessionResult, UnitResult
from unitclass.review.session import ReviewSession

UNITS: Mapping[str, tuple[str, float]] = {
    "2": ("ramp-I", 0.99), "10": ("post-I", 0.60), "11": ("aug-E", 0.97), "20": ("silent", 0.0), "3": ("pre-I", 0.80)}


def unit_with(unit: str, kind: str, probability: float, condition: str = "baseline", **changes: object) -> UnitResult:
    """Return a unit whose suggestion has a probability of our choosing."""
    plain = unit_result(unit, kind, condition)
    if plain.suggestion.probabilities:
        plain = replace(plain, suggestion=suggestion(kind, plain.histogram, probability))
    return replace(plain, **changes)  # type: ignore[arg-type]


def result_with(path: str = "rig/a.nwb", units: Mapping[str, tuple[str, float]] = UNITS,
                conditions: tuple[str, ...] = ("baseline",), **changes: object) -> SessionResult:
    """Return a session with units of known type and probability; ids follow from the path."""
    plain = session_result(path, units={}, conditions=conditions)
    filled = tuple(replace(c, units=tuple(unit_with(u, kind, p, c.condition.name) for u, (kind, p) in units.items()))
                   for c in plain.conditions)
    ids = {"identifier": f"identifier of {path}", "object_id": f"object of {path}"}
    return replace(plain, conditions=filled, **(ids | changes))  # type: ignore[arg-type]


def changed_unit(result: SessionResult, unit: str, **changes: object) -> SessionResult:
    """Return the session with fields of one unit changed in every condition."""
    return replace(result, conditions=tuple(
        replace(c, units=tuple(replace(u, **changes) if u.unit == unit else u for u in c.units))
        for c in result.conditions))


def review(folder: Path, *results: SessionResult, reviewer: str = "anna", **options: object) -> ReviewSession:
    """Return a review of the results (one plain session if none) on the store in `folder`."""
    session = ReviewSession(DecisionStore(folder / "unitclass.sqlite"), reviewer, **options)  # type: ignore[arg-type]
    for result in results or (result_with(),):
        session.add_result(result)
    return session


def units(session: ReviewSession) -> list[str]:
    """Return the unit ids in view, in order."""
    return [entry.unit for entry in session.entries]


def row(session: ReviewSession, unit: str, condition: str = "baseline", path: str = "rig/a.nwb"):
    """Return the row of a unit as it is now."""
    return session.entry((path, unit, condition))
