"""Mean integrated nerves over the cycle, one filled curve each."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike

from unitclass.tui.renderables.axis import CycleAxis
from unitclass.tui.renderables.glyphs import COLOUR, Look
from unitclass.tui.renderables.histogram import partial
from unitclass.tui.renderables.sheet import Sheet


def nerve_rows(axis: CycleAxis, mean: ArrayLike, height: int, *, look: Look = COLOUR) -> Sheet:
    """Draw a nerve's mean envelope, shape (n_bins,), filled from its own least to its greatest value.

    Nerve amplitudes are in arbitrary units that differ from nerve to nerve, so each has its own
    scale; a flat or unknown envelope stays empty.
    """
    sheet = Sheet(axis.n_columns, height, look)
    values = axis.mean(mean)
    known = values[np.isfinite(values)]
    span = float(known.max() - known.min()) if known.size else 0.0
    if span > 0:
        put_filled(sheet, (values - known.min()) / span * height)
    sheet.shade(0, 0, axis.n_inspiration, height)
    return sheet


def put_filled(sheet: Sheet, levels: ArrayLike) -> None:
    """Fill each column from the bottom to a level in rows, shape (width,); NaN stays empty."""
    glyphs, height = sheet.look.glyphs, sheet.height
    for x, level in enumerate(np.asarray(levels, dtype=float).tolist()):
        if level != level:
            continue
        whole = min(int(level + 1e-9), height)
        for row in range(whole):
            sheet.cells[height - 1 - row][x] = glyphs.levels[-1]
        if whole < height:
            sheet.cells[height - 1 - whole][x] = partial(glyphs.levels, level - whole)
