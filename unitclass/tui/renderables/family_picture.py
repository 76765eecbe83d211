"""A type's family: the band its profiles fill, some of them as curves."""

from __future__ import annotations

import numpy as np

from unitclass.records import FloatArray
from unitclass.tui.renderables.axis import CycleAxis, axis_rows
from unitclass.tui.renderables.glyphs import COLOUR, Look
from unitclass.tui.renderables.histogram import put_level
from unitclass.tui.renderables.sheet import Sheet

Band = tuple[FloatArray, FloatArray, FloatArray]
"""Lower edge, middle and upper edge of a family, shares of the peak, shape (n_bins,) each."""


def family_picture(band: Band, ti_s: float, te_s: float, width: int, height: int, *,
                   look: Look = COLOUR) -> Sheet:
    """Draw a family's band and its middle."""
    low, middle, high = band
    sheet = Sheet(width, height, look)
    gutter = 6
    axis = CycleAxis.for_durations(width - gutter, ti_s, te_s)
    rows = max(1, height - 3)
    picture = Sheet(axis.n_columns, rows, look)
    if middle.size:
        bottom, top = axis.mean(low) * rows, axis.mean(high) * rows
        for x in range(axis.n_columns):
            if np.isfinite(top[x]):
                _put_band(picture, x, float(bottom[x]), float(top[x]))
        picture.shade(0, 0, axis.n_inspiration, rows)
        for x, level in enumerate(axis.mean(middle) * rows):
            if np.isfinite(level):
                put_level(picture, x, float(level), x < axis.n_inspiration)
    sheet.paste(picture, gutter, 0)
    sheet.right(gutter - 1, 0, "peak", "axis")
    sheet.right(gutter - 1, rows - 1, "0", "axis")
    sheet.paste(axis_rows(axis, look=look), gutter, rows)
    return sheet


def _put_band(sheet: Sheet, x: int, low: float, high: float) -> None:
    for row in range(int(low), min(int(np.ceil(high)), sheet.height)):
        sheet.cells[sheet.height - 1 - row][x] = sheet.look.glyphs.band
