"""Heat-map rows: one unit's rate over the cycle as shades from nothing to its own maximum."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike

from unitclass.tui.renderables.axis import CycleAxis
from unitclass.tui.renderables.glyphs import COLOUR, Look
from unitclass.tui.renderables.sheet import Sheet


def heat_row(axis: CycleAxis, rate_hz: ArrayLike, *, look: Look = COLOUR) -> Sheet:
    """Draw one row: each column's rate as a share of the unit's greatest, in five shades.

    `rate_hz` has shape (n_bins,), NaN where nothing was observed. A silent unit is an empty row.
    """
    sheet = Sheet(axis.n_columns, 1, look)
    rate = np.nan_to_num(axis.mean(rate_hz))
    top = float(rate.max())
    if top > 0:
        shades = look.glyphs.heat
        steps = np.ceil(rate / top * (len(shades) - 1) - 0.5).astype(int)
        sheet.cells[0] = [shades[step] for step in steps.tolist()]
    if look.has_colour:
        sheet.shade(0, 0, axis.n_inspiration, 1)
    return sheet
