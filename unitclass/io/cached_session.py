"""A session view over the result cache: each unit is read when it is asked for."""

from __future__ import annotations

import sqlite3
import threading
from dataclasses import replace
from functools import cached_property
from typing import Any

import numpy as np
from numpy.typing import NDArray

from unitclass.errors import FileError
from unitclass.io import cached_pieces
from unitclass.io.session_view import LightUnit
from unitclass.io.store_text import storable
from unitclass.records import ConditionResult, SessionResult, UnitResult


class CachedSession:
    """Results of one session in the cache; see `session_view.SessionView`.

    Any method raises FileError when the cache has been damaged or dropped meanwhile; the session
    must then be analysed again.
    """

    def __init__(self, db: sqlite3.Connection, lock: threading.RLock, number: int, path: str) -> None:
        self._db = db
        self._lock = lock
        self._number = number
        self._path = path
        self.head = cached_pieces.head_from(self._content(cached_pieces.HEAD), path)

    @cached_property
    def units(self) -> tuple[LightUnit, ...]:
        """Return the light list, in the order of the results."""
        return cached_pieces.light_from(self._content(cached_pieces.LIGHT))

    def unit_result(self, unit: str, condition: str) -> UnitResult:
        """Return all about a unit; raises KeyError for an unknown one."""
        found: UnitResult = self._piece(cached_pieces.UNIT, unit, condition)
        return found

    def condition_result(self, condition: str, *, with_envelopes: bool = True) -> ConditionResult:
        """Return a condition without its units; raises KeyError for an unknown one."""
        found: ConditionResult = self._piece(cached_pieces.CONDITION, "", condition)
        if not with_envelopes:
            return found
        envelopes = self._piece(cached_pieces.ENVELOPES, "", condition)
        return replace(found, nerve_cycles=replace(found.nerve_cycles, envelopes=envelopes))

    def session_result(self) -> SessionResult:
        """Return everything."""
        result: SessionResult = self._piece(cached_pieces.SESSION)
        names = dict.fromkeys([*self._names(cached_pieces.CONDITION)])
        conditions = tuple(self._whole_condition(name) for name in names)
        return replace(result, path=self._path, conditions=conditions)

    def rates_hz(self) -> NDArray[np.float32]:
        """Return the rates by phase of all units, shape (n_units, n_bins)."""
        rates: NDArray[np.float32] = self._piece(cached_pieces.RATES)
        return rates

    def _whole_condition(self, name: str) -> ConditionResult:
        units = tuple(self.unit_result(u.unit, u.condition) for u in self.units if storable(u.condition) == name)
        return replace(self.condition_result(name), units=units)

    def _names(self, kind: str) -> list[str]:
        with self._lock:
            rows = self._db.execute("SELECT condition FROM pieces WHERE session = ? AND kind = ? ORDER BY id",
                                    (self._number, kind)).fetchall()
        return [row[0] for row in rows]

    def _piece(self, kind: str, unit: str = "", condition: str = "") -> Any:
        try:
            return cached_pieces.unpacked(self._content(kind, unit, condition))
        except ValueError as error:
            raise self._gone(error) from error

    def _content(self, kind: str, unit: str = "", condition: str = "") -> bytes:
        try:
            with self._lock:
                row = self._db.execute("SELECT content FROM pieces WHERE session = ? AND kind = ? AND unit = ?"
                                       " AND condition = ?", (self._number, kind, storable(unit),
                                                              storable(condition))).fetchone()
        except sqlite3.Error as error:
            raise self._gone(error) from error
        if row is None:
            raise self._missing(unit, condition)
        content: bytes = row[0]
        return content

    def _missing(self, unit: str, condition: str) -> Exception:
        with self._lock:
            is_there = self._db.execute("SELECT 1 FROM pieces WHERE session = ? LIMIT 1", (self._number,)).fetchone()
        return KeyError((unit, condition)) if is_there and (unit or condition) else self._gone(None)

    def _gone(self, error: Exception | None) -> FileError:
        return FileError("its kept results are gone or damaged" + (f" ({error})" if error else ""),
                         where=self._path, remedy="open it again to analyse it anew")
