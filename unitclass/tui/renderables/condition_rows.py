"""One unit in its conditions, side by side on the same axis and the same scale."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from unitclass.records import NerveProfile, UnitResult
from unitclass.tui.renderables.axis import CycleAxis
from unitclass.tui.renderables.glyphs import COLOUR, Look
from unitclass.tui.renderables.sheet import Sheet
from unitclass.tui.renderables.unit_picture import bars_of, unit_picture
from unitclass.tui.renderables.words import shortened

LEAST_WIDTH = 30


@dataclass(frozen=True)
class ConditionView:
    """One unit in one condition; `title` and `lines` stand above its picture."""

    title: str
    lines: tuple[str, ...]
    unit: UnitResult
    nerves: tuple[NerveProfile, ...]
    ti_s: float
    te_s: float
    family: str


def condition_rows(views: Sequence[ConditionView], here: int, width: int, height: int, *,
                   look: Look = COLOUR) -> Sheet:
    """Draw as many conditions beside each other as there is room for, the page that holds `here`."""
    sheet = Sheet(width, height, look)
    if not views:
        return sheet
    n_beside = max(1, min(len(views), width // LEAST_WIDTH))
    first = here // n_beside * n_beside
    room = width // n_beside
    top, n_nerves = common_top(views), max(len(view.nerves) for view in views)
    for place, view in enumerate(views[first : first + n_beside]):
        column = _column(view, first + place == here, room - 1, height, (top, n_nerves), look)
        sheet.paste(column, place * room, 0)
    if len(views) > n_beside:
        last = min(first + n_beside, len(views))
        words = (f"{last}" if n_beside == 1 else f"{first + 1}-{last}") + f" of {len(views)} conditions"
        sheet.right(width, 0, words, "quiet")
    return sheet


def common_top(views: Sequence[ConditionView]) -> float:
    """Return the scale in spikes/s that holds the histograms of all conditions."""
    axis = CycleAxis(40, 20)
    return max(bars_of(view.unit, axis, with_fit=bool(view.family)).top_hz for view in views)


def _column(view: ConditionView, is_here: bool, width: int, height: int, common: tuple[float, int],
            look: Look) -> Sheet:
    sheet = Sheet(width, height, look)
    mark = look.glyphs.here if is_here else " "
    sheet.put(0, 0, f"{mark}{shortened(view.title, width - 1, look)}", "title")
    for y, line in enumerate(view.lines[:3], start=1):
        sheet.put(1, y, shortened(line, width - 1, look), "strong" if y == 1 else "quiet")
    y = 1 + min(3, len(view.lines))
    picture = unit_picture(view.unit, view.nerves, view.ti_s, view.te_s, width, height - y,
                           family=view.family, top_hz=common[0], n_nerves=common[1], look=look)
    sheet.paste(picture, 0, y)
    return sheet
