"""Figures of a whole session: cycle detection, population, conditions side by side, changes, counts."""

from __future__ import annotations

from collections import Counter
from collections.abc import Mapping, Sequence
from itertools import groupby
from typing import TYPE_CHECKING

import numpy as np

from unitclass.analysis.changes import TypeChange
from unitclass.io.table_files import Cell
from unitclass.records import ConditionResult, Cycles, FloatArray, IntArray, Label, Recording, UnitResult
from unitclass.report.counts import TypeCount
from unitclass.report.saving import Drawn
from unitclass.report.stretch import Trace, trace_of, usual_stretch
from unitclass.report.style import (
    FAMILY,
    FIRING,
    GREY,
    HATCHES,
    INK,
    INSPIRATION,
    MM,
    ONE_COLUMN,
    PALE,
    SERIES,
    TWO_COLUMNS,
    above_axes,
    bare,
    drawing,
    new_figure,
    nice_length,
    quantity,
    scale_bar,
)
from unitclass.report.two_cycles import doubled, phase_axis, steps

if TYPE_CHECKING:
    from matplotlib.axes import Axes

LabelsOf = Mapping[tuple[str, str], Label]
NERVE_MM = 16
LEAST_MM = 1.6  # the height of rows that have room for their type's name


def type_of(unit: UnitResult, labels: LabelsOf) -> str:
    """Return what a person decided, else the suggestion."""
    label = labels.get(unit.key)
    return label.type if label is not None and label.type else unit.suggestion.type


# --------------------------------------------------------------------------------- cycles

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
            _draw_raw(upper, trace_of(signal, start, stop))
            upper.set_ylabel(signal.name, rotation=0, ha="right", va="center")
            rows = _draw_detection(lower, condition, start, stop)
            upper.set_xlim(start, stop)
        name = condition.condition.name or "whole session"
        figure.suptitle(f"cycles of {condition.nerve}, {name}", x=0.01, ha="left", fontsize=8)
    return Drawn(figure, f"Detection of cycles on {condition.nerve}, {name}: the nerve as recorded; its envelope with the "
                 "level at which a burst counts (dashed); shaded, inspiration; triangles, its onset and end; a line "
                 "above, cycles that no histogram uses, with the reason.", rows)


def _draw_raw(axes: Axes, trace: Trace) -> None:
    axes.fill_between(trace.times_s, trace.low, trace.high, color=GREY, linewidth=0.3)
    if np.isfinite(trace.low).any():
        length = nice_length(2 * float(np.nanmax(trace.high) - np.nanmin(trace.low)))
        scale_bar(axes, length, quantity(length, trace.unit), at=(float(trace.times_s[-1]), float(np.nanmin(trace.low))),
                  is_vertical=True)


def _draw_detection(axes: Axes, condition: ConditionResult, start_s: float, stop_s: float) -> list[dict[str, Cell]]:
    nerve_cycles = condition.nerve_cycles
    envelope, cycles = nerve_cycles.envelopes[0], nerve_cycles.cycles
    inside = (envelope.times_s >= start_s) & (envelope.times_s < stop_s)
    values = envelope.values[inside]
    axes.plot(envelope.times_s[inside], values, color=SERIES[0])
    if np.isfinite(nerve_cycles.threshold):
        axes.axhline(nerve_cycles.threshold, color=FAMILY, linestyle="--", linewidth=0.6)
    top, low = float(np.nanmax(values)), float(np.nanmin(values))
    shown = np.flatnonzero((cycles.end_s > start_s) & (cycles.onset_s < stop_s))
    for i in shown:
        _draw_one_cycle(axes, cycles, int(i), low, top)
    _draw_tags(axes, cycles, shown, (start_s, stop_s), top + 0.06 * (top - low))
    axes.set_ylabel(f"\u222b {envelope.name}", rotation=0, ha="right", va="center")
    axes.set_ylim(low - 0.25 * (top - low), top + 0.12 * (top - low))
    length = nice_length(stop_s - start_s)
    scale_bar(axes, length, f"{length:g} s", at=(stop_s - length, low - 0.22 * (top - low)))
    return [{"time_s": float(t), "envelope": None if v != v else float(v), "unit": envelope.unit}
            for t, v in zip(envelope.times_s[inside], values, strict=True)]


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


# ----------------------------------------------------------------------------- population

