"""The page of a condition's cycles: trace, bursts, the chosen cycle, and what was found in words."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from unitclass.records import Envelope
from unitclass.tui.renderables.glyphs import COLOUR, Look
from unitclass.tui.renderables.sheet import Sheet
from unitclass.tui.renderables.trace import Burst, TraceWindow, burst_rows, time_axis, trace_rows
from unitclass.tui.renderables.words import shortened

GUTTER = 9
COLUMNS_PER_CYCLE = 9


@dataclass(frozen=True)
class CyclesView:
    """What the cycles screen shows: the envelopes, reference first, and all cycles found.

    `threshold` is the level in force or asked for, in the envelope's unit; `tops` are the values
    at which the envelopes' pictures end.
    """

    envelopes: tuple[Envelope, ...]
    bursts: tuple[Burst, ...]
    threshold: float
    tops: tuple[float, ...] = ()
    lines: tuple[tuple[str, str], ...] = ()


def cycle_rows(view: CyclesView, window: TraceWindow, height: int, *, look: Look = COLOUR) -> Sheet:
    """Draw the reference's trace with threshold and bursts, then other nerves, time and words."""
    sheet = Sheet(window.n_columns + GUTTER, height, look)
    if not view.envelopes:
        sheet.put(0, 0, "no nerve trace is kept for this condition", "warn")
        return sheet
    n_words = min(len(view.lines), 1 if height < 12 else height // 4)
    others = view.envelopes[1 : 1 + (1 if height >= 24 else 0) + (1 if height >= 36 else 0)]
    rows = max(2, height - 5 - n_words - 4 * len(others))
    tops = (*view.tops, *(np.nan for _ in view.envelopes))
    y = _put_trace(sheet, window, view.envelopes[0], tops[0], view.threshold, 0, rows)
    sheet.paste(burst_rows(window, view.bursts, look=look), GUTTER, y)
    sheet.right(GUTTER - 1, y, "bursts", "axis")
    y += 3
    for envelope, top in zip(others, tops[1:], strict=False):
        y = _put_trace(sheet, window, envelope, top, np.nan, y, 4)
    sheet.paste(time_axis(window, look=look), GUTTER, y)
    sheet.right(GUTTER - 1, y + 1, "time", "axis")
    for i, (text, ink) in enumerate(view.lines[:n_words]):
        sheet.put(0, y + 2 + i, shortened(text, sheet.width, look), ink)
    return sheet


def _put_trace(sheet: Sheet, window: TraceWindow, envelope: Envelope, top: float, threshold: float, y: int,
               height: int) -> int:
    first = max(0, int((window.start_s - envelope.start_s) * envelope.rate_hz))
    stop = max(first, int((window.stop_s - envelope.start_s) * envelope.rate_hz) + 2)
    values, look = envelope.values[first:stop], sheet.look
    times_s = envelope.start_s + (first + np.arange(values.size)) / envelope.rate_hz
    picture, top = trace_rows(window, times_s, values, threshold, height, top=top, look=look)
    sheet.paste(picture, GUTTER, y)
    sheet.right(GUTTER - 1, y, f"{top:.2g}", "axis")
    sheet.right(GUTTER - 1, y + 1, shortened(envelope.unit, GUTTER - 1, look), "axis")
    sheet.right(GUTTER - 1, y + height - 1, shortened(envelope.name, GUTTER - 1, look), "axis")
    return y + height


def window_around(bursts: Sequence[Burst], here: int, n_columns: int) -> TraceWindow:
    """Return a window of whole cycles that holds cycle `here`; it stays while one steps inside it."""
    n_shown = max(2, n_columns // COLUMNS_PER_CYCLE)
    first = here // n_shown * n_shown
    last = min(first + n_shown, len(bursts)) - 1
    start = bursts[first].start_s
    stop = bursts[last].end_s if np.isfinite(bursts[last].end_s) else bursts[last].start_s + 1.0
    margin = 0.03 * (stop - start)
    return TraceWindow(start - margin, stop + margin, n_columns)
