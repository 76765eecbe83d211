"""One row of the queue: a unit in a condition, what is suggested and what was decided."""

from __future__ import annotations

import math
import re
from collections.abc import Mapping
from dataclasses import dataclass, field
from functools import lru_cache
from pathlib import PurePath

from unitclass.io.store_records import ASKS_AGAIN, BATCH, DISAGREEMENT, STALE
from unitclass.records import SILENT, UNDETERMINED, Label

EntryKey = tuple[str, str, str]
"""(path, unit, condition)."""

STATES = (SILENT, UNDETERMINED)


@dataclass(frozen=True)
class QueueEntry:
    """A unit in a condition as the reviewer may see it. All text may come from files.

    Attributes
    ----------
    suggested_type, ranked
        Empty while `is_hidden` (blind mode, before the reviewer's own label).
    own_type, own_how, own_at
        What this reviewer decided last on the present spike train; empty until then.
    label
        What stands after all opinions are weighed; None while nobody said anything (or hidden).
    note
        This reviewer's own note, or the standing one.
    is_changed, change
        The suggestion is no longer the one shown before; `change` says in words what it was.
    """

    path: str
    session: str
    animal: str
    identifier: str
    object_id: str
    unit: str
    condition: str
    digest: str
    suggested_type: str
    ranked: tuple[tuple[str, float], ...]
    n_cycles: int
    n_spikes: int
    regime: str
    shape_group: str
    flags: tuple[str, ...]
    columns: Mapping[str, str] = field(default_factory=dict)
    settings_digest: str = ""
    template_digest: str = ""
    own_type: str = ""
    own_how: str = ""
    own_at: str = ""
    label: Label | None = None
    note: str = ""
    is_later: bool = False
    is_changed: bool = False
    change: str = ""
    is_hidden: bool = False

    @property
    def key(self) -> EntryKey:
        """Return (path, unit, condition)."""
        return self.path, self.unit, self.condition

    @property
    def file(self) -> str:
        """Return the file's name without its folder."""
        return PurePath(self.path).name

    @property
    def region(self) -> str:
        """Return what the source's columns say of the place, or nothing."""
        return region_of(self.columns)

    @property
    def probability(self) -> float:
        """Return the posterior of the suggested type; NaN for a state or while hidden."""
        return dict(self.ranked).get(self.suggested_type, math.nan)

    @property
    def second_type(self) -> str:
        """Return the most probable type besides the suggested one."""
        return self._second[0]

    @property
    def second_probability(self) -> float:
        """Return the posterior of `second_type`; NaN when there is none."""
        return self._second[1]

    @property
    def _second(self) -> tuple[str, float]:
        others = (pair for pair in self.ranked if pair[0] != self.suggested_type)
        return next(others, ("", math.nan))

    @property
    def is_reviewed(self) -> bool:
        """Return whether this reviewer has decided on the present spike train."""
        return bool(self.own_type)

    @property
    def is_labelled(self) -> bool:
        """Return whether anybody's label stands."""
        return self.label is not None and bool(self.label.type)

    @property
    def label_flags(self) -> tuple[str, ...]:
        """Return "disagreement", "stale" or "asks again", where they hold."""
        return self.label.flags if self.label is not None else ()

    @property
    def all_flags(self) -> tuple[str, ...]:
        """Return the flags of the analysis and of the label."""
        return self.label_flags + self.flags

    @property
    def was_looked_at(self) -> bool:
        """Return whether the reviewer's own decision was more than a batch acceptance."""
        return self.is_reviewed and self.own_how != BATCH

    @property
    def state(self) -> str:
        """Return one word or two for the queue.

        "disagreement", "asks again", "stale", "reviewed", "later", "labelled" (by another
        reviewer only) or "open".
        """
        for flag in (DISAGREEMENT, ASKS_AGAIN, STALE):
            if flag in self.label_flags:
                return flag
        if self.is_reviewed:
            return "reviewed"
        if self.is_later:
            return "later"
        return "labelled" if self.is_labelled else "open"


def region_of(columns: Mapping[str, str]) -> str:
    """Return the value of the first column whose name speaks of a place in the brain."""
    for wanted in ("region", "location", "area", "nucleus", "structure"):
        for name, value in columns.items():
            if wanted in name.lower() and str(value):
                return str(value)
    return ""


def flag_kind(flag: str) -> str:
    """Return a flag without its numbers, so that "few cycles (12)" is one kind with "few cycles (9)"."""
    bare = re.sub(r"\([^)]*\)|[-+−]?[0-9]+([.,][0-9]+)?( ?%)?", " ", flag)
    return " ".join(bare.split()).strip(" :,;").removeprefix("of ").removesuffix(" by")


@lru_cache(maxsize=1 << 16)
def natural(text: str) -> tuple[tuple[int, int, str], ...]:
    """Return a sort key under which unit 9 comes before unit 12."""
    pieces = re.findall(r"[0-9]+|[^0-9]+", text)
    return tuple(_number_key(p) if p[0] in "0123456789" else (1, 0, p.lower()) for p in pieces)


def _number_key(digits: str) -> tuple[int, int, str]:
    # Length, then digits: the order of the numbers, without making one of a thousand digits.
    bare = digits.lstrip("0")
    return (0, len(bare), bare)
