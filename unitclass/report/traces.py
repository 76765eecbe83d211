"""Traces over time in a figure: as recorded, integrated, and the bar that gives their height a unit."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from unitclass.records import Envelope, FloatArray
from unitclass.report.stretch import Trace
from unitclass.report.style import SERIES, nice_length, quantity, scale_bar

if TYPE_CHECKING:
    from matplotlib.axes import Axes


def draw_trace(axes: Axes, trace: Trace, words: str, color: str) -> None:
    """Draw a trace as recorded; the axes' limits in time are set before."""
    axes.fill_between(trace.times_s, trace.low, trace.high, color=color, linewidth=0.3)
    _finish(axes, words, trace.low, trace.high, trace.unit)


def draw_envelope(axes: Axes, envelope: Envelope, start_s: float, stop_s: float) -> FloatArray:
    """Draw an integrated nerve and return the values shown; the axes' limits in time are set before."""
    times_s, values = within(envelope, start_s, stop_s)
    axes.plot(times_s, values, color=SERIES[0])
    _finish(axes, f"\u222b {envelope.name}", values, values, envelope.unit)
    return values


def within(envelope: Envelope, start_s: float, stop_s: float) -> tuple[FloatArray, FloatArray]:
    """Return an envelope's times and values in a stretch."""
    inside = (envelope.times_s >= start_s) & (envelope.times_s < stop_s)
    return envelope.times_s[inside], envelope.values[inside]


def _finish(axes: Axes, words: str, low: FloatArray, high: FloatArray, unit: str) -> None:
    axes.set_ylabel(words, rotation=0, ha="right", va="center")
    if not np.isfinite(high).any():
        return
    length = nice_length(2 * float(np.nanmax(high) - np.nanmin(low)))
    scale_bar(axes, length, quantity(length, unit), at=(axes.get_xlim()[1], float(np.nanmin(low))), is_vertical=True)
