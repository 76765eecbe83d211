"""Conditions, animals and cells from a plain table, for files that hold none."""

from __future__ import annotations

import math
import os
from collections.abc import Mapping
from dataclasses import dataclass

from unitclass.errors import UsageError
from unitclass.io.plain_tables import PlainRow, PlainTable, read_plain_table

COLUMNS = ("file", "start_s", "stop_s", "condition", "animal", "cell")
NEEDED = ("file", "condition")


@dataclass(frozen=True)
class ConditionRow:
    """One line of the table; NaN times mean "from the start" and "to the end"."""

    file: str
    start_s: float
    stop_s: float
    condition: str
    animal: str = ""
    cell: str = ""


@dataclass(frozen=True)
class ConditionTable:
    """The whole table and where it came from."""

    path: str
    rows: tuple[ConditionRow, ...]

    def rows_for(self, path: str) -> tuple[ConditionRow, ...]:
        """Return the rows of one file: matched by its path, the end of its path, or its name (.nwb or not)."""
        for is_same in (_is_same_file, _is_end_of_path, _is_same_name):
            rows = tuple(row for row in self.rows if is_same(row.file, path))
            if rows:
                return rows
        return ()


def read_condition_table(path: str) -> ConditionTable:
    """Return the table in a CSV file with the columns `COLUMNS`; only file and condition must be there.

    Commas, semicolons and tabs part columns; with the latter two a decimal comma is understood.
    Without times a row means the whole session.

    Raises
    ------
    UsageError
        When it cannot be read, lacks a column, or a time is not a number; the line is named.
    """
    table = read_plain_table(path, NEEDED, remedy="the columns are " + ", ".join(COLUMNS))
    return ConditionTable(path, tuple(_row(row, table) for row in table.rows))


def _row(row: PlainRow, table: PlainTable) -> ConditionRow:
    words = {name: row.cells.get(name, "").strip() for name in COLUMNS}
    start_s, stop_s = (_time(words, name, row.where, table) for name in ("start_s", "stop_s"))
    if stop_s <= start_s:
        raise UsageError(f"stop_s {stop_s:g} is not after start_s {start_s:g}", where=row.where, remedy="swap or mend them")
    if not words["file"]:
        raise UsageError("names no file", where=row.where, remedy="fill the column 'file'")
    return ConditionRow(words["file"], start_s, stop_s, words["condition"], words["animal"], words["cell"])


def _time(words: Mapping[str, str], name: str, where: str, table: PlainTable) -> float:
    said = words[name]
    try:
        value = float(table.point(said)) if said else math.nan
    except ValueError:
        raise UsageError(f"{name} = {said!r} is not a number of seconds", where=where, remedy="give seconds") from None
    if math.isinf(value):
        raise UsageError(f"{name} = {said!r} is not a number of seconds", where=where, remedy="leave it empty instead")
    return value


def _is_same_file(given: str, path: str) -> bool:
    return os.path.realpath(given) == os.path.realpath(path)


def _is_end_of_path(given: str, path: str) -> bool:
    end = _slashed(given).removeprefix("./")
    return "/" in end and f"/{_slashed(path)}".endswith(f"/{end}")


def _is_same_name(given: str, path: str) -> bool:
    return _stem(given).lower() == _stem(path).lower()


def _slashed(path: str) -> str:
    return path.replace("\\", "/")


def _stem(path: str) -> str:
    return os.path.basename(_slashed(path)).removesuffix(".nwb")
