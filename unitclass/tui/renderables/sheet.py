"""A sheet of character cells that pictures are drawn on: no terminal, no toolkit, no markup.

Every string passes `printable` on its way in, so nothing from a file can steer the terminal.
"""

from __future__ import annotations

import unicodedata
from collections.abc import Iterator
from itertools import groupby

from rich.cells import get_character_cell_size

from unitclass.io.safe_text import safe_text
from unitclass.tui.renderables.glyphs import COLOUR, Look

SHADED = "+"
"""Appended to an ink where the cell lies in inspiration."""

_ODD_WIDTH = ("\U0001f1e6", "\U0001f1ff")  # flags: two letters make one picture, terminals differ


def printable(text: str, *, ascii_only: bool = False) -> str:
    """Return `text` with all that could steer a terminal, or upset its columns, taken out.

    Escape sequences, control, format and bidirectional characters go, line breaks become spaces;
    combining marks are joined to their letter or dropped. With `ascii_only`, letters lose their
    accents and the rest becomes "?".
    """
    if text.isascii() and text.isprintable():
        return text
    if not text.isprintable():
        text = safe_text(text)
    if ascii_only:
        text = unicodedata.normalize("NFKD", text.replace("µ", "u"))
        return "".join(_ascii(c) for c in text)
    return "".join(_safe(c) for c in unicodedata.normalize("NFC", text))


def _ascii(char: str) -> str:
    if char.isascii():
        return char if char.isprintable() else "?"
    return "" if unicodedata.combining(char) else _STAND_INS.get(char, "?")


_STAND_INS = {"–": "-", "—": "-", "−": "-", "×": "x", "→": "->", "≤": "<=", "≥": ">=", "±": "+-", "α": "a",
              "η": "eta", "κ": "kappa", "τ": "tau", "·": ".", "’": "'", "…": "..."}


def _safe(char: str) -> str:
    if not char.isprintable() or _ODD_WIDTH[0] <= char <= _ODD_WIDTH[1]:
        return "?"
    return char if get_character_cell_size(char) > 0 else ""


def width_of(text: str) -> int:
    """Return how many columns printable text takes."""
    return len(text) if text.isascii() else sum(get_character_cell_size(c) for c in text)


class Sheet:
    """`height` rows of `width` cells, each a character and the name of its ink.

    A character two columns wide takes its cell and leaves the next one empty ("").
    """

    __slots__ = ("cells", "height", "inks", "look", "width")

    def __init__(self, width: int, height: int, look: Look = COLOUR) -> None:
        self.width, self.height, self.look = max(0, width), max(0, height), look
        self.cells = [[" "] * self.width for _ in range(self.height)]
        self.inks = [[""] * self.width for _ in range(self.height)]

    def put(self, x: int, y: int, text: str, ink: str = "") -> None:
        """Write text from column `x` of row `y`; what does not fit is cut off."""
        if not 0 <= y < self.height or x >= self.width:
            return
        cells = _cells_of(printable(text, ascii_only=self.look.glyphs.is_ascii))
        start, room = max(0, -x), self.width - x
        part = cells[start:room]
        if not part:
            return
        x = max(0, x)
        if part[-1] and x + len(part) == self.width and get_character_cell_size(part[-1][0]) == 2:
            part[-1] = " "
        self.cells[y][x : x + len(part)] = part
        self.inks[y][x : x + len(part)] = [ink] * len(part)

    def cell(self, x: int, y: int, char: str, ink: str = "") -> None:
        """Set one cell to a character of the glyph set (not checked: never pass a file's text)."""
        if 0 <= x < self.width and 0 <= y < self.height:
            self.cells[y][x] = char
            self.inks[y][x] = ink

    def right(self, x_end: int, y: int, text: str, ink: str = "") -> None:
        """Write text so that it ends before column `x_end`."""
        text = printable(text, ascii_only=self.look.glyphs.is_ascii)
        self.put(max(0, x_end - width_of(text)), y, text, ink)

    def paste(self, other: Sheet, x: int, y: int) -> None:
        """Copy another sheet in with its upper left corner at (x, y)."""
        n = min(other.width, self.width - x)
        for row in range(min(other.height, self.height - y)):
            if y + row >= 0 and n > 0:
                self.cells[y + row][x : x + n] = other.cells[row][:n]
                self.inks[y + row][x : x + n] = other.inks[row][:n]

    def columns(self, start: int, width: int) -> Sheet:
        """Return `width` columns from `start` on as a sheet of their own, blank where there are none."""
        part = Sheet(width, self.height, self.look)
        n = max(0, min(width, self.width - start))
        for y in range(self.height):
            part.cells[y][:n] = self.cells[y][start : start + n]
            part.inks[y][:n] = self.inks[y][start : start + n]
        return part

    def shade(self, x: int, y: int, width: int, height: int) -> None:
        """Mark a block of cells as inspiration: as an ink, or without colour as a sparse lattice."""
        char = self.look.shade
        for row in range(max(0, y), min(self.height, y + height)):
            for column in range(max(0, x), min(self.width, x + width)):
                if not char:
                    self.inks[row][column] += SHADED
                elif self.cells[row][column] == " " and (column - x + row - y) % 2 == 0:
                    self.cells[row][column] = char
                    self.inks[row][column] = "shade"

    def ink(self, x: int, y: int, width: int, ink: str) -> None:
        """Change the ink of part of a row."""
        if 0 <= y < self.height:
            n = max(0, min(self.width, x + width) - x)
            self.inks[y][x : x + n] = [ink] * n

    def runs(self, y: int) -> Iterator[tuple[str, str]]:
        """Yield (text, ink) of row `y`, neighbours of one ink joined."""
        row = self.cells[y]
        x = 0
        for ink, group in groupby(self.inks[y]):
            n = sum(1 for _ in group)
            yield "".join(row[x : x + n]), ink
            x += n

    def lines(self) -> list[str]:
        """Return the rows as plain text, without trailing blanks."""
        return ["".join(row).rstrip() for row in self.cells]

    def text(self) -> str:
        """Return the whole sheet as plain text."""
        return "\n".join(self.lines())


def _cells_of(text: str) -> list[str]:
    if text.isascii():
        return list(text)
    cells: list[str] = []
    for char in text:
        cells += [char, ""] if get_character_cell_size(char) == 2 else [char]
    return cells
