"""The tables a labelled file gets: cycles, firing types, phase histograms, mean membrane potential."""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from dataclasses import replace
from typing import Any

import numpy as np

from unitclass.io.provenance import described
from unitclass.io.safe_text import safe_text
from unitclass.io.table_columns import (
    Column,
    Table,
    column_name,
    count_column,
    number_column,
    text_column,
    word_column,
)
from unitclass.io.table_files import Cell
from unitclass.io.tables import UNDECIDED, carried_names, classify_rows, cycle_rows, joined
from unitclass.io.unit_rows import UnitRows, spikes_within
from unitclass.records import FloatArray, Labels, Recording, SessionResult, UnitResult

CYCLES, FIRING_TYPES, HISTOGRAMS, MEAN_VM = (
    "respiratory_cycles", "firing_types", "phase_histograms", "mean_membrane_potential")

_PHASE = "canonical phase: inspiration 0 to 1, expiration 1 to 2"
_NERVE_UNITS = "in the unit of its envelope"
_MICROSECOND = 1e-6

_CYCLE_TEXTS = {"condition": "condition the cycle belongs to", "nerve": "reference nerve",
                "kind": "breath, sigh, doublet, gasp, artefact or edge",
                "reason": "why the cycle is left out, or what is odd about it"}
_CYCLE_NUMBERS = {
    "offset_s": "end of inspiration, seconds on the session clock",
    "ti_s": "duration of inspiration, s", "te_s": "duration of expiration, s",
    "ttot_s": "duration of the cycle, s", "duty": "TI over TTOT",
    "peak": f"peak of the reference nerve, {_NERVE_UNITS}",
    "area": f"area of the reference nerve, {_NERVE_UNITS}, times s",
    "post_i_end_s": "end of post-inspiration, seconds on the session clock"}

_TYPE_TEXTS = {
    "condition": "condition", "nerve": "reference nerve", "regime": "most probable rhythm",
    "suggested_type": "firing type suggested by the program",
    "second_type": "second most probable firing type", "type": "firing type a person decided on",
    "reviewer": "who decided", "reviewed_at": "when it was decided, UTC", "shape_group": "group of like profiles",
    "flags": "what to look at before believing the row", "reasons": "grounds of the suggestion"}
_TYPE_COUNTS = {"n_cycles": "cycles used", "n_spikes": "spikes in them"}
_TYPE_NUMBERS = {
    "regime_probability": "probability of that rhythm", "probability": "probability of the suggested type",
    "second_probability": "probability of the second type",
    "eta_squared": "share of the variance of the rate that the cycle explains, equal time fractions",
    "eta_squared_p": "p of eta squared, from circular shifts in time", "rayleigh_p": "p of the Rayleigh test",
    "q_value": "eta_squared_p after Benjamini and Hochberg within the condition",
    "mean_phase": f"mean phase, {_PHASE}", "onset_phase": f"where firing begins, {_PHASE}",
    "peak_phase": f"where firing peaks, {_PHASE}", "offset_phase": f"where firing ends, {_PHASE}",
    "rate_i_hz": "mean rate in inspiration, spikes/s", "rate_e_hz": "mean rate in expiration, spikes/s",
    "lead_ms": "lead over the onset of inspiration, ms",
    "participation": "share of cycles with a spike in the active phase"}


