"""Conditions, animals and cells from a plain table, for files that hold none."""

from __future__ import annotations

import csv
import math
import os
from collections.abc import Mapping
from dataclasses import dataclass

from unitclass.errors import UsageError

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
    lines = _lines(path)
    dialect = _delimiter(lines[0] if lines else "")
    reader = csv.DictReader(lines, delimiter=dialect)
    names = [(name or "").strip().lower() for name in reader.fieldnames or ()]
    reader.fieldnames = names
    missing = [name for name in NEEDED if name not in names]
    if missing:
        raise UsageError(f"has no column {missing[0]!r}", where=path, remedy="the columns are " + ", ".join(COLUMNS))
    is_comma_decimal = dialect != ","
    rows = [(line, f"{path} line {reader.line_num}") for line in reader]
    return ConditionTable(path, tuple(_row(line, where, is_comma_decimal) for line, where in rows
                                      if any(isinstance(v, str) and v.strip() for v in line.values())))


def _lines(path: str) -> list[str]:
    """Return the lines of a table in UTF-8, or in the code page that spreadsheets still write."""
    try:
        with open(path, "rb") as file:
            content = file.read()
    except OSError as error:
        raise UsageError(f"cannot be read ({error.strerror})", where=path, remedy="check the name of the table") from error
    if b"\x00" in content:
        raise UsageError("is not a plain table", where=path, remedy="save it as CSV")
    try:
        return content.decode("utf-8-sig").splitlines()
    except UnicodeDecodeError:
        return content.decode("cp1252", errors="replace").splitlines()


def _delimiter(header: str) -> str:
    return max(",;\t", key=header.count) if header else ","


def _row(line: Mapping[str, str | None], where: str, is_comma_decimal: bool) -> ConditionRow:
    start_s, stop_s = (_time(line, name, where, is_comma_decimal) for name in ("start_s", "stop_s"))
    if stop_s <= start_s:
        raise UsageError(f"stop_s {stop_s:g} is not after start_s {start_s:g}", where=where, remedy="swap or mend them")
    words = {name: (line.get(name) or "").strip() for name in ("file", "condition", "animal", "cell")}
    if not words["file"]:
        raise UsageError("names no file", where=where, remedy="fill the column 'file'")
    return ConditionRow(words["file"], start_s, stop_s, words["condition"], words["animal"], words["cell"])


def _time(line: Mapping[str, str | None], name: str, where: str, is_comma_decimal: bool) -> float:
    said = (line.get(name) or "").strip()
    try:
        value = float(said.replace(",", ".") if is_comma_decimal else said) if said else math.nan
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