def population_figure(condition: ConditionResult, labels: LabelsOf, order: Sequence[str]) -> Drawn:
    """Return every unit's profile as one row, grouped by type, within it by the phase of its peak."""
    units = _sorted_units(condition.units, labels, order)
    with drawing():
        rows_mm = min(max(2.6 * len(units), 14), 192)
        figure = new_figure(TWO_COLUMNS, (NERVE_MM + 22 + rows_mm) * MM)
        nerve, heat = figure.subplots(2, 1, sharex=True, height_ratios=(NERVE_MM, rows_mm))
        _draw_nerves(nerve, condition)
        table = _scaled(units)
        if len(units):
            image = heat.imshow(doubled_rows(table), aspect="auto", extent=(0, 4, len(units), 0), cmap="Greys",
                                vmin=0, vmax=1, interpolation="nearest")
            bar = figure.colorbar(image, ax=[nerve, heat], shrink=min(0.6, 30 / (NERVE_MM + rows_mm)),
                                  location="right", pad=0.01, fraction=0.03, aspect=12, anchor=(0.0, 0.5), ticks=[0, 1])
            bar.ax.set_yticklabels(["0", "peak"])
            bar.set_label("rate")
            _type_brackets(heat, [type_of(u, labels) for u in units])
        for x in (1, 2, 3):
            heat.axvline(x, color=FAMILY, linewidth=0.5, linestyle=":" if x != 2 else "-")
        phase_axis(nerve, with_words=False)
        heat.set_xlim(0, 4)
        heat.set_xticks([0.5, 1.5, 2.5, 3.5], ["I", "E", "I", "E"])
        heat.tick_params(length=0)
        name = condition.condition.name or "whole session"
        n_units = f"{len(units)} unit" + ("" if len(units) == 1 else "s")
        figure.suptitle(f"{n_units}, {name}", x=0.01, ha="left", fontsize=8)
    return Drawn(figure, f"Profiles of {n_units} over two cycles, {name}: a row each, scaled to its highest "
                 "rate, grouped by type and sorted by the phase of the peak. Above, mean nerves.",
                 _population_rows(units, labels))


def _sorted_units(units: Sequence[UnitResult], labels: LabelsOf, order: Sequence[str]) -> list[UnitResult]:
    place = {name: i for i, name in enumerate(order)}
    firing = [u for u in units if u.n_spikes and np.isfinite(u.histogram.rate_hz).any()]
    return sorted(firing, key=lambda u: (place.get(type_of(u, labels), len(place)), type_of(u, labels), _peak(u)))


def _peak(unit: UnitResult) -> float:
    return float(np.nanargmax(unit.histogram.rate_hz))


def _scaled(units: Sequence[UnitResult]) -> FloatArray:
    rates = np.stack([u.histogram.rate_hz for u in units]) if units else np.zeros((0, 1))
    return np.asarray(rates / np.maximum(np.nanmax(rates, axis=1, keepdims=True), 1e-12)) if len(rates) else rates


def doubled_rows(table: FloatArray) -> FloatArray:
    """Return rows over one cycle twice."""
    return np.concatenate([table, table], axis=1)


def _draw_nerves(axes: Axes, condition: ConditionResult) -> None:
    for i, profile in enumerate(condition.nerve_profiles[:len(SERIES)]):
        mean = doubled(profile.mean)
        top = np.nanmax(mean) if np.isfinite(mean).any() else 1.0
        axes.plot((np.arange(mean.size) + 0.5) * (4.0 / mean.size), mean / max(float(top), 1e-300), color=SERIES[i],
                  linestyle=("-", "--", ":", "-.")[i % 4], label=profile.name)
    axes.set_yticks([])
    if condition.nerve_profiles:
        above_axes(axes, len(SERIES))


def _type_brackets(axes: Axes, names: Sequence[str]) -> None:
    """Write each type once beside its rows; where the rows are too low for a word, only the bracket."""
    axes.set_yticks([])
    counted = Counter(names)
    first = 0
    for name in dict.fromkeys(names):
        stop = first + counted[name]
        height_mm = axes.get_figure().get_figheight() / MM * 0.75 * counted[name] / len(names)  # type: ignore[union-attr]
        if height_mm >= LEAST_MM:
            axes.text(-0.05, (first + stop) / 2, f"{name} ({counted[name]})", ha="right", va="center", fontsize=6)
        axes.plot([-0.03, -0.03], [first + 0.1, stop - 0.1], color=INK, linewidth=0.8, clip_on=False)
        if stop < len(names):
            axes.axhline(stop, color=INK, linewidth=0.3)
        first = stop


def _population_rows(units: Sequence[UnitResult], labels: LabelsOf) -> list[dict[str, Cell]]:
    return [{"row": i, "unit": u.unit, "condition": u.condition, "type": type_of(u, labels),
             **{f"rate_hz_{k}": None if r != r else float(r) for k, r in enumerate(u.histogram.rate_hz)}}
            for i, u in enumerate(units)]


# ----------------------------------------------------------------------------- conditions

