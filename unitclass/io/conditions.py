"""Which intervals of a file are its conditions, and why."""

from __future__ import annotations

import math
from collections.abc import Iterable, Sequence
from dataclasses import dataclass, replace
from itertools import pairwise

import numpy as np

from unitclass.errors import FileError
from unitclass.io.condition_table import ConditionRow
from unitclass.io.exclusions import exclusions_of, is_excluded_row, is_exclusion_table
from unitclass.io.interval_tables import LABEL_COLUMNS, IntervalTable
from unitclass.records import Condition, Exclusion, Finding
from unitclass.settings import RigSettings

SEVERAL_BREATHS_S = 10.0  # the median visit of a conditions table lasts at least as long: common practice
TOUCHING_S = 0.5  # rows of one label closer than this are one visit
MANY_VISITS = 20  # more visits than this, and many to each label, are trials and not conditions
_TABLES = ("conditions", "condition", "experimental_conditions", "epochs")

Visit = tuple[str, float, float]


@dataclass(frozen=True)
class Timeline:
    """Conditions and exclusions of a recording, and how they were recognised."""

    conditions: tuple[Condition, ...] = ()
    exclusions: tuple[Exclusion, ...] = ()
    findings: tuple[Finding, ...] = ()


@dataclass(frozen=True)
class _Candidate:
    """A table that may hold the conditions: the column that names them and the visits it gives."""

    table: IntervalTable
    label: str
    visits: tuple[Visit, ...]

    @property
    def median_s(self) -> float:
        return float(np.median([stop - start for _, start, stop in self.visits])) if self.visits else 0.0

    @property
    def n_labels(self) -> int:
        return len({name for name, _, _ in self.visits})

    @property
    def problem(self) -> str:
        """Return why these are no conditions; empty when they may be."""
        if not self.table.n_rows:
            return "it has no rows"
        if not self.label:
            return "no column names them; --condition-column can name one"
        if not self.visits:
            return f"its column {self.label!r} is empty"
        if self.median_s < SEVERAL_BREATHS_S:
            return f"its rows last {self.median_s:.2g} s, too short for several breaths"
        if len(self.visits) > MANY_VISITS and len(self.visits) > 4 * self.n_labels:
            return f"{len(self.visits)} visits to {self.n_labels} labels look like trials"
        return ""


