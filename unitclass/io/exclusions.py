"""Windows that no histogram may use: invalid times, and what the user named."""

from __future__ import annotations

import re
from collections.abc import Sequence

import numpy as np

from unitclass.io.interval_tables import IntervalTable
from unitclass.io.stimuli import is_named
from unitclass.records import Exclusion, Finding
from unitclass.settings import RigSettings

INVALID = "invalid_times"
_DISTURBING = re.compile(r"stim|pulse|laser|shock|current", re.I)


def is_exclusion_table(table: IntervalTable, rig: RigSettings) -> bool:
    """Tell whether every row of a table is a window to leave out."""
    return table.name == INVALID or is_named(table.name, rig.exclude)


def is_excluded_row(table: IntervalTable, row: int, rig: RigSettings) -> bool:
    """Tell whether the user named a row's label or one of its tags as something to leave out."""
    return bool(rig.exclude) and any(is_named(word, rig.exclude) for word in table.words(row))


def exclusions_of(tables: Sequence[IntervalTable], stop_s: float,
                  rig: RigSettings) -> tuple[tuple[Exclusion, ...], tuple[Finding, ...]]:
    """Return the windows to leave out and the inventory's lines about them.

    Rows that merely sound like stimulation are used, with a line that says how to leave them out.
    """
    found: list[Exclusion] = []
    findings: list[Finding] = []
    for table in tables:
        whole = is_exclusion_table(table, rig)
        rows = [i for i in range(table.n_rows) if whole or is_excluded_row(table, i, rig)]
        found += [e for e in (_exclusion(table, i, stop_s) for i in rows) if e.stop_s > e.start_s]
        if rows or whole:
            why = "invalid times" if table.name == INVALID else "named in the settings (rig.exclude)"
            findings.append(Finding("exclusions", table.name, table.location, f"{len(rows)} windows left out: {why}"))
        else:
            findings += _hint(table)
    return tuple(found), tuple(findings)


def _hint(table: IntervalTable) -> list[Finding]:
    label = table.label_column
    words = sorted({v for v in table.columns[label] if _DISTURBING.search(v)}) if label else []
    n = sum(v in words for v in table.columns[label]) if label else 0
    if not words:
        return []
    return [Finding("intervals", table.name, table.location,
                    f"{n} row{'s' if n != 1 else ''} labelled {', '.join(words[:3])} stay in: name the label under [rig] "
                    "exclude in the settings to leave them out")]


def _exclusion(table: IntervalTable, row: int, stop_s: float) -> Exclusion:
    label = table.label_column
    said = table.columns[label][row] if label else ""
    name = "invalid time" if table.name == INVALID else table.name
    stop = float(table.stop_s[row])
    return Exclusion(float(table.start_s[row]), stop if np.isfinite(stop) else stop_s, f"{name}: {said}" if said else name)
