"""Which intervals of a file are its conditions, which are exclusions, and why."""

from __future__ import annotations

import math
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, field, replace

import h5py
import numpy as np

from unitclass.io.condition_table import ConditionRow
from unitclass.io.dynamic_tables import n_rows, number_column, text_columns
from unitclass.io.hdf5 import attribute
from unitclass.records import Condition, Exclusion, Finding, FloatArray
from unitclass.settings import RigSettings

LABEL_COLUMNS = ("condition", "conditions", "label", "state", "treatment", "manipulation", "drug", "gas", "epoch",
                 "epoch_name", "period", "protocol", "phase", "stage", "block", "name", "tags", "tag", "description")
SEVERAL_BREATHS_S = 10.0  # the median row of a conditions table lasts longer: common practice
TOUCHING_S = 0.5  # rows of one label closer than this are one visit


@dataclass(frozen=True)
class IntervalTable:
    """One table of intervals: its rows' times in seconds, and its columns as text."""

    name: str
    location: str
    start_s: FloatArray
    stop_s: FloatArray
    columns: Mapping[str, list[str]] = field(default_factory=dict)
    description: str = ""


@dataclass(frozen=True)
class Timeline:
    """Conditions and exclusions of a recording, and how they were recognised."""

    conditions: tuple[Condition, ...] = ()
    exclusions: tuple[Exclusion, ...] = ()
    findings: tuple[Finding, ...] = ()


def read_interval_table(file: h5py.File, location: str) -> IntervalTable:
    """Return an interval table; rows without a start are left out, without a stop reach to the end."""
    group = file[location]
    rows = n_rows(group)
    start, stop = number_column(group, "start_time", rows), number_column(group, "stop_time", rows)
    columns = text_columns(group, skip=("start_time", "stop_time"))
    known = np.flatnonzero(np.isfinite(start))
    stop = np.where(np.isfinite(stop), stop, np.inf)
    kept = {name: [values[i] for i in known] for name, values in columns.items()}
    return IntervalTable(location.rsplit("/", 1)[-1], location, start[known], stop[known], kept,
                         attribute(group, "description"))


def timeline(tables: Sequence[IntervalTable], stop_s: float, rig: RigSettings, *, column: str = "") -> Timeline:
    """Return the conditions and exclusions that a file's interval tables hold.

    Parameters
    ----------
    tables : sequence of IntervalTable
    stop_s : float
        End of the recording, for rows without an end.
    rig : RigSettings
        Names the table, the column and what to exclude, where the user said so.
    column : str
        Column that names the condition, from the command line.
    """
    exclusions, findings = _exclusions(tables, stop_s, rig)
    left = [t for t in tables if not _is_exclusion_table(t, rig)]
    chosen, label, reason = _chosen(left, column or rig.condition_column, rig)
    if chosen is None:
        why = [Finding("intervals", t.name, t.location, _why_not(t)) for t in left]
        return Timeline((), exclusions, (*findings, *why))
    visits = _visits(chosen, label, stop_s, rig)
    findings = (*findings, Finding("conditions", chosen.name, chosen.location, reason))
    findings += tuple(Finding("intervals", t.name, t.location, _why_not(t)) for t in left if t is not chosen)
    return Timeline(_named(visits, rig), exclusions, findings)


def timeline_from_rows(rows: Sequence[ConditionRow], start_s: float, stop_s: float, where: str,
                       rig: RigSettings) -> Timeline:
    """Return the conditions that a plain table gives one file; rows without a condition name none."""
    visits = [(row.condition, start_s if math.isnan(row.start_s) else row.start_s,
               stop_s if math.isnan(row.stop_s) else row.stop_s) for row in rows if row.condition]
    finding = Finding("conditions", where, "", f"{len(visits)} rows of the table given with --conditions")
    return Timeline(_named(sorted(visits, key=lambda v: v[1]), rig), (), (finding,) if visits else ())


# ------------------------------------------------------------------------------- choice

def _chosen(tables: Sequence[IntervalTable], column: str,
            rig: RigSettings) -> tuple[IntervalTable | None, str, str]:
    """Return the table of conditions, its label column, and why; None when there is none."""
    if rig.condition_table:
        tables = [t for t in tables if t.name == rig.condition_table]
    if column:
        named = [t for t in tables if column in t.columns]
        return (named[0], column, f"has the column {column!r} that was asked for") if named else (None, "", "")
    fitting = [(t, label) for t in tables if (label := _label_column(t)) and (_is_long(t) or rig.condition_table)]
    if not fitting:
        return None, "", ""
    best, label = min(fitting, key=lambda pair: _rank(*pair))
    n = len(set(best.columns[label]) - {""})
    return best, label, (f"its column {label!r} names {n} condition{'s' if n != 1 else ''}, "
                         f"and its rows last {_median_s(best):.0f} s")


