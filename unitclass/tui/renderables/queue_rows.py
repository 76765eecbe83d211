"""The queue: a narrow column of units, or one line of neighbours when there is no room."""

from __future__ import annotations

from collections.abc import Sequence

from unitclass.review.entry import QueueEntry
from unitclass.tui.renderables.glyphs import COLOUR, Look
from unitclass.tui.renderables.sheet import Sheet, width_of
from unitclass.tui.renderables.words import shortened

MARKS = {"later": "z", "disagreement": "?", "asks again": "!", "stale": "~", "labelled": "+"}
"""State of a unit to the character before its name; "reviewed" has the glyph of its own."""


def mark_of(entry: QueueEntry, look: Look) -> str:
    """Return the one character that tells an entry's state, a changed suggestion before all."""
    if entry.is_changed:
        return "*"
    return look.glyphs.done if entry.state == "reviewed" else MARKS.get(entry.state, " ")


def type_of(entry: QueueEntry) -> str:
    """Return the reviewer's own label, else the one that stands, else the suggestion (none when hidden)."""
    return entry.own_type or (entry.label.type if entry.label is not None else "") or entry.suggested_type


def queue_column(entries: Sequence[QueueEntry], here: int, width: int, height: int, *,
                 with_condition: bool = False, look: Look = COLOUR) -> Sheet:
    """Draw the page of the queue that holds entry `here`.

    Pages stay where they are while one steps through them, so that a step changes two lines only.
    """
    sheet = Sheet(width, height, look)
    first = page_start(here, height - 1)
    shown = entries[first : first + height - 1]
    for y, entry in enumerate(shown):
        is_here = first + y == here
        if is_here:
            sheet.put(0, y, look.glyphs.here, "strong")
        if (mark := mark_of(entry, look)) != " ":
            sheet.put(1, y, mark, "good" if entry.state == "reviewed" else "warn")
        name_room = max(4, width - 12)
        sheet.put(3, y, shortened(name_of(entry, with_condition), name_room, look), "strong" if is_here else "")
        sheet.put(3 + name_room + 1, y, shortened(type_of(entry), width - name_room - 5, look))
    n_pages = -(-len(entries) // max(1, height - 1))
    if n_pages > 1:
        page = f"page {here // max(1, height - 1) + 1} of {n_pages}"
        sheet.put(1, height - 1, shortened(page, width - 1, look), "quiet")
    return sheet


def page_start(here: int, per_page: int) -> int:
    """Return the first entry of the page that holds entry `here`."""
    per_page = max(1, per_page)
    return here // per_page * per_page


def queue_line(entries: Sequence[QueueEntry], here: int, width: int, *, with_condition: bool = False,
               look: Look = COLOUR) -> Sheet:
    """Draw the entries around `here` in one line, the current one between brackets."""
    sheet = Sheet(width, 1, look)
    if not entries:
        return sheet
    words = _word(entries[here], with_condition, look)
    start = min(width // 3, max(0, (width - width_of(words)) // 2))
    sheet.put(start, 0, f"[{words}]", "strong")
    x = start + width_of(words) + 3
    for entry in entries[here + 1 :]:
        text = _word(entry, with_condition, look)
        if x + width_of(text) > width:
            break
        sheet.put(x, 0, text, "" if entry.state == "open" else "quiet")
        x += width_of(text) + 2
    x = start - 1
    for entry in reversed(entries[:here]):
        text = _word(entry, with_condition, look)
        x -= width_of(text)
        if x < 0:
            break
        sheet.put(x, 0, text, "" if entry.state == "open" else "quiet")
        x -= 2
    return sheet


def name_of(entry: QueueEntry, with_condition: bool) -> str:
    """Return a unit's name, with its condition where there are several."""
    return f"{entry.unit} {entry.condition}" if with_condition and entry.condition else entry.unit


def _word(entry: QueueEntry, with_condition: bool, look: Look) -> str:
    mark = mark_of(entry, look).strip()
    name = shortened(entry.unit, 12, look)
    if with_condition and entry.condition:
        name += f" {shortened(entry.condition, 6, look)}"
    return shortened(f"{name} {type_of(entry)}".strip() + mark, 28, look)
