"""Figures over units and sessions: conditions side by side, changes, counts."""

from __future__ import annotations

from collections import Counter
from collections.abc import Sequence

import numpy as np

from unitclass.analysis.changes import TypeChange, UnitLabels, type_of
from unitclass.io.table_files import Cell
from unitclass.io.tables import number
from unitclass.records import UnitResult
from unitclass.report.counts import TypeCount
from unitclass.report.saving import Drawn
from unitclass.report.style import (
    FIRING,
    HATCHES,
    INK,
    MM,
    ONE_COLUMN,
    PALE,
    SERIES,
    TWO_COLUMNS,
    above_axes,
    drawing,
    new_figure,
)
from unitclass.report.two_cycles import phase_axis, steps


def conditions_figure(units: Sequence[UnitResult], labels: UnitLabels) -> Drawn:
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
            rows += [{"condition": unit.condition, "phase": float(p), "rate_hz": number(r)}
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
