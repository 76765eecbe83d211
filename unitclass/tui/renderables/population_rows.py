"""The population: every unit's profile as one heat-map row, grouped by type, in order of phase."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from unitclass.review.entry import QueueEntry
from unitclass.tui.renderables.axis import CycleAxis, axis_rows
from unitclass.tui.renderables.bars import in_words
from unitclass.tui.renderables.glyphs import COLOUR, Look
from unitclass.tui.renderables.heat import heat_row
from unitclass.tui.renderables.queue_rows import mark_of, page_start
from unitclass.tui.renderables.sheet import Sheet
from unitclass.tui.renderables.words import shortened


@dataclass(frozen=True)
class HeatEntry:
    """One unit of the population and its rate by phase, shape (n_bins,)."""

    entry: QueueEntry
    rate_hz: NDArray[np.float32]


Line = tuple[str, int] | int
"""A heading with its number of units, or the place of a unit among the entries."""


def population_rows(groups: Sequence[tuple[str, Sequence[HeatEntry]]], here: int, ti_s: float, te_s: float,
                    width: int, height: int, *, look: Look = COLOUR) -> Sheet:
    """Draw the page of the population that holds unit number `here` (counted over all groups).

    Each group is (type, its units in the order to show). A row reads: state, unit, profile, shape
    group, probability.
    """
    sheet = Sheet(width, height, look)
    units = [unit for _, members in groups for unit in members]
    if not units:
        sheet.put(0, 0, "no units to show", "quiet")
        return sheet
    name_room = min(14, max(6, width // 6))
    axis = CycleAxis.for_durations(width - name_room - 13, ti_s, te_s)
    lines = population_lines([(name, len(members)) for name, members in groups])
    first = page_start(lines.index(here), max(1, height - 4))
    for y, line in enumerate(lines[first : first + height - 4]):
        if isinstance(line, tuple):
            sheet.put(0, y, f"{line[0]}  {line[1]}", "title")
        else:
            _put_unit(sheet, y, units[line], line == here, axis, name_room)
    sheet.paste(axis_rows(axis, look=look), name_room + 3, height - 3)
    sheet.put(name_room + 4 + axis.n_columns, height - 4, "group  p", "quiet")
    return sheet


def population_lines(groups: Sequence[tuple[str, int]]) -> list[Line]:
    """Return the rows in order: a heading before each group that has members."""
    lines: list[Line] = []
    n = 0
    for name, count in groups:
        if count:
            lines.append((name, count))
            lines.extend(range(n, n + count))
            n += count
    return lines


def _put_unit(sheet: Sheet, y: int, unit: HeatEntry, is_here: bool, axis: CycleAxis, name_room: int) -> None:
    look = sheet.look
    if is_here:
        sheet.put(0, y, look.glyphs.here, "strong")
    if (mark := mark_of(unit.entry, look)) != " ":
        sheet.put(1, y, mark, "good" if unit.entry.state == "reviewed" else "warn")
    sheet.put(2, y, shortened(unit.entry.unit, name_room, look), "strong" if is_here else "")
    sheet.paste(heat_row(axis, unit.rate_hz, look=look), name_room + 3, y)
    x = name_room + 4 + axis.n_columns
    sheet.put(x, y, shortened(unit.entry.shape_group, 3, look), "strong")
    sheet.put(x + 4, y, in_words(unit.entry.probability), "")
