"""Tables as CSV or JSON files, or on stdout."""

from __future__ import annotations

import csv
import io
import json
import os
import sys
from collections.abc import Mapping, Sequence
from pathlib import Path

from unitclass.errors import UsageError
from unitclass.io.atomic import written_whole

Cell = str | float | int | None

def write_table(path: str, rows: Sequence[Mapping[str, Cell]], *, force: bool = False,
                columns: Sequence[str] = (), form: str = "") -> None:
    """Write `rows` to a .csv or .json file, or to stdout when `path` is "-".

    Parameters
    ----------
    path : str
        The target. Written beside itself under a temporary name, then renamed.
    rows : sequence of Mapping
        They may differ in their last columns; missing values are empty.
    force : bool
        Whether a file that is already there may be replaced.
    columns : sequence of str
        Columns to write even when there are no rows.
    form : str
        "csv" or "json"; empty goes by the suffix of `path` ("-" is CSV).

    Raises
    ------
    UsageError
        If the suffix is neither.
    TargetError
        If the target exists and `force` is false, or cannot be written.
    """
    text = table_text(rows, columns=columns, form=form or table_form(path))
    if path == "-":
        sys.stdout.write(text)
        return
    with written_whole(path, force=force) as temporary:
        temporary.write_bytes(text.encode("utf-8"))


def table_form(path: str) -> str:
    """Return "csv" or "json" by the suffix of `path`; raises UsageError for any other."""
    suffix = Path(path).suffix.lower()
    if path == "-" or suffix == ".csv":
        return "csv"
    if suffix == ".json":
        return "json"
    raise UsageError("a table is CSV or JSON", where=os.fspath(path), remedy="end its name in .csv or .json")


def table_text(rows: Sequence[Mapping[str, Cell]], *, columns: Sequence[str] = (), form: str = "csv") -> str:
    """Return `rows` as CSV (RFC 4180 quoting, lines end in a line feed) or as a JSON array of objects."""
    names = list(dict.fromkeys([*columns, *(name for row in rows for name in row)]))
    if form == "json":
        whole = [{name: row.get(name) for name in names} for row in rows]
        return json.dumps(whole, ensure_ascii=False, indent=1, allow_nan=False) + "\n"
    out = io.StringIO()
    writer = csv.writer(out, lineterminator="\n")
    writer.writerow(names)
    writer.writerows([_csv_cell(row.get(name)) for name in names] for row in rows)
    return out.getvalue()


def _csv_cell(value: Cell) -> Cell:
    return str(value).lower() if isinstance(value, bool) else value
