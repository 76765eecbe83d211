"""Conditions, animals and cells from a plain table, for files that hold none."""

from __future__ import annotations

import csv
import math
import os
from collections.abc import Mapping
from dataclasses import dataclass

from unitclass.errors import UsageError

COLUMNS = ("file", "start_s", "stop_s", "condition", "animal", "cell")


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
        """Return the rows of one file: matched by its path, else by its name, with or without .nwb."""
        exact = tuple(r for r in self.rows if os.path.normpath(r.file) == os.path.normpath(path))
        return exact or tuple(r for r in self.rows if _stem(r.file) == _stem(path))


def read_condition_table(path: str) -> ConditionTable:
    """Return the table in a CSV file with the columns `COLUMNS` (animal and cell may be missing).

    Raises
    ------
    UsageError
        When it cannot be read, lacks a column, or a time is not a number; the line is named.
    """
    try:
        with open(path, encoding="utf-8-sig", newline="") as file:
            reader = csv.DictReader(file)
            lines = list(reader)
            names = reader.fieldnames or []
    except (OSError, UnicodeDecodeError, csv.Error) as error:
        raise UsageError(f"cannot be read ({error})", where=path, remedy="give a CSV file in UTF-8") from error
    missing = [name for name in ("file", "start_s", "stop_s", "condition") if name not in names]
    if missing:
        raise UsageError(f"has no column {missing[0]!r}", where=path, remedy="the columns are " + ", ".join(COLUMNS))
    return ConditionTable(path, tuple(_row(line, f"{path} line {i}") for i, line in enumerate(lines, start=2)))


def _row(line: Mapping[str, str | None], where: str) -> ConditionRow:
    start_s, stop_s = _time(line, "start_s", where), _time(line, "stop_s", where)
    if stop_s <= start_s:
        raise UsageError(f"stop_s {stop_s:g} is not after start_s {start_s:g}", where=where, remedy="swap or mend them")
    words = {name: (line.get(name) or "").strip() for name in ("file", "condition", "animal", "cell")}
    return ConditionRow(words["file"], start_s, stop_s, words["condition"], words["animal"], words["cell"])


def _time(line: Mapping[str, str | None], name: str, where: str) -> float:
    said = (line.get(name) or "").strip()
    try:
        return float(said) if said else math.nan
    except ValueError:
        raise UsageError(f"{name} = {said!r} is not a number of seconds", where=where, remedy="give seconds") from None


def _stem(path: str) -> str:
    return os.path.basename(path.replace("\\", "/")).removesuffix(".nwb")
