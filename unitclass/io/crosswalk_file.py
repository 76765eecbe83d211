"""The file that says what another laboratory calls each type."""

from __future__ import annotations

from collections.abc import Collection

from unitclass.errors import UsageError
from unitclass.io.plain_tables import read_plain_table
from unitclass.io.safe_text import safe_text

COLUMNS = ("type", "word")


def read_crosswalk(path: str, known: Collection[str]) -> dict[str, str]:
    """Return type id to word from a plain table with the columns `type` and `word`.

    Parameters
    ----------
    path : str
    known : collection of str
        Ids that may be translated.

    Raises
    ------
    UsageError
        When it cannot be read, lacks a column, or names an unknown type.
    """
    words = {}
    for row in read_plain_table(path, COLUMNS, remedy="make the first line: type,word").rows:
        name, word = row.cells["type"].strip(), safe_text(row.cells["word"].strip())
        if name not in known:
            raise UsageError(f"{name!r} is no type", where=row.where, remedy="use " + ", ".join(known))
        if not word:
            raise UsageError(f"{name!r} has no word", where=row.where, remedy="give one or leave the line out")
        words[name] = word
    return words
