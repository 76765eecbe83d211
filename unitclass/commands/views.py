"""Results as plain aligned text: legible at 80 columns, in a pipe, without colour."""

from __future__ import annotations

import os
import shutil
import sys
from collections.abc import Mapping, Sequence
from typing import TYPE_CHECKING, TextIO

from unitclass.io.safe_text import safe_text
from unitclass.signals.summary import MEASURES

if TYPE_CHECKING:
    from unitclass.records import ConditionResult, Labels, Recording, SessionResult, UnitResult

UNDECIDED = "-"


def width_of(file: TextIO) -> int:
    """Return the columns to use: the terminal's, or unlimited in a pipe unless COLUMNS says otherwise."""
    if file.isatty() or "COLUMNS" in os.environ:
        return shutil.get_terminal_size((80, 24)).columns
    return 10_000


def print_table(head: Sequence[str], rows: Sequence[Sequence[str]], file: TextIO, *, indent: str = "  ") -> None:
    """Print aligned columns; the last one is cut at the edge of the terminal."""
    table = [[safe_text(cell) for cell in row] for row in (head, *rows)]
    widths = [max(len(row[i]) for row in table) for i in range(len(head))]
    limit = width_of(file)
    for row in table:
        line = indent + "  ".join(cell.ljust(width) for cell, width in zip(row, widths, strict=True))
        print(line.rstrip()[:limit], file=file)


def print_units(result: SessionResult, labels: Labels, file: TextIO | None = None) -> None:
    """Print one session's suggestions, a table per condition."""
    file = file or sys.stdout
    for condition in result.conditions:
        print(f"{safe_text(result.path)}  {_condition_line(condition)}", file=file)
        if condition.problem:
            print(f"  {safe_text(condition.problem)}", file=file)
        if condition.units:
            print_table(("unit", "suggested", "p", "next", "p", "label", "spikes", "why"),
                        [_unit_cells(unit, labels) for unit in condition.units], file)
        print(file=file)


def _condition_line(condition: ConditionResult) -> str:
    cycles = condition.nerve_cycles.cycles
    regime = f"{condition.regime} ({condition.regime_probabilities[condition.regime]:.0%})" if (
        condition.regime) else "no rhythm"
    name = safe_text(condition.condition.name) or "whole session"
    return f"{name}: {int(cycles.accepted.sum())} cycles of {safe_text(condition.nerve)}, {regime}"


def _unit_cells(unit: UnitResult, labels: Labels) -> tuple[str, ...]:
    suggestion, label = unit.suggestion, labels.get(unit.key)
    ranked = [pair for pair in suggestion.ranked if pair[0] != suggestion.type][:1]
    second, second_p = ranked[0] if ranked else ("", float("nan"))
    p = suggestion.probability
    decided = (label.type or ", ".join(label.flags)) if label else ""
    return (unit.unit, suggestion.type, f"{p:.2f}" if p == p else "", second,
            f"{second_p:.2f}" if second_p == second_p else "", decided or UNDECIDED, str(unit.n_spikes),
            "; ".join(suggestion.reasons))


def print_inventory(recording: Recording, file: TextIO | None = None) -> None:
    """Print what one file offers, with the reason for each guess."""
    file = file or sys.stdout
    print(f"{safe_text(recording.path)}  session {safe_text(recording.session) or '-'}, "
          f"animal {safe_text(recording.animal) or 'not told'}, "
          f"{recording.start_s:.1f} to {recording.stop_s:.1f} s", file=file)
    for finding in recording.findings:
        where = f" [{safe_text(finding.location)}]" if finding.location else ""
        print(f"  {finding.kind}: {safe_text(finding.name)}{where}: {safe_text(finding.reason)}", file=file)
    if recording.reference:
        print(f"  reference: {safe_text(recording.reference)}: {safe_text(recording.reference_reason)}", file=file)
    for missing in recording.missing:
        print(f"  missing: {safe_text(missing)}", file=file)
    print(file=file)


def print_cycles(result: SessionResult, file: TextIO | None = None) -> None:
    """Print the summary of every condition's cycles."""
    file = file or sys.stdout
    for condition in result.conditions:
        print(f"{safe_text(result.path)}  {_condition_line(condition)}", file=file)
        for line in (*condition.nerve_cycles.detection, *condition.regime_reasons, *condition.nerve_cycles.notes):
            print(f"  {safe_text(line)}", file=file)
        if condition.problem:
            print(f"  {safe_text(condition.problem)}", file=file)
        summary = condition.nerve_cycles.summary
        if summary:
            print_table(("measure", "cycles in use", "all cycles"), _summary_rows(summary), file)
            print("  " + _tag_words(summary), file=file)
        print(file=file)


def _summary_rows(summary: Mapping[str, float]) -> list[tuple[str, str, str]]:
    return [(words, _with_unit(summary.get(name), unit), _with_unit(summary.get(f"{name}_all"), unit))
            for name, words, unit in MEASURES if name in summary]


def _with_unit(value: float | None, unit: str) -> str:
    return "" if value is None or value != value else f"{value:.3g} {unit}".rstrip()


def _tag_words(summary: Mapping[str, float]) -> str:
    counts = [f"{int(value)} {name.removeprefix('n_').replace('_', ' ')}" for name, value in summary.items()
              if name.startswith("n_") and name not in ("n_cycles", "n_used") and value > 0]
    rest = [f"{name.replace('_', ' ')} {value:.3g}" for name, value in summary.items()
            if not name.startswith("n_") and name.removesuffix("_all") not in {m[0] for m in MEASURES} and value == value]
    found = f"{int(summary.get('n_cycles', 0))} cycles found, {int(summary.get('n_used', 0))} in use"
    return "; ".join([found, *counts, *rest])
