"""The figure of cycle detection: trace, envelope, threshold, phases, tags."""

from __future__ import annotations

from itertools import groupby
from typing import TYPE_CHECKING

import numpy as np

from unitclass.io.table_files import Cell
from unitclass.io.tables import number
from unitclass.records import ConditionResult, Cycles, IntArray, Recording
from unitclass.report.saving import Drawn
from unitclass.report.stretch import trace_of, usual_stretch
from unitclass.report.style import (
    FAMILY,
    FIRING,
    GREY,
    INK,
    INSPIRATION,
    MM,
    TWO_COLUMNS,
    bare,
    drawing,
    new_figure,
    nice_length,
    scale_bar,
)
from unitclass.report.traces import draw_envelope, draw_trace, within

if TYPE_CHECKING:
    from matplotlib.axes import Axes


def cycles_figure(recording: Recording, condition: ConditionResult, span_s: tuple[float, float] | None = None) -> Drawn:
    """Return the detection of cycles over a stretch: trace, envelope, threshold, phases, tags.

    Parameters
    ----------
    span_s : tuple of float, optional
        Start and end on the session clock; a dozen cycles near the middle by default.
    """
    cycles = condition.nerve_cycles.cycles
    start, stop = span_s or usual_stretch(cycles, 12)
    signal = next((s for s in recording.nerves if s.name == condition.nerve), None)
    with drawing():
        figure = new_figure(TWO_COLUMNS, 66 * MM)
        upper, lower = figure.subplots(2, 1, sharex=True)
        for axes in (upper, lower):
            bare(axes)
        rows: list[dict[str, Cell]] = []
        if start == start and signal is not None and condition.nerve_cycles.envelopes:
            upper.set_xlim(start, stop)
            draw_trace(upper, trace_of(signal, start, stop), signal.name, GREY)
            rows = _draw_detection(lower, condition, start, stop)
        name = condition.condition.name or "whole session"
        figure.suptitle(f"cycles of {condition.nerve}, {name}", x=0.01, ha="left", fontsize=8)
    return Drawn(figure, f"Detection of cycles on {condition.nerve}, {name}: the nerve as recorded; its envelope with the "
                 "level at which a burst counts (dashed); shaded, inspiration; triangles, its onset and end; a line "
                 "above, cycles that no histogram uses, with the reason.", rows)


def _draw_detection(axes: Axes, condition: ConditionResult, start_s: float, stop_s: float) -> list[dict[str, Cell]]:
    nerve_cycles = condition.nerve_cycles
    envelope, cycles = nerve_cycles.envelopes[0], nerve_cycles.cycles
    values = draw_envelope(axes, envelope, start_s, stop_s)
    if np.isfinite(nerve_cycles.threshold):
        axes.axhline(nerve_cycles.threshold, color=FAMILY, linestyle="--", linewidth=0.6)
    top, low = float(np.nanmax(values)), float(np.nanmin(values))
    shown = np.flatnonzero((cycles.end_s > start_s) & (cycles.onset_s < stop_s))
    for i in shown:
        _draw_one_cycle(axes, cycles, int(i), low, top)
    _draw_tags(axes, cycles, shown, (start_s, stop_s), top + 0.06 * (top - low))
    axes.set_ylim(low - 0.25 * (top - low), top + 0.12 * (top - low))
    length = nice_length(stop_s - start_s)
    scale_bar(axes, length, f"{length:g} s", at=(stop_s - length, low - 0.22 * (top - low)))
    return [{"time_s": float(t), "envelope": number(v), "unit": envelope.unit}
            for t, v in zip(*within(envelope, start_s, stop_s), strict=True)]


def _draw_one_cycle(axes: Axes, cycles: Cycles, i: int, low: float, top: float) -> None:
    onset, offset = float(cycles.onset_s[i]), float(cycles.offset_s[i])
    axes.plot([onset], [low - 0.06 * (top - low)], "^", color=FIRING, markersize=2.5)
    if offset == offset:
        axes.axvspan(onset, offset, color=INSPIRATION, linewidth=0, zorder=0)
        axes.plot([offset], [low - 0.06 * (top - low)], "v", color=FIRING, markersize=2.5, fillstyle="none")


def _draw_tags(axes: Axes, cycles: Cycles, shown: IntArray, span_s: tuple[float, float], height: float) -> None:
    """Write each tag once over the cycles in a row that carry it; a line marks cycles that no histogram uses."""
    for tag, run in groupby(shown.tolist(), key=lambda i: tag_of(cycles, i)):
        mine = list(run)
        start, stop = max(float(cycles.onset_s[mine[0]]), span_s[0]), min(float(cycles.end_s[mine[-1]]), span_s[1])
        if not cycles.accepted[mine[0]]:
            axes.plot([start, stop], [height] * 2, color=INK, linewidth=0.8, solid_capstyle="butt")
        if tag:
            axes.annotate(tag.split(":")[0], (start, height), xytext=(0, 2), textcoords="offset points", fontsize=5.5,
                          rotation=20, ha="left", va="bottom", annotation_clip=False)


def tag_of(cycles: Cycles, i: int) -> str:
    """Return a cycle's tag in words; whether it is used is part of it, "" for a plain breath in use."""
    words = (cycles.reason[i] or (cycles.kind[i] if cycles.kind[i] != "breath" else "")).split(":")[0]
    return words or ("" if cycles.accepted[i] else "not used")