def timeline(tables: Sequence[IntervalTable], stop_s: float, rig: RigSettings, *, column: str = "",
             path: str = "") -> Timeline:
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
    path : str
        The file, for messages.

    Raises
    ------
    FileError
        When no table has the column that the command line asks for.
    """
    exclusions, findings = exclusions_of(tables, stop_s, rig)
    left = [t for t in tables if not is_exclusion_table(t, rig)]
    if column and not any(column in t.columns for t in left):
        there = ", ".join(dict.fromkeys(name for t in left for name in t.columns)) or "none"
        raise FileError(f"no intervals table has a column {column!r}", where=path, remedy=f"its columns: {there}")
    candidates = [_candidate(t, column or rig.condition_column, stop_s, rig) for t in left]
    chosen, reason = _chosen(candidates, column, rig)
    lines = [_line(c, chosen, reason) for c in candidates]
    conditions = _named(chosen.visits, rig) if chosen else ()
    return Timeline(conditions, exclusions, (*findings, *lines, *_overlap(conditions)))


def timeline_from_rows(rows: Sequence[ConditionRow], start_s: float, stop_s: float, where: str,
                       rig: RigSettings) -> Timeline:
    """Return the conditions that a plain table gives one file; rows without a condition name none."""
    visits = [(row.condition, start_s if math.isnan(row.start_s) else row.start_s,
               stop_s if math.isnan(row.stop_s) else row.stop_s) for row in rows if row.condition]
    finding = Finding("conditions", where, "", f"{len(visits)} rows of the table given with --conditions")
    conditions = _named(sorted(visits, key=lambda v: v[1]), rig)
    return Timeline(conditions, (), (finding, *_overlap(conditions)) if visits else ())


# ------------------------------------------------------------------------------- choice

def _candidate(table: IntervalTable, asked: str, stop_s: float, rig: RigSettings) -> _Candidate:
    label = asked if asked in table.columns else table.label_column
    names = table.columns[label] if label else [""] * table.n_rows
    if not label and table.name == rig.condition_table:
        label, names = "row number", [f"{table.name} {i + 1}" for i in range(table.n_rows)]
    return _Candidate(table, label, tuple(_visits(table, names, stop_s, rig)))


def _chosen(candidates: Sequence[_Candidate], column: str, rig: RigSettings) -> tuple[_Candidate | None, str]:
    """Return the table that holds the conditions, and why; None when there is none."""
    for name, whose in ((column, "asked for with --condition-column"), (rig.condition_column, "named in the settings")):
        having = [c for c in candidates if name and c.label == name and c.visits]
        if having:
            return min(having, key=_rank), f"has the column {name!r}, {whose}"
    stated = [c for c in candidates if c.table.name == rig.condition_table and c.visits]
    if stated:
        return stated[0], f"named in the settings (rig.condition_table); {_words(stated[0])}"
    fitting = [c for c in candidates if not c.problem]
    if not fitting:
        return None, ""
    best = min(fitting, key=_rank)
    return best, _words(best)


def _words(candidate: _Candidate) -> str:
    n = candidate.n_labels
    return (f"its column {candidate.label!r} names {n} condition{'s' if n != 1 else ''}, "
            f"and a visit lasts {candidate.median_s:.0f} s")


def _rank(candidate: _Candidate) -> tuple[int, int, int]:
    """Order candidates: the plainest column, then the plainest table, then the fewest visits."""
    table, label = candidate.table.name.lower(), candidate.label.lower()
    column = LABEL_COLUMNS.index(label) if label in LABEL_COLUMNS else len(LABEL_COLUMNS)
    place = _TABLES.index(table) if table in _TABLES else len(_TABLES)
    return column // 3, place, len(candidate.visits)


def _line(candidate: _Candidate, chosen: _Candidate | None, reason: str) -> Finding:
    table = candidate.table
    if candidate is chosen:
        return Finding("conditions", table.name, table.location, reason)
    why = f"not conditions: {candidate.problem}" if candidate.problem else (
        "another table names the conditions better; condition_table under [rig] in the settings takes this one")
    return Finding("intervals", table.name, table.location, why)


def _overlap(conditions: Sequence[Condition]) -> list[Finding]:
    spans = sorted((start, stop, c.name) for c in conditions for start, stop in c.spans)
    return [Finding("conditions", f"{a[2]} and {b[2]}", "",
                    f"overlap by {min(a[1], b[1]) - b[0]:.1f} s: cycles there count in both")
            for a, b in pairwise(spans) if b[0] < a[1] - 1e-6]


# ------------------------------------------------------------------------------- visits

def _visits(table: IntervalTable, names: Sequence[str], stop_s: float, rig: RigSettings) -> list[Visit]:
    """Return the labelled rows in time order; rows of one label that touch are one visit."""
    visits: list[Visit] = []
    for row, name in enumerate(names):
        start, stop = float(table.start_s[row]), float(table.stop_s[row])
        stop = stop_s if math.isinf(stop) else stop
        if not name or stop <= start or is_excluded_row(table, row, rig):
            continue
        if visits and visits[-1][0] == name and start - visits[-1][2] <= TOUCHING_S:
            visits[-1] = (name, visits[-1][1], max(stop, visits[-1][2]))
        else:
            visits.append((name, start, stop))
    return visits


def _named(visits: Iterable[Visit], rig: RigSettings) -> tuple[Condition, ...]:
    """Return conditions of distinct names: a second visit is its own condition unless they are pooled."""
    found: dict[str, Condition] = {}
    seen: dict[str, int] = {}
    for label, start, stop in visits:
        seen[label] = seen.get(label, 0) + 1
        if seen[label] > 1 and rig.same_condition:
            first = found[label]
            found[label] = replace(first, stop_s=max(first.stop_s, stop), visits=(*first.spans, (start, stop)))
            continue
        name = label if seen[label] == 1 else f"{label} ({seen[label]})"
        found[name] = Condition(name, start, stop, label)
    return tuple(found.values())
