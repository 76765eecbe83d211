"""A list to choose from while typing, the chosen option marked."""

from __future__ import annotations

from collections.abc import Sequence

from unitclass.tui.renderables.glyphs import COLOUR, Look
from unitclass.tui.renderables.sheet import Sheet, width_of
from unitclass.tui.renderables.words import shortened


def choice_rows(title: str, options: Sequence[tuple[str, str]], here: int, width: int, height: int, *,
                look: Look = COLOUR) -> Sheet:
    """Draw (label, detail) options under a title, scrolled so that option `here` is in sight."""
    sheet = Sheet(width, height, look)
    sheet.put(0, 0, shortened(title, width, look), "title")
    if not options:
        sheet.put(0, 1, shortened("nothing matches", width, look), "warn")
        return sheet
    room = max(1, height - 1)
    first = max(0, min(here - room // 2, len(options) - room))
    room_of_detail = min(max(width_of(detail) for _, detail in options), width // 3)
    longest = min(max(width_of(label) for label, _ in options), max(8, width - 3 - room_of_detail))
    for y, (label, detail) in enumerate(options[first : first + room], start=1):
        is_here = first + y - 1 == here
        ink = "here" if is_here else ""
        sheet.put(0, y, look.glyphs.here if is_here else " ", "strong")
        sheet.put(2, y, shortened(label, longest, look), ink)
        sheet.put(3 + longest, y, shortened(detail, width - 3 - longest, look), "quiet")
    return sheet
