"""The figure of a population: every unit's profile as a row under the nerves."""

from __future__ import annotations

from collections import Counter
from collections.abc import Sequence
from typing import TYPE_CHECKING

import numpy as np

from unitclass.analysis.changes import UnitLabels, type_of
from unitclass.io.table_files import Cell
from unitclass.io.tables import number
from unitclass.records import ConditionResult, FloatArray, UnitResult
from unitclass.report.saving import Drawn
from unitclass.report.style import FAMILY, INK, MM, SERIES, TWO_COLUMNS, above_axes, drawing, new_figure
from unitclass.report.two_cycles import centres, doubled, phase_axis

if TYPE_CHECKING:
    from matplotlib.axes import Axes

NERVE_MM = 16
LEAST_MM = 1.6  # the height of rows that have room for their type's name


def population_figure(condition: ConditionResult, labels: UnitLabels, order: Sequence[str]) -> Drawn:
    """Return every unit's profile as one row, grouped by type, within it by the phase of its peak."""
    units = _sorted_units(condition.units, labels, order)
    with drawing():
        rows_mm = min(max(2.6 * len(units), 14), 192)
        figure = new_figure(TWO_COLUMNS, (NERVE_MM + 22 + rows_mm) * MM)
        nerve, heat = figure.subplots(2, 1, sharex=True, height_ratios=(NERVE_MM, rows_mm))
        _draw_nerves(nerve, condition)
        table = _scaled(units)
        if len(units):
            image = heat.imshow(doubled(table), aspect="auto", extent=(0, 4, len(units), 0), cmap="Greys",
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


def _sorted_units(units: Sequence[UnitResult], labels: UnitLabels, order: Sequence[str]) -> list[UnitResult]:
    place = {name: i for i, name in enumerate(order)}
    firing = [u for u in units if u.n_spikes and np.isfinite(u.histogram.rate_hz).any()]
    return sorted(firing, key=lambda u: (place.get(type_of(u, labels), len(place)), type_of(u, labels), _peak(u)))


def _peak(unit: UnitResult) -> float:
    return float(np.nanargmax(unit.histogram.rate_hz))


def _scaled(units: Sequence[UnitResult]) -> FloatArray:
    rates = np.stack([u.histogram.rate_hz for u in units]) if units else np.zeros((0, 1))
    return np.asarray(rates / np.maximum(np.nanmax(rates, axis=1, keepdims=True), 1e-12)) if len(rates) else rates


def _draw_nerves(axes: Axes, condition: ConditionResult) -> None:
    for i, profile in enumerate(condition.nerve_profiles[:len(SERIES)]):
        top = np.nanmax(profile.mean) if np.isfinite(profile.mean).any() else 1.0
        axes.plot(centres(profile.mean.size), doubled(profile.mean) / max(float(top), 1e-300), color=SERIES[i],
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


def _population_rows(units: Sequence[UnitResult], labels: UnitLabels) -> list[dict[str, Cell]]:
    return [{"row": i, "unit": u.unit, "condition": u.condition, "type": type_of(u, labels),
             **{f"rate_hz_{k}": number(r) for k, r in enumerate(u.histogram.rate_hz)}}
            for i, u in enumerate(units)]
