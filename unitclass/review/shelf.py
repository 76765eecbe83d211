"""The results that the review looks at: sessions by path, and suggestions that replaced theirs."""

from __future__ import annotations

from collections import OrderedDict
from collections.abc import Mapping
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from unitclass.errors import UnitclassError
from unitclass.io.session_view import LightUnit, SessionView
from unitclass.records import ConditionResult, SessionResult, Suggestion, UnitResult
from unitclass.review.entry import EntryKey, QueueEntry
from unitclass.review.rows import change_in_words, suggested_anew

WAITING, READY, FAILED = "waiting", "ready", "failed"

_KEPT_UNITS = 64


@dataclass(frozen=True)
class FileState:
    """One input file: "waiting" for its analysis, "ready", or "failed" for `reason`."""

    path: str
    state: str
    reason: str = ""
    n_units: int = 0


class ResultShelf:
    """Sessions by path. Units are read when asked for, the last few kept."""

    def __init__(self) -> None:
        self._files: dict[str, FileState] = {}
        self._views: dict[str, SessionView] = {}
        self._light: dict[EntryKey, LightUnit] = {}
        self._replaced: dict[EntryKey, Suggestion] = {}
        self._changes: dict[EntryKey, str] = {}
        self._groups: dict[EntryKey, str] = {}
        self._units: OrderedDict[EntryKey, UnitResult] = OrderedDict()

    # ---------------------------------------------------------------------------- files

    def expect(self, path: str) -> None:
        """List a file whose analysis has not ended."""
        self._files[path] = FileState(path, WAITING)

    def fail(self, path: str, reason: str) -> None:
        """List a file that could not be analysed; results it had stay."""
        self._files[path] = FileState(path, FAILED, reason)

    def put(self, view: SessionView) -> tuple[EntryKey, ...]:
        """Take a session's results in, in place of older ones; return the keys that are gone."""
        path = view.head.path
        before = {key: unit for key, unit in self._light.items() if key[0] == path}
        after = {key: self._in_group(key, unit) for unit in view.units
                 for key in [(path, unit.unit, unit.condition)]}
        self._forget(before)
        self._views[path] = view
        self._light |= after
        for key in before.keys() & after.keys():
            self._note_change(key, before[key], after[key])
        self._files[path] = FileState(path, READY, n_units=len({unit.unit for unit in view.units}))
        return tuple(key for key in before if key not in after)

    def _forget(self, keys: Mapping[EntryKey, LightUnit]) -> None:
        for key in keys:
            for shelf in (self._light, self._replaced, self._units):
                shelf.pop(key, None)

    @property
    def files(self) -> tuple[FileState, ...]:
        """Return every file in the order in which it was named."""
        return tuple(self._files.values())

    @property
    def views(self) -> Mapping[str, SessionView]:
        """Return the sessions that are ready, by path."""
        return self._views

    # ---------------------------------------------------------------------- suggestions

    def replace_suggestion(self, key: EntryKey, suggestion: Suggestion) -> None:
        """Let `suggestion` stand for a unit from now on; what it was is kept in words."""
        before = self._light[key]
        after = suggested_anew(before, suggestion)
        self._light[key], self._replaced[key] = after, suggestion
        self._units.pop(key, None)
        self._note_change(key, before, after)

    @property
    def replaced(self) -> tuple[EntryKey, ...]:
        """Return the units for which another suggestion stands than the analysis's own."""
        return tuple(self._replaced)

    def restore_suggestion(self, key: EntryKey) -> None:
        """Let the analysis's own suggestion stand again."""
        self.replace_suggestion(key, self.own_suggestion(key))
        del self._replaced[key]

    def own_suggestion(self, key: EntryKey) -> Suggestion:
        """Return what the analysis itself suggests."""
        return self._views[key[0]].unit_result(key[1], key[2]).suggestion

    def _note_change(self, key: EntryKey, before: LightUnit, after: LightUnit) -> None:
        words = change_in_words(before, after)
        if words:
            self._changes[key] = words

    def seen(self, key: EntryKey) -> bool:
        """Take the mark of a changed suggestion away; return whether there was one."""
        return self._changes.pop(key, None) is not None

    def change(self, key: EntryKey) -> str:
        """Return what the suggestion was before it changed; empty when it did not."""
        return self._changes.get(key, "")

    def light(self, key: EntryKey) -> LightUnit:
        """Return the light unit under a key, with the suggestion in force."""
        return self._light[key]

    def keys(self, path: str) -> tuple[EntryKey, ...]:
        """Return the keys of a session, in the order of its results."""
        return tuple((path, unit.unit, unit.condition) for unit in self._views[path].units)

    # --------------------------------------------------------------------- shape groups

    def group(self, groups: Mapping[EntryKey, str]) -> None:
        """Let these be the shape groups of all units; a unit not in it has none."""
        self._groups = dict(groups)
        self._units.clear()
        self._light = {key: self._in_group(key, unit) for key, unit in self._light.items()}

    def _in_group(self, key: EntryKey, unit: LightUnit) -> LightUnit:
        return replace(unit, shape_group=self._groups.get(key, unit.shape_group))

    # -------------------------------------------------------------------------- results

    def unit_result(self, key: EntryKey) -> UnitResult:
        """Return all about a unit, with the suggestion in force."""
        if key not in self._units:
            unit = replace(self._views[key[0]].unit_result(key[1], key[2]), shape_group=self._light[key].shape_group)
            if key in self._replaced:
                unit = replace(unit, suggestion=self._replaced[key])
            self._units[key] = unit
            if len(self._units) > _KEPT_UNITS:
                self._units.popitem(last=False)
        self._units.move_to_end(key)
        return self._units[key]

    def condition_result(self, path: str, condition: str, with_envelopes: bool) -> ConditionResult:
        """Return a condition without its units."""
        return self._views[path].condition_result(condition, with_envelopes=with_envelopes)

    def session_result(self, path: str) -> SessionResult:
        """Return everything about a session, with the analysis's own suggestions.

        What labels taught is of this review; an export holds what anybody gets from the same file.

        Raises
        ------
        UnitclassError
            If the file is not ready.
        """
        if path not in self._views:
            raise UnitclassError("has no results yet", where=path, remedy="wait for its analysis")
        return self._views[path].session_result()

    def rates_hz(self, rows: tuple[QueueEntry, ...]) -> NDArray[np.float32]:
        """Return rates by phase, shape (n_rows, n_bins); NaN where nothing was observed."""
        tables = {path: self._views[path].rates_hz() for path in {row.path for row in rows}}
        places = {key: i for path in tables for i, key in enumerate(self.keys(path))}
        n_bins = max((table.shape[1] for table in tables.values()), default=0)
        rates = np.full((len(rows), n_bins), np.nan, dtype=np.float32)
        for i, row in enumerate(rows):
            table = tables[row.path]
            rates[i, : table.shape[1]] = table[places[row.key]]
        return rates
