"""Mean membrane potential over the cycle, spikes removed, with its spread between cycles."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from unitclass.records import FloatArray
from unitclass.tui.renderables.axis import CycleAxis
from unitclass.tui.renderables.glyphs import COLOUR, Look
from unitclass.tui.renderables.histogram import put_level
from unitclass.tui.renderables.raster import joined_dots, put_dots
from unitclass.tui.renderables.sheet import Sheet


@dataclass(frozen=True)
class MembranePicture:
    """The drawn curve and the potentials, in mV, of its upper and lower edge."""

    sheet: Sheet
    top_mv: float
    bottom_mv: float


def membrane_rows(axis: CycleAxis, mean_mv: ArrayLike, sd_mv: ArrayLike, reference_mv: float, height: int,
                  *, look: Look = COLOUR) -> MembranePicture:
    """Draw the mean as a line, mean ± SD as sparse dots, and the cell's own mean as a dashed line.

    Arrays have shape (n_bins,), in mV; the picture reaches from the least to the greatest of
    mean ± SD in whole millivolts.
    """
    sheet = Sheet(axis.n_columns, height, look)
    fine = CycleAxis(2 * axis.n_columns, 2 * axis.n_inspiration)
    mean, sd = fine.mean(mean_mv), np.nan_to_num(fine.mean(sd_mv))
    known = np.isfinite(mean)
    if not known.any():
        return MembranePicture(sheet, np.nan, np.nan)
    top = float(np.ceil((mean + sd)[known].max()))
    bottom = float(np.floor((mean - sd)[known].min()))
    top = max(top, bottom + 1)
    _put_reference(sheet, (reference_mv - bottom) / (top - bottom))
    share = (np.vstack([mean, mean + sd, mean - sd]) - bottom) / (top - bottom)
    if look.glyphs.has_braille:
        put_dots(sheet, _dots(share * (height * 4 - 1), height * 4))
    else:
        _put_letters(sheet, share[0, ::2] * height)
    sheet.shade(0, 0, axis.n_inspiration, height)
    return MembranePicture(sheet, top, bottom)


def _dots(levels: FloatArray, n_rows: int) -> np.ndarray:
    dots = joined_dots(levels[0], n_rows)
    every = np.arange(0, levels.shape[1], 4)
    for spread in levels[1:]:
        sparse = np.full(spread.size, np.nan)
        sparse[every] = spread[every]
        dots |= joined_dots(sparse, n_rows)
    return dots


def _put_letters(sheet: Sheet, levels: FloatArray) -> None:
    for x, level in enumerate(levels):
        if np.isfinite(level):
            put_level(sheet, x, float(level), ink="")


def _put_reference(sheet: Sheet, share: float) -> None:
    if np.isfinite(share) and 0 <= share <= 1:
        y = sheet.height - 1 - min(int(share * sheet.height), sheet.height - 1)
        for x in range(0, sheet.width, 2):
            sheet.cell(x, y, sheet.look.glyphs.threshold, "axis")
