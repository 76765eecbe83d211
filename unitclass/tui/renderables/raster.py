"""The raster: cycles as rows, in time order from the top, a mark for every spike."""

from __future__ import annotations

from itertools import pairwise

import numpy as np
from numpy.typing import ArrayLike, NDArray

from unitclass.records import BoolArray
from unitclass.tui.renderables.axis import CycleAxis
from unitclass.tui.renderables.glyphs import COLOUR, Look
from unitclass.tui.renderables.sheet import Sheet

_DOTS = np.array([[0x01, 0x08], [0x02, 0x10], [0x04, 0x20], [0x40, 0x80]])
"""Braille dot of (row, column) within a cell: Unicode 15, block 2800."""


def raster_rows(axis: CycleAxis, phase: ArrayLike, row: ArrayLike, n_cycles: int, height: int, *,
                look: Look = COLOUR) -> Sheet:
    """Draw spikes at (phase, row), arrays of shape (n_spikes,), of `n_cycles` cycles.

    In braille a character row holds four cycles and a column is halved; in ASCII a row is one
    cycle. When there are more cycles than rows, evenly spaced ones are shown.
    """
    sheet = Sheet(axis.n_columns, height, look)
    per_row = 4 if look.glyphs.has_braille else 1
    shown = shown_cycles(n_cycles, height * per_row)
    phase, rows = np.asarray(phase, dtype=float), np.asarray(row, dtype=np.int64)
    place = np.full(max(n_cycles, 1), -1)
    place[shown] = np.arange(shown.size)
    inside = (rows >= 0) & (rows < n_cycles)
    phase, line = phase[inside], place[rows[inside]]
    phase, line = phase[line >= 0], line[line >= 0]
    if look.glyphs.has_braille:
        put_dots(sheet, _dots(axis, phase, line, height))
    else:
        _put_marks(sheet, axis, phase, line)
    _put_turn(sheet, axis, -(-shown.size // per_row))
    return sheet


def shown_cycles(n_cycles: int, n_rows: int) -> NDArray[np.int64]:
    """Return which of `n_cycles` cycles have a row: all, or `n_rows` evenly spaced ones."""
    if n_cycles <= n_rows:
        return np.arange(n_cycles)
    return np.linspace(0, n_cycles - 1, n_rows).round().astype(np.int64)


def _dots(axis: CycleAxis, phase: NDArray[np.float64], line: NDArray[np.int64], height: int) -> BoolArray:
    fine = CycleAxis(2 * axis.n_columns, 2 * axis.n_inspiration)
    dots = np.zeros((height * 4, fine.n_columns), dtype=bool)
    dots[line, fine.column_of(phase)] = True
    return dots


def put_dots(sheet: Sheet, dots: BoolArray, ink: str = "") -> None:
    """Draw a field of dots, shape (4 x height, 2 x width), as braille; empty cells are left alone."""
    blocks = dots.reshape(sheet.height, 4, sheet.width, 2).transpose(0, 2, 1, 3)
    codes = (blocks * _DOTS).sum(axis=(2, 3))
    for y, x in zip(*(places.tolist() for places in np.nonzero(codes)), strict=True):
        sheet.cells[y][x] = chr(0x2800 + int(codes[y, x]))
        sheet.inks[y][x] = ink


def joined_dots(heights: ArrayLike, n_rows: int) -> BoolArray:
    """Return dots of a line through `heights`, dot rows from the bottom, (n_columns,); NaN breaks it."""
    levels = np.asarray(heights, dtype=float)
    dots = np.zeros((n_rows, levels.size), dtype=bool)
    places = np.clip(np.round(np.nan_to_num(levels)), 0, n_rows - 1).astype(int)
    rows = np.where(np.isfinite(levels), places, -1)
    for x, level in enumerate(rows):
        if level >= 0:
            dots[n_rows - 1 - level, x] = True
    for x, (a, b) in enumerate(pairwise(rows)):
        if a >= 0 and b >= 0 and abs(b - a) > 1:
            middle = (a + b) // 2
            dots[n_rows - 1 - np.arange(min(a, middle), max(a, middle) + 1), x] = True
            dots[n_rows - 1 - np.arange(min(middle, b), max(middle, b) + 1), x + 1] = True
    return dots


def _put_marks(sheet: Sheet, axis: CycleAxis, phase: NDArray[np.float64], line: NDArray[np.int64]) -> None:
    for x, y in zip(axis.column_of(phase).tolist(), line.tolist(), strict=True):
        sheet.cells[y][x] = sheet.look.glyphs.upright


def _put_turn(sheet: Sheet, axis: CycleAxis, n_rows: int) -> None:
    """Mark the end of inspiration: by shading, or without colour by a line in the last empty cell."""
    if sheet.look.has_colour:
        sheet.shade(0, 0, axis.n_inspiration, sheet.height)
        return
    for y in range(min(n_rows, sheet.height)):
        if sheet.cells[y][axis.n_inspiration - 1] == " ":
            sheet.cell(axis.n_inspiration - 1, y, sheet.look.glyphs.turn, "shade")
