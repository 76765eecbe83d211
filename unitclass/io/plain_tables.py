"""Plain tables that people save from spreadsheets: read whole, whatever parts their columns."""

from __future__ import annotations

import csv
from collections.abc import Sequence
from dataclasses import dataclass
from io import StringIO

from unitclass.errors import UsageError


@dataclass(frozen=True)
class PlainRow:
    """One line that is not empty: where it stands, in words, and its cells by the column's name in lower case."""

    where: str
    cells: dict[str, str]


@dataclass(frozen=True)
class PlainTable:
    """A whole table. With semicolons or tabs between columns, a comma may stand in its numbers."""

    columns: tuple[str, ...]
    rows: tuple[PlainRow, ...]
    is_comma_decimal: bool

    def point(self, number: str) -> str:
        """Return a number as written with a decimal point."""
        return number.replace(",", ".") if self.is_comma_decimal else number


def read_plain_table(path: str, needed: Sequence[str], *, remedy: str) -> PlainTable:
    """Return the table in a file whose columns are parted by commas, semicolons or tabs.

    Parameters
    ----------
    path : str
    needed : sequence of str
        Columns that must be there, in lower case.
    remedy : str
        What to do where one is missing.

    Raises
    ------
    UsageError
        When it cannot be read, is no plain text, or lacks a column.
    """
    text = _text(path)
    delimiter = _delimiter(text.partition("\n")[0])
    reader = csv.DictReader(StringIO(text, newline=""), delimiter=delimiter)
    try:
        columns = tuple((name or "").strip().lower() for name in reader.fieldnames or ())
        missing = [name for name in needed if name not in columns]
        if missing:
            raise UsageError(f"has no column {missing[0]!r}", where=path, remedy=remedy)
        reader.fieldnames = list(columns)
        rows = tuple(PlainRow(f"{path} line {reader.line_num}", _cells(line, columns)) for line in reader)
    except csv.Error as error:
        raise UsageError(f"is not a plain table ({error})", where=path, remedy="save it as CSV") from error
    return PlainTable(columns, tuple(row for row in rows if any(cell.strip() for cell in row.cells.values())),
                      delimiter != ",")


def _text(path: str) -> str:
    """Return what a file says in UTF-8, or in the code page that spreadsheets still write."""
    try:
        with open(path, "rb") as file:
            content = file.read()
    except OSError as error:
        raise UsageError(f"cannot be read ({error.strerror})", where=path, remedy="check the name of the table") from error
    if b"\x00" in content:
        raise UsageError("is not a plain table", where=path, remedy="save it as CSV")
    try:
        return content.decode("utf-8-sig")
    except UnicodeDecodeError:
        return content.decode("cp1252", errors="replace")


def _delimiter(header: str) -> str:
    return max(",;\t", key=header.count) if header else ","


def _cells(line: dict[str, str | None], columns: Sequence[str]) -> dict[str, str]:
    return {name: line.get(name) or "" for name in columns}
