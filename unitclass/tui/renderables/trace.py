"""A stretch of a nerve's envelope with its detected bursts, threshold and the cycles left out."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from unitclass.records import FloatArray
from unitclass.tui.renderables.glyphs import COLOUR, Look
from unitclass.tui.renderables.histogram import round_up
from unitclass.tui.renderables.nerves import put_filled
from unitclass.tui.renderables.sheet import Sheet, width_of


@dataclass(frozen=True)
class Burst:
    """One detected burst: `start_s` to `stop_s` of inspiration, `end_s` of the whole cycle."""

    start_s: float
    stop_s: float
    end_s: float
    is_accepted: bool = True
    kind: str = "breath"
    is_here: bool = False


@dataclass(frozen=True)
class TraceWindow:
    """The stretch of time that is drawn."""

    start_s: float
    stop_s: float
    n_columns: int

    def column_of(self, time_s: float) -> int:
        """Return the column a moment falls in; may lie outside the picture."""
        return int(np.floor((time_s - self.start_s) / (self.stop_s - self.start_s) * self.n_columns))


def trace_rows(window: TraceWindow, times_s: ArrayLike, values: ArrayLike, threshold: float, height: int, *,
               top: float = np.nan, look: Look = COLOUR) -> tuple[Sheet, float]:
    """Draw the envelope, arrays of shape (n_samples,), as its greatest value per column.

    Returns the sheet and the value at its upper edge; the threshold is a dashed line over all.
    """
    sheet = Sheet(window.n_columns, height, look)
    peaks = _peaks(window, np.asarray(times_s, dtype=float), np.asarray(values, dtype=float))
    if not np.isfinite(top):
        known = peaks[np.isfinite(peaks)]
        top = round_up(float(known.max()) if known.size else 1.0)
    put_filled(sheet, np.clip(peaks / top * height, 0, height))
    if np.isfinite(threshold) and 0 <= threshold <= top:
        y = sheet.height - 1 - min(int(threshold / top * height), height - 1)
        for x in range(sheet.width):
            sheet.cell(x, y, look.glyphs.threshold, "fit")
    return sheet, top


def _peaks(window: TraceWindow, times_s: FloatArray, values: FloatArray) -> FloatArray:
    edges = np.linspace(window.start_s, window.stop_s, window.n_columns + 1)
    places = np.searchsorted(times_s, edges)
    peaks = np.full(window.n_columns, np.nan)
    for x in range(window.n_columns):
        part = values[places[x] : places[x + 1]]
        part = part[np.isfinite(part)]
        if part.size:
            peaks[x] = part.max()
    return peaks


def burst_rows(window: TraceWindow, bursts: Sequence[Burst], *, look: Look = COLOUR) -> Sheet:
    """Draw the bursts under a trace: a bar each (crosses when left out), its kind, and a pointer.

    Three rows: bars, kinds of those that are not plain breaths, a pointer at the chosen cycle.
    """
    sheet = Sheet(window.n_columns, 3, look)
    for burst in bursts:
        start = window.column_of(burst.start_s)
        stop = window.column_of(burst.stop_s) if np.isfinite(burst.stop_s) else start
        char = look.glyphs.burst if burst.is_accepted else look.glyphs.left_out
        for x in range(max(start, 0), min(stop, window.n_columns - 1) + 1):
            sheet.cell(x, 0, char, "burst" if burst.is_accepted else "warn")
        if burst.kind != "breath" and start >= 0:
            room = window.column_of(burst.end_s) - start - 1 if np.isfinite(burst.end_s) else 8
            word = burst.kind if width_of(burst.kind) <= room else burst.kind[:max(1, room)]
            sheet.put(start, 1, word, "warn")
        if burst.is_here:
            sheet.put(start, 2, "^", "strong")
    return sheet


def time_axis(window: TraceWindow, *, look: Look = COLOUR) -> Sheet:
    """Draw a ruler in seconds of the session clock, ticks at round times."""
    sheet = Sheet(window.n_columns, 2, look)
    sheet.put(0, 0, look.glyphs.rule * window.n_columns, "axis")
    step = round_up((window.stop_s - window.start_s) * 10 / max(window.n_columns, 10))
    tick = np.ceil(window.start_s / step) * step
    while tick < window.stop_s:
        x = window.column_of(float(tick))
        sheet.cell(x, 0, look.glyphs.tick, "axis")
        words = f"{tick + 0.0:g}"
        if x + len(words) < window.n_columns - 2:
            sheet.put(x, 1, words, "axis")
        tick += step
    sheet.right(window.n_columns, 1, "s", "axis")
    return sheet
