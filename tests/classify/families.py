"""Small families with answers known by construction."""

from __future__ import annotations

from unitclass.classify.draws import Timing
from unitclass.classify.templates import Family, TypeLibrary

TIMING = Timing(ti_s=1.0, te_s=2.0)
EVERYWHERE = {"three-phase": 1.0, "two-phase": 1.0, "one-phase": 1.0}


def exact(type_id: str, points: list[tuple[float, float]]) -> Family:
    """Return a drawn family without any freedom: every draw is the same curve."""
    still = dict.fromkeys(("shift", "background", "wiggle", "foreign"), (0.0, 0.0))
    return Family(type_id, "drawn", {**still, "stretch": (1.0, 1.0)}, EVERYWHERE, points=tuple(points))


def in_and_ex() -> TypeLibrary:
    """Return two types: firing in inspiration and firing in expiration."""
    return TypeLibrary("two", (exact("in", [(0.0, 1.0), (0.95, 1.0), (1.05, 0.1), (1.95, 0.1)]),
                               exact("ex", [(0.0, 0.1), (0.95, 0.1), (1.05, 1.0), (1.95, 1.0)])))
