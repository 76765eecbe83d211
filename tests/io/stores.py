"""Decisions to fill a store with, for its tests."""

from __future__ import annotations

from dataclasses import replace

from unitclass.io.store_records import UnitRef
from unitclass.records import Decision

IDENTIFIER, OBJECT_ID = "heron-04-identifier", "0b7e7f0e-3b51-4c38-9a3c-6d2f4d6d1a11"
DIGESTS = {"3": "digest-3", "7": "digest-7", "12": "digest-12"}


def decision(type_id: str = "ramp-I", unit: str = "3", reviewer: str = "anna", **changes: object) -> Decision:
    """Return a decision on a unit of DIGESTS in the condition "baseline"."""
    plain = Decision(IDENTIFIER, OBJECT_ID, unit, f"digest-{unit}", "baseline", type_id, reviewer,
                     "2026-03-01T10:00:00.000+00:00", suggested_type="ramp-I", suggested_probability=0.9,
                     settings_digest="s", template_digest="t")
    return replace(plain, **changes)  # type: ignore[arg-type]


def ref(unit: str = "3", condition: str = "baseline", digest: str = "") -> UnitRef:
    """Return how the store knows a unit of DIGESTS."""
    return UnitRef(IDENTIFIER, OBJECT_ID, unit, digest or f"digest-{unit}", condition)