def conditions_figure(units: Sequence[UnitResult], labels: LabelsOf) -> Drawn:
    """Return one unit in all its conditions, side by side on one scale."""
    with drawing():
        figure = new_figure(max(ONE_COLUMN, 45 * MM * len(units)), 45 * MM)
        panels = figure.subplots(1, len(units), sharey=True, squeeze=False)[0]
        rows: list[dict[str, Cell]] = []
        for axes, unit in zip(panels, units, strict=True):
            steps(axes, unit.histogram.rate_hz, fill=True, color=PALE)
            steps(axes, unit.histogram.rate_hz, color=FIRING, linewidth=0.7)
            phase_axis(axes)
            axes.set_title(f"{unit.condition or 'whole session'}\n{type_of(unit, labels)}, {unit.n_spikes} spikes",
                           fontsize=7)
            rows += [{"condition": unit.condition, "phase": float(p), "rate_hz": None if r != r else float(r)}
                     for p, r in zip(unit.histogram.centres, unit.histogram.rate_hz, strict=True)]
        panels[0].set_ylabel("rate (spikes/s)")
        figure.suptitle(f"unit {units[0].unit}", x=0.01, ha="left", fontsize=8)
    return Drawn(figure, f"Unit {units[0].unit} in its conditions, rate by phase over two cycles.", rows)


# -------------------------------------------------------------------------------- changes

def changes_figure(changes: Sequence[TypeChange], before: str, after: str, order: Sequence[str]) -> Drawn:
    """Return the matrix of types before (rows) and after (columns), units counted."""
    mine = [c for c in changes if (c.condition_before, c.condition_after) == (before, after)]
    counted = Counter((c.type_before, c.type_after) for c in mine)
    rows = _ordered({a for a, _ in counted}, order)
    columns = _ordered({b for _, b in counted}, order)
    table = np.array([[counted[a, b] for b in columns] for a in rows], dtype=float).reshape(len(rows), len(columns))
    with drawing():
        figure = new_figure((35 + 9 * len(columns)) * MM, (28 + 6 * len(rows)) * MM)
        axes = figure.subplots()
        axes.imshow(table, cmap="Greys", vmin=0, vmax=max(float(table.max(initial=1)) * 1.6, 4), aspect="auto")
        for (i, j), n in np.ndenumerate(table):
            if n:
                axes.text(j, i, f"{int(n)}", ha="center", va="center", fontsize=7)
        axes.set_xticks(range(len(columns)), columns, rotation=60, ha="left", rotation_mode="anchor")
        axes.set_yticks(range(len(rows)), rows)
        axes.xaxis.tick_top()
        axes.tick_params(length=0)
        axes.set_ylabel(before)
        axes.set_xlabel(after)
        axes.xaxis.set_label_position("top")
    return Drawn(figure, f"Types of {len(mine)} units in {before} (rows) and in {after} (columns).",
                 [{"type_before": a, "type_after": b, "n_units": n} for (a, b), n in counted.items()])


def _ordered(names: set[str], order: Sequence[str]) -> list[str]:
    return [name for name in order if name in names] + sorted(names - set(order))


# --------------------------------------------------------------------------------- counts

def counts_figure(counts: Sequence[TypeCount], order: Sequence[str] = ()) -> Drawn:
    """Return the share of every type per animal and condition, with 95 % intervals."""
    groups = list(dict.fromkeys((c.animal, c.condition) for c in counts))
    types = _ordered({c.type for c in counts}, order)
    with drawing():
        figure = new_figure(TWO_COLUMNS, 62 * MM)
        axes = figure.subplots()
        width = 0.8 / max(len(groups), 1)
        for g, group in enumerate(groups):
            mine = {c.type: c for c in counts if (c.animal, c.condition) == group}
            x = [types.index(name) + (g - (len(groups) - 1) / 2) * width for name in mine]
            share = np.array([c.share for c in mine.values()])
            spread = np.array([[c.share - c.low, c.high - c.share] for c in mine.values()]).T.reshape(2, -1)
            axes.bar(x, share, width, yerr=np.maximum(spread, 0), color=SERIES[g % len(SERIES)], edgecolor=INK,
                     linewidth=0.4, hatch=HATCHES[g % len(HATCHES)], alpha=0.75,
                     error_kw={"linewidth": 0.6, "capsize": 1.5}, label=_group_words(group, next(iter(mine.values())).of))
        axes.set_xticks(range(len(types)), types, rotation=45, ha="right")
        axes.set_ylabel("share of units")
        axes.set_ylim(0, min(1.0, axes.get_ylim()[1]))
        axes.set_xlim(-0.6, len(types) - 0.4)
        if len(groups) <= 12:
            above_axes(axes, 3)
    return Drawn(figure, "Share of each type among the units of an animal and condition; bars, Wilson's 95 % interval. "
                 "Units of one animal are no independent sample.",
                 [{"animal": c.animal, "condition": c.condition, "type": c.type, "n": c.n, "of": c.of, "share": c.share,
                   "low": c.low, "high": c.high} for c in counts])


def _group_words(group: tuple[str, str], of: int) -> str:
    return f"{', '.join(filter(None, group)) or 'all units'} (n = {of})"