def _rank(table: IntervalTable, label: str) -> tuple[int, int]:
    preferred = ("conditions", "condition", "experimental_conditions", "epochs")
    place = preferred.index(table.name) if table.name in preferred else len(preferred)
    rank = LABEL_COLUMNS.index(label.lower()) if label.lower() in LABEL_COLUMNS else len(LABEL_COLUMNS)
    return (rank // 3, place)


def _label_column(table: IntervalTable) -> str:
    by_name = {name.lower(): name for name in table.columns}
    for known in LABEL_COLUMNS:
        if known in by_name and any(table.columns[by_name[known]]):
            return by_name[known]
    wordy = [name for name, values in table.columns.items() if any(v and not _is_number(v) for v in values)]
    return wordy[0] if len(wordy) == 1 else ""


def _is_long(table: IntervalTable) -> bool:
    return table.start_s.size > 0 and _median_s(table) >= SEVERAL_BREATHS_S


def _median_s(table: IntervalTable) -> float:
    return float(np.median(table.stop_s - table.start_s)) if table.start_s.size else 0.0


def _why_not(table: IntervalTable) -> str:
    if not table.start_s.size:
        return "not conditions: it has no rows"
    if not _label_column(table):
        return "not conditions: no column names them"
    if not _is_long(table):
        return f"not conditions: its rows last {_median_s(table):.2g} s, too short for several breaths"
    return "another table names the conditions better; --condition-column takes this one"


def _is_number(value: str) -> bool:
    try:
        float(value)
    except ValueError:
        return False
    return True


# ------------------------------------------------------------------------------- visits

def _visits(table: IntervalTable, label: str, stop_s: float, rig: RigSettings) -> list[tuple[str, float, float]]:
    rows = sorted(zip(table.columns[label], table.start_s.tolist(), table.stop_s.tolist(), strict=True),
                  key=lambda row: row[1])
    visits: list[tuple[str, float, float]] = []
    for name, start, stop in rows:
        end = min(stop, stop_s) if math.isinf(stop) else stop
        if not name or end <= start or name in rig.exclude:
            continue
        if visits and visits[-1][0] == name and start - visits[-1][2] <= TOUCHING_S:
            visits[-1] = (name, visits[-1][1], max(end, visits[-1][2]))
        else:
            visits.append((name, start, end))
    return visits


def _named(visits: Iterable[tuple[str, float, float]], rig: RigSettings) -> tuple[Condition, ...]:
    """Return conditions of distinct names: a second visit is its own condition unless they are pooled."""
    found: dict[str, Condition] = {}
    seen: dict[str, int] = {}
    for label, start, stop in visits:
        seen[label] = seen.get(label, 0) + 1
        if seen[label] > 1 and rig.same_condition:
            first = found[label]
            parts = (*(first.visits or ((first.start_s, first.stop_s),)), (start, stop))
            found[label] = replace(first, stop_s=max(first.stop_s, stop), visits=parts)
            continue
        name = label if seen[label] == 1 else f"{label} ({seen[label]})"
        found[name] = Condition(name, start, stop, label)
    return tuple(found.values())


# --------------------------------------------------------------------------- exclusions

def _is_exclusion_table(table: IntervalTable, rig: RigSettings) -> bool:
    return table.name == "invalid_times" or table.name in rig.exclude


def _exclusions(tables: Sequence[IntervalTable], stop_s: float,
                rig: RigSettings) -> tuple[tuple[Exclusion, ...], tuple[Finding, ...]]:
    found: list[Exclusion] = []
    findings: list[Finding] = []
    for table in tables:
        whole = _is_exclusion_table(table, rig)
        mine = [_exclusion(table, i, stop_s, rig) for i in range(table.start_s.size)
                if whole or _is_excluded_row(table, i, rig)]
        found += mine
        if mine or whole:
            why = "invalid times" if table.name == "invalid_times" else "named in the settings (rig.exclude)"
            findings.append(Finding("exclusions", table.name, table.location, f"{len(mine)} windows left out: {why}"))
    return tuple(found), tuple(findings)


def _is_excluded_row(table: IntervalTable, row: int, rig: RigSettings) -> bool:
    return any(values[row] in rig.exclude for values in table.columns.values() if values[row])


def _exclusion(table: IntervalTable, row: int, stop_s: float, rig: RigSettings) -> Exclusion:
    label = _label_column(table)
    said = table.columns[label][row] if label else ""
    name = "invalid time" if table.name == "invalid_times" else table.name
    return Exclusion(float(table.start_s[row]), min(float(table.stop_s[row]), stop_s),
                     f"{name}: {said}" if said else name)
