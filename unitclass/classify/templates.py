"""Template families: what a firing type may look like, as ranges and not as one curve.

A family file (TOML, read by `io.template_files`) becomes a `Family`; all families in force are
a `TypeLibrary`. Firing types are strings from these files, never an enum in code.
"""

from __future__ import annotations

import hashlib
from collections.abc import Mapping
from dataclasses import dataclass, field, replace
from typing import Any

from unitclass.errors import UsageError
from unitclass.records import REGIMES

Range = tuple[float, float]

# What each form assumes of a parameter that its file does not give. Phases are canonical and may
# leave [0, 2) so that a range can straddle an edge; levels are shares of the peak rate.
COMMON: Mapping[str, Range] = {
    "background": (0.0, 0.35), "edge_ms": (10.0, 60.0), "wiggle": (0.0, 0.2), "foreign": (0.0, 0.15), "foot": (0.0, 0.0),
    "foot_onset": (-0.2, -0.05),
    "curve_up": (0.6, 2.0), "curve_down": (0.6, 2.5),
}
FORMS: Mapping[str, Mapping[str, Range]] = {
    "augmenting": {"start_level": (0.0, 0.5), "end_level": (0.6, 1.0)},
    "decrementing": {"start_level": (0.6, 1.0), "end_level": (0.0, 0.3)},
    "plateau": {"start_level": (0.7, 1.0), "end_level": (0.7, 1.0), "curve_up": (0.5, 1.0),
                "curve_down": (0.5, 1.0)},
    "spanning": {"start_level": (0.0, 0.6), "end_level": (0.0, 0.6)},
    "two humps": {"start_level": (0.5, 1.0), "end_level": (0.0, 0.3), "first_level": (0.3, 1.0), "second_level": (0.3, 1.0),
                  "dip": (0.0, 0.3), "second_start": (0.0, 0.5)},
    "cosine": {"depth": (0.2, 0.8), "at": (0.0, 2.0), "step": (0.0, 1.0), "harmonic": (0.0, 0.3),
               "span": (0.2, 1.0), "lean": (-1.0, 1.0)},
    "flat": {"depth": (0.0, 0.12), "at": (0.0, 2.0), "wiggle": (0.0, 0.05)},
    "drawn": {"shift": (-0.05, 0.05), "stretch": (0.85, 1.15)},
}
NEEDED: Mapping[str, tuple[str, ...]] = {
    "augmenting": ("onset", "peak", "offset"), "decrementing": ("onset", "peak", "offset"),
    "plateau": ("onset", "peak", "offset"), "spanning": ("onset", "peak", "offset"),
    "two humps": ("onset", "peak", "offset", "second_onset", "second_offset"),
    "cosine": (), "flat": (), "drawn": (),
}
MEMBRANE_PHASES = ("early I", "late I", "post-I", "E2")


@dataclass(frozen=True)
class Family:
    """One firing type as a family of profiles.

    Attributes
    ----------
    id : str
        The type's id, as every table prints it.
    form : str
        One of FORMS.
    ranges : Mapping
        Parameter to (low, high); canonical phase, share of the peak rate, or pure number. A name
        ending in `_ms` gives the same parameter in time from the nearest transition; where both
        are given half the draws use each.
    prior : Mapping
        Regime to prior weight; a missing regime has weight 0.02: unlikely, never forbidden.
    membrane : Mapping
        Phase of MEMBRANE_PHASES to the expected sign of the membrane potential, -1, 0 or +1.
    points : tuple of (phase, level)
        The curve of a "drawn" family.
    """

    id: str
    form: str
    ranges: Mapping[str, Range]
    prior: Mapping[str, float]
    words: str = ""
    also: tuple[str, ...] = ()
    membrane: Mapping[str, int] = field(default_factory=dict)
    sources: tuple[str, ...] = ()
    points: tuple[tuple[float, float], ...] = ()

    def range(self, name: str) -> Range:
        """Return the range of a parameter, the form's own where the file gives none."""
        for source in (self.ranges, FORMS[self.form], COMMON):
            if name in source:
                return source[name]
        raise KeyError(name)

    def prior_in(self, regime: str) -> float:
        """Return the prior weight in a regime."""
        return float(self.prior.get(regime, 0.02))


