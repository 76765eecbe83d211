"""One unit as papers show it."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from unitclass.io.table_files import Cell
from unitclass.io.tables import number
from unitclass.records import ConditionResult, Envelope, FloatArray, Label, Membrane, Recording, UnitResult
from unitclass.report.saving import Drawn
from unitclass.report.stretch import Trace, trace_of, usual_stretch
from unitclass.report.style import (
    FAMILY,
    FIRING,
    GREY,
    INSPIRATION,
    MARK,
    MM,
    NERVE,
    PALE,
    TWO_COLUMNS,
    above_axes,
    bare,
    drawing,
    new_figure,
    nice_length,
    scale_bar,
)
from unitclass.report.traces import draw_envelope, draw_trace, within
from unitclass.report.two_cycles import centres, doubled, phase_axis, steps

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure
    from matplotlib.gridspec import SubplotSpec

MOST_NERVES = 3


@dataclass(frozen=True)
class Shown:
    """What one figure shows of a unit."""

    recording: Recording
    condition: ConditionResult
    unit: UnitResult
    label: Label | None = None

    @property
    def type(self) -> str:
        """Return the type in words: what a person decided, else the suggestion."""
        if self.label is not None and self.label.type:
            return f"{self.label.type} ({self.label.reviewer})"
        p = self.unit.suggestion.probability
        return f"{self.unit.suggestion.type} (suggested{f', p {p:.2f}' if p == p else ''})"


def unit_figure(shown: Shown) -> Drawn:
    """Return the figure of one unit in one condition.

    From above: a stretch of the raw nerve, the integrated nerves and the cell; below, cycle raster
    and phase histogram over two cycles with the nerve and the family behind it, and histograms
    locked to the onset and the end of inspiration.
    """
    with drawing():
        figure = new_figure(TWO_COLUMNS, 120 * MM)
        grid = figure.add_gridspec(2, 1, height_ratios=(1.0, 1.25))
        stretch = _Stretch.of(shown)
        _draw_stretch(stretch, figure, grid[0])
        below = grid[1].subgridspec(1, 2, width_ratios=(1.15, 1.0))
        _draw_cycle(shown, figure, below[0])
        _draw_locked(shown.unit, figure, below[1])
        where = shown.unit.condition or "whole session"
        figure.suptitle(f"unit {shown.unit.unit}, {where}: {shown.type}", x=0.01, ha="left", fontsize=8)
    return Drawn(figure, _caption(shown), _rows(shown, stretch))


# -------------------------------------------------------------------------------- stretch

@dataclass(frozen=True)
class _Stretch:
    start_s: float
    stop_s: float
    raw: Trace | None
    envelopes: tuple[Envelope, ...]
    spikes_s: FloatArray
    potential: Trace | None
    inspirations: tuple[tuple[float, float], ...]

    @classmethod
    def of(cls, shown: Shown) -> _Stretch:
        cycles = shown.condition.nerve_cycles.cycles
        start, stop = usual_stretch(cycles)
        if start != start:
            return cls(0.0, 1.0, None, (), np.zeros(0), None, ())
        nerve = next((s for s in shown.recording.nerves if s.name == shown.condition.nerve), None)
        membrane = _membrane_of(shown)
        raw = trace_of(nerve, start, stop) if nerve is not None and not nerve.is_integrated else None
        potential = trace_of(membrane.signal, start, stop) if membrane is not None else None
        spikes = _spikes(shown, start, stop)
        spans = tuple((float(a), float(b)) for a, b in zip(cycles.onset_s, cycles.offset_s, strict=True)
                      if b == b and b > start and a < stop)
        return cls(start, stop, raw, shown.condition.nerve_cycles.envelopes[:MOST_NERVES], spikes, potential, spans)


def _membrane_of(shown: Shown) -> Membrane | None:
    if shown.unit.vm is None:
        return None
    return next((m for m in shown.recording.membranes if m.electrode.cell == shown.unit.unit), None)


def _spikes(shown: Shown, start_s: float, stop_s: float) -> FloatArray:
    if shown.unit.vm_spikes is not None:
        times = shown.unit.vm_spikes.time_s
    else:
        found = [u for u in shown.recording.units if u.id == shown.unit.unit]
        times = found[0].train.read() if found else np.zeros(0)
    return np.asarray(times[(times >= start_s) & (times < stop_s)])


def _draw_stretch(s: _Stretch, figure: Figure, place: SubplotSpec) -> None:
    n_rows = (s.raw is not None) + len(s.envelopes) + 1
    heights = [1.0] * (n_rows - 1) + [1.6 if s.potential is not None else 0.5]
    grid = place.subgridspec(n_rows, 1, height_ratios=heights, hspace=0.0)
    rows = [figure.add_subplot(grid[i]) for i in range(n_rows)]
    for axes in rows:
        bare(axes)
        axes.set_xlim(s.start_s, s.stop_s)
        for start, stop in s.inspirations:
            axes.axvspan(start, stop, color=INSPIRATION, linewidth=0, zorder=0)
    if s.raw is not None:
        draw_trace(rows[0], s.raw, f"{s.raw.name}, raw", GREY)
    for axes, envelope in zip(rows[s.raw is not None:], s.envelopes, strict=False):
        draw_envelope(axes, envelope, s.start_s, s.stop_s)
    _drawnumber(rows[-1], s)
    length = nice_length(s.stop_s - s.start_s)
    low, high = rows[-1].get_ylim()
    scale_bar(rows[-1], length, f"{length:g} s", at=(s.stop_s - length, low - 0.12 * (high - low)))


def _drawnumber(axes: Axes, s: _Stretch) -> None:
    if s.potential is not None:
        draw_trace(axes, s.potential, "Vm", FIRING)
        return
    axes.eventplot([s.spikes_s], lineoffsets=0.5, linelengths=0.9, linewidths=0.5, colors=FIRING)
    axes.set_ylim(0, 1)
    axes.set_ylabel("spikes", rotation=0, ha="right", va="center")


# ---------------------------------------------------------------------------------- cycle

def _draw_cycle(shown: Shown, figure: Figure, place: SubplotSpec) -> None:
    unit = shown.unit
    n_rows = 3 if unit.vm is not None else 2
    grid = place.subgridspec(n_rows, 1, height_ratios=(1.0, 1.3, 0.9)[:n_rows], hspace=0.05)
    raster, histogram = figure.add_subplot(grid[0]), figure.add_subplot(grid[1])
    _draw_raster(raster, unit)
    _draw_histogram(histogram, shown, with_words=unit.vm is None)
    if unit.vm is not None:
        potential = figure.add_subplot(grid[2])
        mean, sd = doubled(unit.vm.mean_mv), doubled(unit.vm.sd_mv)
        at = centres(unit.vm.mean_mv.size)
        potential.fill_between(at, mean - sd, mean + sd, color=PALE, linewidth=0)
        potential.plot(at, mean, color=FIRING)
        phase_axis(potential)
        potential.set_ylabel("Vm (mV)")


def _draw_raster(axes: Axes, unit: UnitResult) -> None:
    phase, row = unit.raster.phase, unit.raster.row
    for shift in (0.0, 2.0):
        axes.plot(phase + shift, row + 0.5, "|", color=FIRING, markersize=2.0, markeredgewidth=0.35,
                  rasterized=row.size > 5000)
    phase_axis(axes, with_words=False)
    axes.set_ylim(max(unit.raster.n_cycles, 1), 0)
    axes.set_yticks([])
    axes.set_ylabel(f"{unit.raster.n_cycles} of {unit.raster.of_cycles}\ncycles")


def _draw_histogram(axes: Axes, shown: Shown, *, with_words: bool) -> None:
    unit = shown.unit
    rate, h = unit.histogram.rate_hz, unit.histogram
    top = float(np.nanmax(np.r_[rate, unit.suggestion.fitted_high_hz, 1e-9]))
    steps(axes, rate, fill=True, color=PALE, label="spikes")
    steps(axes, rate, color=FIRING, linewidth=0.7)
    at = centres(h.n_bins)
    if np.isfinite(h.low_hz).any():
        axes.vlines(at, doubled(h.low_hz), doubled(h.high_hz), color=GREY, linewidth=0.4)
    s = unit.suggestion
    if s.fitted_rate_hz.size == h.n_bins:
        axes.fill_between(at, doubled(s.fitted_low_hz), doubled(s.fitted_high_hz), color=FAMILY, alpha=0.2,
                          linewidth=0)
        axes.plot(at, doubled(s.fitted_rate_hz), color=FAMILY, linestyle="--", label=f"family {s.type}, 90 %")
    for profile in shown.condition.nerve_profiles[:1]:
        mean = doubled(profile.mean)
        spread = np.nanmax(mean) - np.nanmin(mean)
        if spread > 0:
            scaled = top * (mean - np.nanmin(mean)) / spread
            axes.plot(centres(profile.mean.size), scaled, color=NERVE, linewidth=1.0,
                      label=f"{profile.name}, mean")
    phase_axis(axes, with_words=with_words)
    highest = float(np.nanmax(np.r_[top, h.high_hz]))
    axes.set_ylim(0, 1.08 * highest)
    axes.set_ylabel("rate (spikes/s)")
    above_axes(axes, 3)


def _draw_locked(unit: UnitResult, figure: Figure, place: SubplotSpec) -> None:
    shown = [locked for locked in unit.locked[:2] if locked.centres_ms.size]
    if not shown:
        return
    grid = place.subgridspec(len(shown), 1, hspace=0.1)
    for i, locked in enumerate(shown):
        axes = figure.add_subplot(grid[i])
        width = float(np.median(np.diff(locked.centres_ms))) if locked.centres_ms.size > 1 else 1.0
        borders = np.r_[locked.centres_ms - width / 2, locked.centres_ms[-1:] + width / 2]
        axes.stairs(np.nan_to_num(locked.rate_hz), borders, fill=True, color=PALE)
        axes.stairs(np.nan_to_num(locked.rate_hz), borders, color=FIRING, linewidth=0.7)
        axes.set_xlim(borders[0], borders[-1])
        axes.set_ylim(bottom=0)
        axes.axvline(0, color=MARK, linewidth=0.9)
        axes.set_xlabel(f"time from {LOCKS.get(locked.lock, locked.lock)} (ms)")
        axes.set_ylabel("rate (spikes/s)")


LOCKS = {"onset": "onset of inspiration", "offset": "end of inspiration"}


# -------------------------------------------------------------------------------- numbers

def _caption(shown: Shown) -> str:
    unit, nerves = shown.unit, ", ".join(e.name for e in shown.condition.nerve_cycles.envelopes[:MOST_NERVES])
    return (f"Unit {unit.unit}, {unit.condition or 'whole session'}: {shown.type}. Above, four cycles with "
            f"{nerves or 'no nerve'}; shaded, inspiration. Below, {unit.n_spikes} spikes in {unit.n_cycles} cycles by "
            "phase, drawn over two cycles (bars with 95 % limits by bootstrap over cycles), and by time from both "
            "transitions.")


def _rows(shown: Shown, s: _Stretch) -> list[dict[str, Cell]]:
    unit = shown.unit
    rows: list[dict[str, Cell]] = []
    h = unit.histogram
    fitted = unit.suggestion.fitted_rate_hz
    for i in range(h.n_bins):
        rows.append({"panel": "phase", "x": float(h.centres[i]), "unit_of_x": "canonical phase", "y": number(h.rate_hz[i]),
                     "unit_of_y": "spikes/s", "low": number(h.low_hz[i]), "high": number(h.high_hz[i]),
                     "family": number(fitted[i]) if fitted.size == h.n_bins else None})
    for locked in unit.locked[:2]:
        rows += [{"panel": f"locked to {locked.lock}", "x": float(t), "unit_of_x": "ms", "y": number(r),
                  "unit_of_y": "spikes/s"}
                 for t, r in zip(locked.centres_ms, locked.rate_hz, strict=True)]
    rows += [{"panel": "spikes", "x": float(t), "unit_of_x": "s"} for t in s.spikes_s]
    for envelope in s.envelopes:
        rows += [{"panel": envelope.name, "x": float(t), "unit_of_x": "s", "y": number(v), "unit_of_y": envelope.unit}
                 for t, v in zip(*within(envelope, s.start_s, s.stop_s), strict=True)]
    return rows
