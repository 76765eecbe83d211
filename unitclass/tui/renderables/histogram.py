"""The phase histogram: rate by phase as bars to scale, its confidence limits, the fitted family."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from unitclass.records import FloatArray
from unitclass.tui.renderables.axis import CycleAxis
from unitclass.tui.renderables.glyphs import COLOUR, Look
from unitclass.tui.renderables.sheet import Sheet


@dataclass(frozen=True)
class Bars:
    """What a histogram picture shows; arrays over the columns of its axis, (n_columns,)."""

    rate_hz: FloatArray
    low_hz: FloatArray
    high_hz: FloatArray
    fit_hz: FloatArray

    @staticmethod
    def of(axis: CycleAxis, counts: ArrayLike, exposure_s: ArrayLike, low_hz: ArrayLike,
           high_hz: ArrayLike, fit_hz: ArrayLike = ()) -> Bars:
        """Return the columns' values from the histogram's bins, arrays of shape (n_bins,).

        Limits and fit are means over the bins under a column, weighted by exposure, so a column
        that holds several bins shows limits that are too wide rather than too narrow. An empty
        `fit_hz` draws no family.
        """
        fit = axis.mean(fit_hz, exposure_s) if np.size(fit_hz) == np.size(counts) else None
        return Bars(axis.rate(counts, exposure_s), axis.mean(low_hz, exposure_s),
                    axis.mean(high_hz, exposure_s),
                    np.full(axis.n_columns, np.nan) if fit is None else fit)

    @property
    def top_hz(self) -> float:
        """Return a round number at or above all bars and the fit, and most limits."""
        tallest = max(_largest(self.rate_hz), _largest(self.fit_hz))
        return round_up(max(tallest, min(_largest(self.high_hz), 1.25 * tallest)))


def round_up(value: float) -> float:
    """Return the smallest of 1, 1.2, 1.5, 2, ... 8, 10 x 10^n at or above `value` (1 for nothing)."""
    if not np.isfinite(value) or value <= 0:
        return 1.0
    scale = 10.0 ** np.floor(np.log10(value))
    for step in (1, 1.2, 1.5, 2, 2.5, 3, 4, 5, 6, 8, 10):
        if step * scale >= value * (1 - 1e-9):
            return float(step * scale)
    return float(10 * scale)


def histogram_rows(axis: CycleAxis, bars: Bars, height: int, top_hz: float, *, look: Look = COLOUR) -> Sheet:
    """Draw bars to scale: full height is `top_hz`, one row is `top_hz / height`.

    Below its lower confidence limit a bar is solid, from there to the estimate it is of the
    doubtful character; a whisker reaches to the upper limit. The fitted family's curve lies over
    all in its own character, at the height of the fitted rate.
    """
    sheet = Sheet(axis.n_columns, height, look)
    scale = height / top_hz if top_hz > 0 else 0.0
    for x in range(axis.n_columns):
        rate = bars.rate_hz[x] * scale
        if np.isfinite(rate):
            _put_bar(sheet, x, rate, bars.low_hz[x] * scale)
            _put_whisker(sheet, x, rate, bars.high_hz[x] * scale)
    sheet.shade(0, 0, axis.n_inspiration, height)
    for x in range(axis.n_columns):
        if np.isfinite(bars.fit_hz[x]):
            put_level(sheet, x, bars.fit_hz[x] * scale, x < axis.n_inspiration)
    return sheet


def _put_bar(sheet: Sheet, x: int, rate: float, low: float) -> None:
    glyphs, height = sheet.look.glyphs, sheet.height
    whole = int(min(rate, height) + 1e-9)
    for row in range(whole):
        char = glyphs.doubtful if np.isfinite(low) and row + 0.5 > low else glyphs.sure
        sheet.cells[height - 1 - row][x] = char
    if whole < height:
        sheet.cells[height - 1 - whole][x] = partial(glyphs.levels, rate - whole)


def partial(levels: str, share: float) -> str:
    """Return the character that fills `share` (0 to 1) of a cell, to the nearest step."""
    return levels[round(min(max(share, 0.0), 1.0) * (len(levels) - 1))]


def _put_whisker(sheet: Sheet, x: int, rate: float, high: float) -> None:
    if not np.isfinite(high):
        return
    glyphs, height = sheet.look.glyphs, sheet.height
    first = int(np.ceil(min(rate, height) - 0.02))
    last = int(np.floor(min(high, height) - 0.5))
    for row in range(first, last + 1):
        sheet.cells[height - 1 - row][x] = glyphs.whisker
    if high > height + 0.5 and rate < height - 1:
        sheet.cells[0][x] = glyphs.beyond


def put_level(sheet: Sheet, x: int, level: float, is_shaded: bool = False, ink: str = "fit") -> None:
    """Mark a height in rows from the bottom with the third of the cell it falls in."""
    level = min(max(level, 0.0), sheet.height - 1e-6)
    row, third = int(level), int((level - int(level)) * 3)
    shaded = "+" if is_shaded and sheet.look.has_colour else ""
    sheet.cell(x, sheet.height - 1 - row, sheet.look.glyphs.fit[third], ink + shaded)


def _largest(values: FloatArray) -> float:
    known = values[np.isfinite(values)]
    return float(known.max()) if known.size else 0.0
