"""What a labelled file says in its units table: labels, and the spikes of intracellular cells."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import replace
from typing import Any

import numpy as np

from unitclass.errors import UsageError
from unitclass.io.provenance import MARK, described
from unitclass.io.table_columns import Column, Table, column_name, number_column, text_column
from unitclass.io.unit_rows import UnitRows
from unitclass.records import ConditionResult, FloatArray, Labels, Membrane, Recording, SessionResult, VmSpikes

_INTRACELLULAR = "/general/intracellular_ephys/"
_MEASURES = {
    "threshold_mv": "membrane potential at which the spike starts, mV",
    "height_mv": "height from threshold to peak, mV", "half_width_ms": "width at half its height, ms",
    "ahp_mv": "depth of the after-hyperpolarisation, mV", "max_dvdt_mv_ms": "steepest rise, mV/ms"}


def labelled_condition(result: SessionResult, only: str, where: str) -> ConditionResult | None:
    """Return the condition whose labels stand in the units table; None when there are several.

    Raises
    ------
    UsageError
        If `only` names none of the conditions.
    """
    if not only:
        return result.conditions[0] if len(result.conditions) == 1 else None
    for condition in result.conditions:
        if only in (condition.condition.name, condition.condition.label):
            return condition
    names = ", ".join(c.condition.name for c in result.conditions) or "none"
    raise UsageError(f"no condition called {only!r}", where=where, remedy=f"the conditions are: {names}")


def label_columns(condition: ConditionResult, labels: Labels, rows: UnitRows) -> tuple[Column, ...]:
    """Return firing_type, suggested_firing_type and firing_type_probability of one condition."""
    decided, suggested, sure = [""] * rows.n_rows, [""] * rows.n_rows, [math.nan] * rows.n_rows
    for unit in condition.units:
        row = rows.row.get(unit.unit)
        if row is None:
            continue
        label = labels.get(unit.key)
        decided[row] = label.type if label else ""
        suggested[row], sure[row] = unit.suggestion.type, unit.suggestion.probability
    name = condition.condition.name
    during = f" in the condition {name}" if name else ""
    return (
        text_column("firing_type", f"{MARK}: firing type that a person decided on{during}", decided),
        text_column("suggested_firing_type", f"{MARK}: firing type that the program suggests{during}", suggested),
        number_column("firing_type_probability", f"{MARK}: probability of the suggested type{during}", sure))


def vm_units_table(recording: Recording, result: SessionResult, name: str) -> tuple[Table | None, UnitRows]:
    """Return a units table of the cells known from their membrane potential, and its rows.

    The standard ties units to extracellular electrodes only; the intracellular electrode is
    given as a reference in a column of its own.
    """
    spikes = {cell: found for cell, found in _spikes_by_cell(result).items() if found.time_s.size}
    if not spikes:
        return None, UnitRows("", 0)
    membranes = [_membrane_of(recording, cell) for cell in spikes]
    columns = (
        text_column("cell", "name of the cell: its cell_id where given, else its electrode", list(spikes)),
        *_electrode_column(membranes),
        *_train_columns(list(spikes.values()), _resolution_s(membranes)),
        *(number_column(f"{what}_mv", text, values) for what, text, values in (
            ("resting", "resting membrane potential, mV", [s.resting_mv for s in spikes.values()]),
            ("drift", "drift of the resting membrane potential, mV", [s.drift_mv for s in spikes.values()]))))
    words = described(result, "action potentials found in the membrane potential; spike times are the moments "
                              "of steepest rise.")
    rows = {cell: i for i, cell in enumerate(spikes)}
    return Table(column_name(name), words, len(spikes), columns, kind="Units"), UnitRows("", len(spikes), rows)


def _spikes_by_cell(result: SessionResult) -> dict[str, VmSpikes]:
    found: dict[str, list[VmSpikes]] = {}
    for _, unit in result.units():
        if unit.vm_spikes is not None:
            found.setdefault(unit.unit, []).append(unit.vm_spikes)
    return {cell: _merged(parts) for cell, parts in found.items()}


def _merged(parts: Sequence[VmSpikes]) -> VmSpikes:
    """Return the spikes of all conditions, each once."""
    if len(parts) == 1 or all(part is parts[0] for part in parts):
        return parts[0]
    times, first = np.unique(np.concatenate([part.time_s for part in parts]), return_index=True)
    measures: dict[str, Any] = {name: np.concatenate([getattr(part, name) for part in parts])[first]
                                for name in _MEASURES}
    observed = _union(np.concatenate([part.observed_s for part in parts]))
    return replace(parts[0], time_s=times, observed_s=observed, **measures)


def _union(intervals: FloatArray) -> FloatArray:
    joined: list[list[float]] = []
    for start, stop in intervals[np.argsort(intervals[:, 0])].tolist():
        if joined and start <= joined[-1][1]:
            joined[-1][1] = max(joined[-1][1], stop)
        else:
            joined.append([start, stop])
    return np.array(joined).reshape(-1, 2)


def _train_columns(spikes: Sequence[VmSpikes], resolution_s: float) -> list[Column]:
    lengths = np.array([s.time_s.size for s in spikes])
    columns = [Column("spike_times", "time of the steepest rise of each action potential, s",
                      np.concatenate([s.time_s for s in spikes]), lengths, resolution_s=resolution_s)]
    if all(_is_within(s) for s in spikes):
        columns.append(Column("obs_intervals", "stretches in which the trace was good enough, s",
                              np.concatenate([s.observed_s for s in spikes]),
                              np.array([len(s.observed_s) for s in spikes])))
    for name, text in _MEASURES.items():
        parts = [getattr(s, name) for s in spikes]
        if [part.size for part in parts] == lengths.tolist():
            columns.append(Column(f"spike_{name}", text, np.concatenate(parts), lengths))
    return columns


def _is_within(spikes: VmSpikes) -> bool:
    observed = np.asarray(spikes.observed_s).reshape(-1, 2)
    inside = (spikes.time_s[:, None] >= observed[:, 0]) & (spikes.time_s[:, None] <= observed[:, 1])
    return bool(observed.size) and bool(inside.any(axis=1).all())


def _membrane_of(recording: Recording, cell: str) -> Membrane | None:
    return next((m for m in recording.membranes if m.electrode.cell == cell), None)


def _electrode_column(membranes: Sequence[Membrane | None]) -> list[Column]:
    names = [m.electrode.name if m else "" for m in membranes]
    columns = [text_column("electrode_name", "name of the intracellular electrode", names)]
    if all(names):
        paths = np.array([*(_INTRACELLULAR + name for name in names), None], dtype=object)[:-1]
        columns.append(Column("intracellular_electrode", "the intracellular electrode", paths, points_to="objects"))
    return columns


def _resolution_s(membranes: Sequence[Membrane | None]) -> float:
    rates = [m.signal.rate_hz for m in membranes if m and m.signal.rate_hz > 0]
    return 1.0 / min(rates) if rates else math.nan
