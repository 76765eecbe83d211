"""The classify and cycle tables, row by row."""

from __future__ import annotations

import math
from collections.abc import Iterable, Mapping, Sequence

from unitclass.analysis.changes import TypeChange, type_changes
from unitclass.io.safe_text import safe_text
from unitclass.io.table_files import Cell, write_table
from unitclass.records import (
    ConditionResult,
    Cycles,
    FloatArray,
    Label,
    Labels,
    SessionResult,
    UnitResult,
)

__all__ = ["CHANGE_COLUMNS", "CLASSIFY_COLUMNS", "CYCLE_COLUMNS", "change_rows", "classify_rows", "cycle_rows",
           "write_table"]

Row = dict[str, Cell]

CLASSIFY_COLUMNS = (
    "file", "session", "animal", "unit", "condition", "nerve", "regime", "regime_probability", "n_cycles",
    "n_spikes", "suggested_type", "probability", "second_type", "second_probability", "type", "reviewer",
    "reviewed_at", "shape_group", "eta_squared", "eta_squared_p", "rayleigh_p", "q_value", "mean_phase",
    "onset_phase", "peak_phase", "offset_phase", "rate_i_hz", "rate_e_hz", "lead_ms", "participation",
    "flags", "reasons", "rule_of_thumb", "condition_before", "type_before", "version", "settings_digest",
    "template_digest")

CHANGE_COLUMNS = (
    "file", "session", "animal", "unit", "condition_before", "condition_after", "type_before", "type_after",
    "probability_before", "probability_after")

CYCLE_COLUMNS = (
    "file", "condition", "nerve", "kind", "onset_s", "offset_s", "end_s", "ti_s", "te_s", "ttot_s", "duty",
    "peak", "area", "post_i_end_s", "late_e", "accepted", "reason")

UNDECIDED = Label(type="", reviewer="", decided_at="", how="")


# --------------------------------------------------------------------------------- rows

def classify_rows(result: SessionResult, labels: Labels) -> list[Row]:
    """Return one row per unit and condition: CLASSIFY_COLUMNS, then the columns carried along.

    Parameters
    ----------
    result : SessionResult
        What the method made of one recording.
    labels : Mapping
        (unit, condition) to the standing label; units without one are undecided.

    Returns
    -------
    list of dict
        None where a number cannot be told, never NaN. A carried column whose name is one of
        CLASSIFY_COLUMNS is called "NAME (file)".
    """
    carried = carried_names(result)
    before = {(c.unit, c.condition_after): (c.condition_before, c.type_before) for c in type_changes(result, labels)}
    return [_classify_row(result, condition, unit, labels.get(unit.key, UNDECIDED), before.get(unit.key, ("", "")))
            | {shown: safe_text(unit.columns.get(name, "")) for name, shown in carried.items()}
            for condition, unit in result.units()]


def change_rows(changes: Iterable[TypeChange]) -> list[Row]:
    """Return one row per unit and step from a condition to the next: CHANGE_COLUMNS."""
    return [_row(CHANGE_COLUMNS, (
        c.file, c.session, c.animal, c.unit, c.condition_before, c.condition_after, c.type_before, c.type_after,
        number(c.probability_before), number(c.probability_after))) for c in changes]


def cycle_rows(result: SessionResult) -> list[Row]:
    """Return one row per cycle of every condition, those left out included.

    After CYCLE_COLUMNS comes a peak_NAME, area_NAME pair for every other nerve. Times are
    seconds on the session clock; None where a value cannot be told.
    """
    others = list(dict.fromkeys(name for condition in result.conditions
                                for name in condition.nerve_cycles.cycles.other_peak))
    return [row for condition in result.conditions for row in _cycle_rows(result, condition, others)]


def carried_names(result: SessionResult) -> dict[str, str]:
    """Return the units' own columns, in order: name in the file to name in the table."""
    names = dict.fromkeys(name for _, unit in result.units() for name in unit.columns)
    return {name: f"{name} (file)" if name in CLASSIFY_COLUMNS else safe_text(name) for name in names}


def _classify_row(result: SessionResult, condition: ConditionResult, unit: UnitResult, label: Label,
                  before: tuple[str, str]) -> Row:
    suggestion, features = unit.suggestion, unit.features
    second_type, second = next(((t, p) for t, p in suggestion.ranked if t != suggestion.type), ("", math.nan))
    return _row(CLASSIFY_COLUMNS, (
        result.path, result.session, result.animal, unit.unit, unit.condition, condition.nerve,
        condition.regime, number(condition.regime_probabilities.get(condition.regime, math.nan)),
        unit.n_cycles, unit.n_spikes,
        suggestion.type, number(suggestion.probability), second_type, number(second),
        label.type, label.reviewer, label.decided_at,
        unit.shape_group,
        number(unit.modulation.eta_squared), number(unit.modulation.eta_squared_p),
        number(unit.modulation.rayleigh_p), number(unit.q_value), number(unit.modulation.mean_phase),
        number(features.onset_phase), number(features.peak_phase), number(features.offset_phase),
        number(features.rate_i_hz), number(features.rate_e_hz), number(features.lead_ms),
        number(features.participation),
        joined([*unit.flags, *label.flags]), joined(suggestion.reasons), suggestion.rule_type, *before,
        result.program_version, result.settings_digest, result.template_digest))


def _cycle_rows(result: SessionResult, condition: ConditionResult, others: Sequence[str]) -> Iterable[Row]:
    cycles = condition.nerve_cycles.cycles
    for i in range(cycles.n_cycles):
        row = _row(CYCLE_COLUMNS, (
            result.path, condition.condition.name, cycles.nerve, cycles.kind[i],
            seconds(cycles.onset_s[i]), seconds(cycles.offset_s[i]), seconds(cycles.end_s[i]),
            seconds(cycles.ti_s[i]), seconds(cycles.te_s[i]), seconds(cycles.ttot_s[i]),
            number(_duty(cycles, i)), number(cycles.peak[i]), number(cycles.area[i]),
            seconds(cycles.post_i_end_s[i]),
            int(cycles.late_e[i]) if cycles.late_e[i] >= 0 else None,
            bool(cycles.accepted[i]), cycles.reason[i]))
        for name in others:
            row[f"peak_{safe_text(name)}"] = _at(cycles.other_peak, name, i)
            row[f"area_{safe_text(name)}"] = _at(cycles.other_area, name, i)
        yield row


def _duty(cycles: Cycles, i: int) -> float:
    whole = float(cycles.ttot_s[i])
    return float(cycles.ti_s[i]) / whole if whole > 0 else math.nan


def _at(values: Mapping[str, FloatArray], name: str, i: int) -> float | None:
    return number(values[name][i]) if name in values else None


def _row(names: Sequence[str], values: Sequence[Cell]) -> Row:
    return {name: safe_text(value) if isinstance(value, str) else value
            for name, value in zip(names, values, strict=True)}


# -------------------------------------------------------------------------------- cells

def number(value: float) -> float | None:
    """Return `value` to six significant digits, or None when it is not finite."""
    return float(f"{value:.6g}") if math.isfinite(value) else None


def seconds(value: float) -> float | None:
    """Return a time to the microsecond, or None when it is not finite."""
    return round(float(value), 6) if math.isfinite(value) else None


def joined(parts: Iterable[str]) -> str:
    """Return the distinct non-empty parts as one text."""
    return "; ".join(dict.fromkeys(part for part in map(safe_text, parts) if part))