def cycles_table(result: SessionResult) -> Table | None:
    """Return the cycles of every condition in order of time, or None when there are fewer than two.

    A table of one row is something NWB readers are advised against.
    """
    stops = {safe_text(c.condition.name): c.condition.stop_s for c in result.conditions}
    rows = sorted((row for row in cycle_rows(result) if _stop(row, stops) > _number(row["onset_s"])),
                  key=lambda row: _number(row["onset_s"]))
    if len(rows) < 2:
        return None
    pairs = [name for name in rows[0] if name.startswith(("peak_", "area_"))]
    columns = (
        number_column("start_time", "onset of inspiration, s", _floats(rows, "onset_s")),
        number_column("stop_time", "onset of the next inspiration, s", [_stop(row, stops) for row in rows]),
        *(text_column(n, d, [str(row[n]) for row in rows]) for n, d in _CYCLE_TEXTS.items()),
        *(number_column(n, d, _floats(rows, n)) for n, d in _CYCLE_NUMBERS.items()),
        *(number_column(column_name(n), f"{n[:4]} of the nerve {n[5:]}, {_NERVE_UNITS}", _floats(rows, n))
          for n in pairs),
        *_late_e_column(rows),
        Column("accepted", "whether histograms use the cycle", np.array([bool(row["accepted"]) for row in rows])))
    words = described(result, "respiratory cycles found on the reference nerve, those left out included.")
    return Table(CYCLES, words, len(rows), columns, kind="TimeIntervals")


def firing_types_table(result: SessionResult, labels: Labels, rows: UnitRows, run: str) -> Table:
    """Return one row per unit and condition: suggestion, probabilities, decision and grounds."""
    units = [unit for _, unit in result.units()]
    cells = classify_rows(result, labels)
    standing = [labels.get(unit.key, UNDECIDED) for unit in units]
    columns = (
        *rows.columns_for(units),
        *(text_column(n, d, [str(row[n]) for row in cells]) for n, d in _TYPE_TEXTS.items()),
        text_column("how", "how it was decided: viewed, blind, batch or settled", [x.how for x in standing]),
        text_column("note", "the reviewer's note", [x.note for x in standing]),
        text_column("rule_type", "what the rule of thumb says", [u.suggestion.rule_type for u in units]),
        *(count_column(n, d, [int(_number(row[n])) for row in cells]) for n, d in _TYPE_COUNTS.items()),
        *(number_column(n, d, _floats(cells, n)) for n, d in _TYPE_NUMBERS.items()),
        *_probability_columns(units))
    words = described(result, f"firing type of every unit in every condition. {run}")
    return Table(FIRING_TYPES, words, len(units), (*columns, *_carried_columns(result, cells, columns)))


def histograms_table(result: SessionResult, rows: UnitRows) -> Table:
    """Return the counts and the exposure behind every row of the firing types."""
    units = [unit for _, unit in result.units()]
    n_bins = max((unit.histogram.n_bins for unit in units), default=0)
    half = n_bins // 2
    columns = (
        *rows.columns_for(units), _conditions(units),
        count_column("n_cycles", "cycles used", [unit.n_cycles for unit in units]),
        count_column("counts", "spikes in each bin of phase", _stacked(units, n_bins, _counts)),
        number_column("exposure_s", "seconds observed in each bin of phase", _stacked(units, n_bins, _exposure)))
    words = described(result, f"spikes by phase of the respiratory cycle: {half} equal bins of inspiration, "
                              f"then {n_bins - half} of expiration. Rate = counts / exposure_s.")
    return Table(HISTOGRAMS, words, len(units), columns)


def mean_vm_table(result: SessionResult, rows: UnitRows) -> Table | None:
    """Return the cycle-averaged membrane potentials, or None when there are none."""
    units = [unit for _, unit in result.units() if unit.vm is not None and unit.vm.mean_mv.size]
    found = [unit.vm for unit in units if unit.vm is not None]
    if not found:
        return None
    n_bins = max(vm.mean_mv.size for vm in found)
    columns = (
        *rows.columns_for(units), _conditions(units),
        count_column("n_cycles", "cycles averaged", [vm.n_cycles for vm in found]),
        number_column("mean_mv", "mean membrane potential in each bin of phase, mV",
                      np.array([_padded(vm.mean_mv, n_bins) for vm in found])),
        number_column("sd_mv", "its standard deviation between cycles, mV",
                      np.array([_padded(vm.sd_mv, n_bins) for vm in found])),
        number_column("reference_mv", "mean over the cycle, weighted by time, mV", [vm.reference_mv for vm in found]),
        number_column("swing_mv", "peak minus trough, mV", [vm.swing_mv for vm in found]),
        number_column("resting_mv", "resting membrane potential, mV", [vm.resting_mv for vm in found]),
        number_column("plateau_bias_mv", "what cutting the spikes does to the plateau, mV",
                      [vm.plateau_bias_mv for vm in found]),
        text_column("notes", "what to know about the trace", [joined(vm.notes) for vm in found]))
    words = described(result, f"membrane potential by phase, spikes cut and bridged, {n_bins} equal bins of phase "
                              "(inspiration, then expiration).")
    return Table(MEAN_VM, words, len(units), columns)


