"""The file that says what another laboratory calls each type."""

from __future__ import annotations

import csv
from collections.abc import Collection
from pathlib import Path

from unitclass.errors import UsageError
from unitclass.io.safe_text import safe_text

COLUMNS = ("type", "word")


def read_crosswalk(path: str, known: Collection[str]) -> dict[str, str]:
    """Return type id to word from a table (CSV, UTF-8) with the columns `type` and `word`.

    Parameters
    ----------
    path : str
    known : collection of str
        Ids that may be translated.

    Raises
    ------
    UsageError
        When it cannot be read, has other columns, or names an unknown type.
    """
    try:
        with Path(path).open(encoding="utf-8-sig", newline="") as file:
            reader = csv.DictReader(file)
            if tuple(reader.fieldnames or ())[:2] != COLUMNS:
                raise UsageError(f"has the columns {', '.join(reader.fieldnames or ()) or 'none'}", where=path,
                                 remedy="make the first line: type,word")
            rows = [(str(row["type"]).strip(), safe_text(str(row["word"] or "").strip())) for row in reader]
    except (OSError, UnicodeDecodeError, csv.Error) as error:
        raise UsageError("cannot be read", where=path, remedy=str(error)) from error
    for name, word in rows:
        if name not in known:
            raise UsageError(f"{name!r} is no type", where=path, remedy="use " + ", ".join(known))
        if not word:
            raise UsageError(f"{name!r} has no word", where=path, remedy="give one or leave the line out")
    return dict(rows)
