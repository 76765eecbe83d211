"""What moved since an older table: suggestions, by how much, and because of what."""

from __future__ import annotations

import math
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from pathlib import PurePath

from unitclass.errors import UsageError
from unitclass.io.plain_tables import read_plain_table
from unitclass.io.table_files import Cell

NEEDED = ("file", "unit", "condition", "suggested_type", "probability")
LEAST_MOVE = 0.05  # of a probability
MADE_BY = {"version": "version", "settings_digest": "settings", "template_digest": "templates"}
MADE_OF = {"nerve": "nerve", "regime": "rhythm", "n_cycles": "cycles", "n_spikes": "spikes"}
AGAINST_COLUMNS = ("was_type", "was_probability", "moved_because")

Row = Mapping[str, Cell]
Key = tuple[str, str, str]


@dataclass(frozen=True)
class Move:
    """One unit whose suggestion is another, or less or more sure, than in the older table."""

    row: Row
    was_type: str
    was_probability: float | None
    because: tuple[str, ...]


@dataclass(frozen=True)
class Comparison:
    """All that moved, and how many rows of the same files only one of the tables has."""

    moves: tuple[Move, ...]
    n_same: int
    n_new: int
    n_gone: int


def read_older(path: str) -> list[dict[str, str]]:
    """Return the rows of a table that `classify` wrote earlier.

    Raises
    ------
    UsageError
        When it cannot be read or lacks a column that is needed.
    """
    table = read_plain_table(path, NEEDED, remedy="give a table that `unitclass classify --table` wrote")
    return [row.cells | {"probability": table.point(row.cells["probability"])} for row in table.rows]


def compared(rows: Sequence[Row], older: Sequence[Mapping[str, str]], where: str) -> Comparison:
    """Compare rows with those of an older table, unit by unit and condition by condition.

    A session is known by the name of its file: archives move from disk to disk.

    Raises
    ------
    UsageError
        When the tables have no unit in common.
    """
    was = {_key(row): row for row in older}
    common = [(row, was[_key(row)]) for row in rows if _key(row) in was]
    if rows and not common:
        raise UsageError("has no unit in common with these files", where=where, remedy="compare the same sessions")
    moves = tuple(move for row, old in common for move in _moved(row, old))
    now = {_key(row) for row in rows}
    files = {file for file, _, _ in now}
    gone = [key for key in was if key[0] in files and key not in now]
    return Comparison(moves, len(common) - len(moves), len(rows) - len(common), len(gone))


def with_moves(rows: Sequence[Row], found: Comparison) -> list[dict[str, Cell]]:
    """Return the rows with AGAINST_COLUMNS, empty where nothing moved."""
    by_key = {_key(move.row): move for move in found.moves}
    return [dict(row) | _cells(by_key.get(_key(row))) for row in rows]


def _cells(move: Move | None) -> dict[str, Cell]:
    values: tuple[Cell, ...] = (None,) * 3 if move is None else (
        move.was_type, move.was_probability, "; ".join(move.because))
    return dict(zip(AGAINST_COLUMNS, values, strict=True))


def _key(row: Mapping[str, Cell]) -> Key:
    return PurePath(str(row["file"])).name, str(row["unit"]), str(row["condition"])


def _moved(row: Row, old: Mapping[str, str]) -> Iterator[Move]:
    was, now = _number(old["probability"]), _number(row["probability"])
    if old["suggested_type"] != row["suggested_type"] or abs((was or 0.0) - (now or 0.0)) >= LEAST_MOVE:
        yield Move(row, old["suggested_type"], was, tuple(_because(row, old)))


def _because(row: Row, old: Mapping[str, str]) -> Iterator[str]:
    differs = [(name, words) for name, words in (MADE_OF | MADE_BY).items()
               if name in old and old[name] != _text(row.get(name))]
    yield from (f"other {words}" if name.endswith("digest") else f"{words} {old[name] or 'none'} to {_text(row.get(name))}"
                for name, words in differs)
    if not differs:
        yield ("nothing that the tables tell" if set(MADE_BY) <= set(old)
               else "not known: the older table does not say how it was made")


def _number(value: Cell) -> float | None:
    try:
        found = float(value)  # type: ignore[arg-type]
    except (TypeError, ValueError):
        return None
    return found if math.isfinite(found) else None


def _text(value: Cell) -> str:
    return "" if value is None else str(value)
