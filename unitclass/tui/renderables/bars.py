"""Probability bars: types in order of probability, each with a bar to scale and its number."""

from __future__ import annotations

from collections.abc import Sequence

from unitclass.tui.renderables.glyphs import COLOUR, Look
from unitclass.tui.renderables.histogram import partial
from unitclass.tui.renderables.sheet import Sheet, width_of


def probability_rows(ranked: Sequence[tuple[str, float]], width: int, height: int, *,
                     look: Look = COLOUR) -> Sheet:
    """Draw "2 post-I  0.21 ███": the digit that takes the type, its name, probability and bar.

    The bar of probability 1 fills the room that names and numbers leave.
    """
    shown = list(ranked[:height])
    sheet = Sheet(width, len(shown), look)
    longest = max((width_of(name) for name, _ in shown), default=0)
    at = 2 + min(longest, max(4, width - 8)) + 1
    room = max(0, width - at - 5)
    for y, (name, probability) in enumerate(shown):
        ink = "strong" if y == 0 else ""
        sheet.put(0, y, f"{y + 1}" if y < 9 else " ", "key")
        sheet.put(2, y, name[: at - 3], ink)
        sheet.put(at, y, in_words(probability), ink)
        sheet.put(at + 5, y, bar(probability, room, look), "bar")
    return sheet


def bar(share: float, width: int, look: Look = COLOUR) -> str:
    """Return a bar that fills `share` (0 to 1) of `width` columns, to the nearest cell."""
    cells = min(max(share, 0.0), 1.0) * width
    whole = int(cells)
    levels = look.glyphs.levels
    rest = partial(" ▌█", cells - whole) if not look.glyphs.is_ascii else ""
    return (levels[-1] * whole + (rest if whole < width else "")).rstrip()


def in_words(probability: float) -> str:
    """Return a probability with two decimals, never rounded to a false 1 or 0."""
    if probability != probability:
        return "  - "
    if 0.995 <= probability < 1:
        return ">.99"
    if 0 < probability < 0.005:
        return "<.01"
    return f"{probability:.2f}"