@dataclass(frozen=True)
class TypeLibrary:
    """All families in force, in the order in which tables list types."""

    name: str
    families: tuple[Family, ...]

    def __post_init__(self) -> None:
        ids = [family.id for family in self.families]
        twice = {i for i in ids if ids.count(i) > 1}
        if twice:
            raise UsageError(f"type {sorted(twice)[0]!r} is defined twice", where=self.name,
                             remedy="keep one file per type")

    def family(self, type_id: str) -> Family:
        """Return the family of a type; raises KeyError when there is none."""
        for family in self.families:
            if family.id == type_id:
                return family
        raise KeyError(type_id)

    def with_family(self, family: Family) -> TypeLibrary:
        """Return the library with `family` added, or put in place of its namesake."""
        kept = [family if old.id == family.id else old for old in self.families]
        if family.id not in {old.id for old in self.families}:
            kept.append(family)
        return replace(self, families=tuple(kept))

    def digest(self) -> str:
        """Return a short digest of everything that changes results."""
        shown = [(f.id, f.form, sorted(f.ranges.items()), sorted(f.prior.items()),
                  sorted(f.membrane.items()), f.points) for f in self.families]
        return hashlib.sha256(repr(shown).encode()).hexdigest()[:12]


def family_from_mapping(given: Mapping[str, Any], *, where: str) -> Family:
    """Return the family a template file describes.

    Raises
    ------
    UsageError
        When a key is missing, unknown, or of the wrong kind; the message names file and key.
    """
    known = {"id", "form", "ranges", "prior", "words", "also", "membrane", "sources", "points"}
    for key in given:
        if key not in known:
            raise UsageError(f"unknown key {key!r}", where=where, remedy="use " + ", ".join(sorted(known)))
    type_id, form = str(given.get("id", "")), str(given.get("form", ""))
    if not type_id:
        raise UsageError("no id", where=where, remedy='add id = "..."')
    if form not in FORMS:
        raise UsageError(f"form {form!r} is unknown", where=where, remedy="use one of " + ", ".join(FORMS))
    return Family(id=type_id, form=form, ranges=_checked_ranges(given.get("ranges", {}), form, where),
                  prior=_checked_prior(given.get("prior", {}), where), words=str(given.get("words", "")),
                  also=tuple(given.get("also", ())), membrane=_checked_membrane(given.get("membrane", {}), where),
                  sources=tuple(given.get("sources", ())), points=_checked_points(given, form, where))


def _checked_ranges(given: Mapping[str, Any], form: str, where: str) -> dict[str, Range]:
    allowed = {*COMMON, *FORMS[form], *NEEDED[form]}
    ranges = {}
    for name, value in given.items():
        if name not in allowed and name.removesuffix("_ms") not in allowed:
            raise UsageError(f"range {name!r} means nothing to the form {form!r}", where=where,
                             remedy="use " + ", ".join(sorted(allowed)))
        if not (isinstance(value, list) and len(value) == 2 and value[0] <= value[1]):
            raise UsageError(f"range {name} = {value!r} is not [low, high]", where=where,
                             remedy="give two numbers, the lower first")
        ranges[name] = (float(value[0]), float(value[1]))
    for name in NEEDED[form]:
        if name not in ranges and f"{name}_ms" not in ranges:
            raise UsageError(f"the form {form!r} needs a range {name!r}", where=where,
                             remedy=f"add {name} = [low, high] under [ranges]")
    return ranges


def _checked_prior(given: Mapping[str, Any], where: str) -> dict[str, float]:
    for regime, weight in given.items():
        if regime not in REGIMES:
            raise UsageError(f"regime {regime!r} is unknown", where=where, remedy="use " + ", ".join(REGIMES))
        if not (isinstance(weight, int | float) and weight >= 0):
            raise UsageError(f"prior of {regime} = {weight!r} is not a weight", where=where,
                             remedy="give a number of 0 or more")
    return {regime: float(weight) for regime, weight in given.items()}


def _checked_membrane(given: Mapping[str, Any], where: str) -> dict[str, int]:
    for phase, sign in given.items():
        if phase not in MEMBRANE_PHASES or sign not in (-1, 0, 1):
            raise UsageError(f"membrane {phase!r} = {sign!r} is unknown", where=where,
                             remedy="give -1, 0 or 1 for " + ", ".join(MEMBRANE_PHASES))
    return {phase: int(sign) for phase, sign in given.items()}


def _checked_points(given: Mapping[str, Any], form: str, where: str) -> tuple[tuple[float, float], ...]:
    points = tuple((float(phase), float(level)) for phase, level in given.get("points", ()))
    if form == "drawn" and (len(points) < 3 or any(not 0 <= p <= 2 or v < 0 for p, v in points)):
        raise UsageError("a drawn family needs three or more points", where=where,
                         remedy="points = [[phase 0 to 2, level 0 or more], ...]")
    return points
