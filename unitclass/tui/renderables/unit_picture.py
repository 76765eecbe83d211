"""One unit on one cycle axis: nerves, phase histogram with the family, raster, membrane potential."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from unitclass.records import FloatArray, NerveProfile, UnitResult
from unitclass.tui.renderables.axis import CycleAxis, axis_rows
from unitclass.tui.renderables.glyphs import COLOUR, Look
from unitclass.tui.renderables.histogram import Bars, histogram_rows
from unitclass.tui.renderables.membrane import membrane_rows
from unitclass.tui.renderables.nerves import nerve_rows
from unitclass.tui.renderables.raster import raster_rows, shown_cycles
from unitclass.tui.renderables.sheet import Sheet
from unitclass.tui.renderables.words import shortened

AXIS_ROWS = 3


@dataclass(frozen=True)
class Rows:
    """How many rows of the screen each part of the picture gets; 0 leaves it out."""

    nerve: int
    n_nerves: int
    histogram: int
    legend: int
    raster: int
    membrane: int
    axis: int

    @staticmethod
    def share(height: int, n_nerves: int, has_membrane: bool, n_cycles: int = 400) -> Rows:
        """Return the division of `height` rows: the histogram first, then what there is room for."""
        if height < 12:
            return Rows(0, 0, max(0, height - 2), 0, 0, 0, min(2, height))
        left = height - AXIS_ROWS - 1
        shown = min(n_nerves, 2 if height < 30 else 4)
        nerve = max(1, round(left * (0.1 if has_membrane else 0.24) / max(shown, 1))) if shown else 0
        nerve = min(nerve, 6)
        left -= nerve * shown
        membrane = max(3, round(left * 0.36)) if has_membrane else 0
        raster = min(max(2, round((left - membrane) * 0.36)), max(2, -(-n_cycles // 4)))
        return Rows(nerve, shown, left - membrane - raster, 1, raster, membrane, AXIS_ROWS)


def unit_picture(unit: UnitResult, nerves: Sequence[NerveProfile], ti_s: float, te_s: float, width: int,
                 height: int, *, family: str = "", top_hz: float = 0.0, n_nerves: int = 0,
                 look: Look = COLOUR) -> Sheet:
    """Draw the unit; `family` names the fitted family (empty draws none: blind, or a state).

    `ti_s` and `te_s` are mean durations in seconds; `top_hz` fixes the histogram's scale, so that
    pictures beside each other compare (0 chooses one), and `n_nerves` the room for nerves.
    """
    sheet = Sheet(width, height, look)
    gutter = gutter_of(width)
    axis = CycleAxis.for_durations(width - gutter, ti_s, te_s)
    rows = Rows.share(height, max(len(nerves), n_nerves), unit.vm is not None, unit.raster.n_cycles)
    _put_nerves(sheet, axis, nerves[: rows.n_nerves], rows.nerve, gutter)
    y = rows.nerve * rows.n_nerves
    bars = bars_of(unit, axis, with_fit=bool(family))
    y = _put_histogram(sheet, axis, bars, top_hz or bars.top_hz, y, rows.histogram, gutter)
    if rows.legend:
        sheet.put(gutter, y, shortened(_legend(look, family), axis.n_columns, look), "quiet")
        y += 1
    y = _put_raster(sheet, axis, unit, y, rows.raster, gutter)
    y = _put_membrane(sheet, axis, unit, y, rows.membrane, gutter)
    ruler = axis_rows(axis, look=look)
    sheet.paste(ruler, gutter, y)
    if rows.axis == AXIS_ROWS:
        sheet.right(gutter - 1, y + 1, "phase", "axis")
    return sheet


def gutter_of(width: int) -> int:
    """Return how many columns the labels at the left take."""
    return 9 if width >= 64 else 7


def bars_of(unit: UnitResult, axis: CycleAxis, *, with_fit: bool) -> Bars:
    """Return what the unit's histogram shows on an axis."""
    histogram = unit.histogram
    fit: FloatArray = unit.suggestion.fitted_rate_hz if with_fit else np.zeros(0)
    return Bars.of(axis, histogram.counts, histogram.exposure_s, histogram.low_hz, histogram.high_hz, fit)


def _put_nerves(sheet: Sheet, axis: CycleAxis, nerves: Sequence[NerveProfile], height: int,
                gutter: int) -> None:
    for place, nerve in enumerate(nerves):
        y = place * height
        sheet.paste(nerve_rows(axis, nerve.mean, height, look=sheet.look), gutter, y)
        sheet.right(gutter - 1, y + height - 1, shortened(nerve.name, gutter - 1, sheet.look), "axis")


def _put_histogram(sheet: Sheet, axis: CycleAxis, bars: Bars, top_hz: float, y: int, height: int,
                   gutter: int) -> int:
    sheet.paste(histogram_rows(axis, bars, height, top_hz, look=sheet.look), gutter, y)
    sheet.right(gutter - 1, y, f"{top_hz:g}", "axis")
    if height > 2:
        sheet.right(gutter - 1, y + 1, "spikes/s" if gutter >= 9 else "sp/s", "axis")
    sheet.right(gutter - 1, y + height - 1, "0", "axis")
    for row in range(height):
        sheet.put(gutter - 1, y + row, sheet.look.glyphs.junction if row in (0, height - 1)
                  else sheet.look.glyphs.upright, "axis")
    return y + height


def _legend(look: Look, family: str) -> str:
    glyphs = look.glyphs
    limits = f"{glyphs.doubtful}{glyphs.whisker} 95 % limits"
    return f"{glyphs.fit[1]} {family} as fitted  {limits}" if family else limits


def _put_raster(sheet: Sheet, axis: CycleAxis, unit: UnitResult, y: int, height: int, gutter: int) -> int:
    if not height:
        return y
    raster = unit.raster
    sheet.paste(raster_rows(axis, raster.phase, raster.row, raster.n_cycles, height, look=sheet.look),
                gutter, y)
    n_rows = height * (4 if sheet.look.glyphs.has_braille else 1)
    n_shown = shown_cycles(raster.n_cycles, n_rows).size
    words = ["cycles", f"{n_shown}", f"of {raster.of_cycles}"]
    for row, word in enumerate(words[:height] if height >= 3 else [f"{n_shown}cyc"]):
        sheet.right(gutter - 1, y + row, word, "axis")
    return y + height


def _put_membrane(sheet: Sheet, axis: CycleAxis, unit: UnitResult, y: int, height: int, gutter: int) -> int:
    if not height or unit.vm is None:
        return y
    vm = unit.vm
    picture = membrane_rows(axis, vm.mean_mv, vm.sd_mv, vm.reference_mv, height, look=sheet.look)
    sheet.paste(picture.sheet, gutter, y)
    if np.isfinite(picture.top_mv):
        sheet.right(gutter - 1, y, f"{picture.top_mv:g}", "axis")
        sheet.right(gutter - 1, y + height - 1, f"{picture.bottom_mv:g}", "axis")
    sheet.right(gutter - 1, y + 1, "Vm mV", "axis")
    return y + height
