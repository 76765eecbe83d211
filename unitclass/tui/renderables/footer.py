"""The foot of every screen: what has just happened, and the keys that matter here."""

from __future__ import annotations

from collections.abc import Sequence

from unitclass.tui.renderables.glyphs import COLOUR, Look
from unitclass.tui.renderables.sheet import Sheet, width_of
from unitclass.tui.renderables.words import shortened


def footer_rows(message: str, keys: Sequence[tuple[str, str]], width: int, height: int = 2, *,
                ink: str = "", look: Look = COLOUR) -> Sheet:
    """Draw the message, and under it as many (key, word) pairs as fit, in the order given."""
    sheet = Sheet(width, height, look)
    if height > 1:
        sheet.put(0, 0, shortened(message, width, look), ink)
    x = 0
    for key, word in keys:
        if x + width_of(key) + 1 + width_of(word) > width:
            break
        sheet.put(x, height - 1, key, "key")
        sheet.put(x + width_of(key) + 1, height - 1, word)
        x += width_of(key) + width_of(word) + 3
    return sheet


def entry_row(lead: str, text: str, at: int, width: int, *, look: Look = COLOUR) -> Sheet:
    """Draw a line that is being typed, its cursor in reverse; the end stays in sight."""
    sheet = Sheet(width, 1, look)
    sheet.put(0, 0, lead, "strong")
    x = width_of(lead) + 1
    room = max(1, width - x - 1)
    before = text[:at]
    while width_of(before) > room:
        before = before[1:]
    sheet.put(x, 0, before + text[at:] + " ")
    cursor = x + width_of(before)
    sheet.ink(cursor, 0, max(1, width_of(text[at : at + 1])), "here")
    if look.glyphs.is_ascii and not text[at:]:
        sheet.put(cursor, 0, "_", "here")
    return sheet
