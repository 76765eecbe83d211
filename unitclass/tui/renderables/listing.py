"""Lists of lines with one of them chosen, a page at a time; and paragraphs that scroll."""

from __future__ import annotations

from collections.abc import Sequence

from unitclass.tui.renderables.glyphs import COLOUR, Look
from unitclass.tui.renderables.queue_rows import page_start
from unitclass.tui.renderables.sheet import Sheet, width_of
from unitclass.tui.renderables.words import shortened

Row = tuple[str, ...]


def table_rows(head: Row, rows: Sequence[Row], here: int, width: int, height: int, *,
               inks: Sequence[str] = (), look: Look = COLOUR) -> Sheet:
    """Draw a table with a heading, the page of it that holds row `here`, and which page that is.

    The last column takes what room is left; `inks` gives each row its ink.
    """
    sheet = Sheet(width, height, look)
    widths = column_widths([head, *rows], width - 2)
    _put_row(sheet, 0, head, widths, "quiet")
    per_page = max(1, height - 2)
    first = page_start(max(0, here), per_page)
    for y, row in enumerate(rows[first : first + per_page], start=1):
        place = first + y - 1
        ink = inks[place] if place < len(inks) else ""
        if place == here:
            sheet.put(0, y, look.glyphs.here, "strong")
        _put_row(sheet, y, row, widths, "strong" if place == here and not ink else ink)
    if len(rows) > per_page:
        words = f"{first + 1}-{min(first + per_page, len(rows))} of {len(rows)}"
        sheet.put(2, height - 1, words, "quiet")
    return sheet


def column_widths(rows: Sequence[Row], width: int) -> list[int]:
    """Return each column's width: as wide as needed, the widest ones cut until all fit."""
    n = max((len(row) for row in rows), default=0)
    widths = [max((width_of(row[i]) for row in rows if i < len(row)), default=0) for i in range(n)]
    while sum(widths) + 2 * max(0, n - 1) > width and max(widths) > 4:
        widths[widths.index(max(widths))] -= 1
    return widths


def _put_row(sheet: Sheet, y: int, row: Row, widths: Sequence[int], ink: str) -> None:
    x = 2
    for text, room in zip(row, widths, strict=False):
        sheet.put(x, y, shortened(text, room, sheet.look), ink)
        x += room + 2


def scrolled(lines: Sequence[tuple[str, str]], first: int, width: int, height: int, *,
             look: Look = COLOUR) -> Sheet:
    """Draw (text, ink) lines from line `first` on; the last row says when there is more."""
    sheet = Sheet(width, height, look)
    first = max(0, min(first, len(lines) - height)) if len(lines) > height else 0
    for y, (text, ink) in enumerate(lines[first : first + height]):
        sheet.put(0, y, text, ink)
    left = len(lines) - first - height
    if left > 0:
        sheet.put(0, height - 1, " " * width)
        sheet.put(0, height - 1, shortened(f"{left + 1} more lines below", width, look), "key")
    return sheet