def with_spikes_if_single(table: Table, result: SessionResult, recording: Recording) -> Table:
    """Return `table`; if it has one row, as a Units table that holds the row's spikes.

    NWB readers are advised against tables of one row unless they are tables of units, and a
    session of one cell in one condition is a common thing. Spike times are rounded to the
    microsecond, which makes the resolution stated with them true.
    """
    if table.n_rows != 1:
        return table
    condition, unit = next((c, u) for c, u in result.units() if table.name != MEAN_VM or u.vm is not None)
    times = np.round(spikes_within(recording, unit, condition.condition.spans), 6)
    if times.size == 0:
        return table
    spikes = Column("spike_times", "the unit's spikes in the condition (all of them if it has none there), s",
                    times, np.array([times.size]), resolution_s=_MICROSECOND)
    return replace(table, columns=(*table.columns, spikes), kind="Units")


# ------------------------------------------------------------------------------ helpers

def _probability_columns(units: Sequence[UnitResult]) -> list[Column]:
    types = dict.fromkeys(name for unit in units for name in sorted(unit.suggestion.probabilities))
    return [number_column(column_name("probability", name), f"probability of {name}",
                          [unit.suggestion.probabilities.get(name, math.nan) for unit in units])
            for name in types]


def _carried_columns(result: SessionResult, cells: Sequence[dict[str, Cell]],
                     own: Sequence[Column]) -> list[Column]:
    taken = {column.name for column in own}
    names = [(column_name(name), name) for name in carried_names(result).values()]
    return [word_column(column_name("source", short) if short in taken else short,
                        f"{name}, as the source gives it", [str(row[name]) for row in cells])
            for short, name in names]


def _late_e_column(rows: Sequence[dict[str, Cell]]) -> list[Column]:
    values = np.array([-1 if row["late_e"] is None else row["late_e"] for row in rows], dtype=np.int8)
    known = bool((values >= 0).any())
    meaning = "1 where the abdominal nerve has a late-expiratory burst, 0 where not, -1 unknown"
    return [Column("late_e", meaning, values)] if known else []


def _conditions(units: Sequence[UnitResult]) -> Column:
    return text_column("condition", "condition", [unit.condition for unit in units])


def _stop(row: dict[str, Cell], stops: dict[str, float]) -> float:
    # A cycle cut off by the end of its condition has no next onset.
    end = _number(row["end_s"])
    return end if math.isfinite(end) else stops[str(row["condition"])]


def _floats(rows: Sequence[dict[str, Cell]], name: str) -> list[float]:
    return [_number(row.get(name)) for row in rows]


def _number(value: Cell) -> float:
    return math.nan if value is None else float(value)


def _stacked(units: Sequence[UnitResult], n_bins: int, of: Callable[[UnitResult], FloatArray]) -> Any:
    return np.array([_padded(of(unit), n_bins, 0.0) for unit in units]).reshape(len(units), n_bins)


def _counts(unit: UnitResult) -> FloatArray:
    return unit.histogram.counts


def _exposure(unit: UnitResult) -> FloatArray:
    return unit.histogram.exposure_s


def _padded(values: FloatArray, n_bins: int, fill: float = math.nan) -> FloatArray:
    return np.pad(np.asarray(values, float), (0, n_bins - values.size), constant_values=fill)
