"""Columns and tables as values, before they become HDF5."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from unitclass.io.safe_text import safe_text
from unitclass.records import FloatArray, IntArray

_AS_PARENTHESES = str.maketrans("{}", "()")
_YES_AND_NO = (("yes", "no"), ("y", "n"), ("true", "false"), ("t", "f"), ("hit", "miss"))
_AS_UNDERSCORE = str.maketrans("/\\:.", "____")


@dataclass(frozen=True)
class Column:
    """One column of a table.

    Attributes
    ----------
    name : str
        Its name in the file.
    description : str
        What it holds, with unit.
    values : ndarray, shape (n_rows, ...)
        Numbers, truth values or text (dtype object); all cells one after the other when
        `lengths` is given.
    lengths : ndarray, shape (n_rows,), optional
        Number of values in each cell of a ragged column.
    points_to : str
        Path of the table whose row numbers `values` are; or "objects" when they are the paths
        of objects in the file.
    resolution_s : float
        For spike times: the smallest difference between two of them; NaN elsewhere.
    """

    name: str
    description: str
    values: NDArray[Any]
    lengths: IntArray | None = None
    points_to: str = ""
    resolution_s: float = np.nan

    @property
    def is_empty(self) -> bool:
        """Return whether no cell holds anything."""
        if self.values.dtype == object:
            return not any(self.values)
        if self.values.dtype.kind == "f":
            return not np.isfinite(self.values).any()
        return self.values.size == 0


@dataclass(frozen=True)
class Table:
    """A table of `n_rows` rows, to be written without its empty columns.

    `kind` is the NWB type: "DynamicTable", "TimeIntervals" or "Units".
    """

    name: str
    description: str
    n_rows: int
    columns: tuple[Column, ...]
    kind: str = "DynamicTable"

    @property
    def filled(self) -> tuple[Column, ...]:
        """Return the columns that hold something."""
        return tuple(column for column in self.columns if not column.is_empty)


def text_column(name: str, description: str, values: Sequence[str]) -> Column:
    """Return a column of text, safe to show.

    Braces become parentheses: readers of NWB take a text in braces for a dictionary that should
    have been unpacked.
    """
    cells = [safe_text(value).translate(_AS_PARENTHESES) for value in values]
    return Column(name, description, np.array([*cells, None], dtype=object)[:-1])


def word_column(name: str, description: str, values: Sequence[str]) -> Column:
    """Return a column of text, or of truth values if all its words are a yes and a no."""
    for yes, no in _YES_AND_NO:
        if {value.lower() for value in values} == {yes, no}:
            return Column(name, f"{description} (true: {yes})", np.array([v.lower() == yes for v in values]))
    return text_column(name, description, values)


def number_column(name: str, description: str, values: Sequence[float] | FloatArray) -> Column:
    """Return a column of numbers; what is not finite becomes NaN."""
    cells = np.asarray(values, dtype=float)
    return Column(name, description, np.where(np.isfinite(cells), cells, np.nan))


def count_column(name: str, description: str, values: Sequence[int] | IntArray) -> Column:
    """Return a column of whole numbers."""
    return Column(name, description, np.asarray(values, dtype=np.int64))


def column_name(*parts: str) -> str:
    """Return a name that HDF5 and NWB accept: no slash, colon or dot, joined by underscores."""
    return "_".join(safe_text(part).translate(_AS_UNDERSCORE) for part in parts)
