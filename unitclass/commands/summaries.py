"""What is said about all files of a run together: shape groups, changes, moves."""

from __future__ import annotations

import sys
from collections.abc import Sequence
from pathlib import PurePath
from typing import TYPE_CHECKING

from unitclass.commands.views import print_table
from unitclass.io.safe_text import safe_text

if TYPE_CHECKING:
    from unitclass.analysis.changes import TypeChange
    from unitclass.classify.clustering import ShapeGroups
    from unitclass.io.against import Comparison

MOST_TYPES = 3


def print_groups(found: ShapeGroups) -> None:
    """Print the shape groups with what the templates say of them."""
    if not found.groups:
        print("shape groups: too few units to group\n")
        return
    print(f"shape groups: {len(found.groups)}, the number with the lowest Bayesian information criterion; adjusted Rand "
          f"index {found.stability:.2f} when units are drawn again, {found.agreement:.2f} with the suggested types")
    print_table(("group", "units", "comes again", "suggested types", ""),
                [(g.name, str(g.n_units), f"{g.stability:.2f}",
                  ", ".join(f"{name} {share:.0%}" for name, share in g.types[:MOST_TYPES]),
                  "" if g.is_explained else f"no one type explains it: unitclass types learn NEW PATH --group {g.name}")
                 for g in found.groups], sys.stdout)
    print()


def print_changes(changes: Sequence[TypeChange]) -> None:
    """Print how many units went from which type to which, per animal; nothing without two conditions."""
    if not changes:
        return
    from unitclass.analysis.changes import change_counts

    print("from one condition to the next:")
    print_table(("animal", "from", "to", "type before", "type after", "units"),
                [(c.animal or "not told", c.condition_before, c.condition_after, c.type_before, c.type_after,
                  str(c.n_units)) for c in change_counts(changes)], sys.stdout)
    print()


def print_moves(found: Comparison, older: str) -> None:
    """Print which suggestions moved since an older table, and because of what."""
    n = len(found.moves)
    print(f"against {safe_text(older)}: {n} moved, {found.n_same} did not, {found.n_new} new, {found.n_gone} gone")
    if n:
        print_table(("file", "unit", "condition", "was", "p", "is", "p", "because of"),
                    [(PurePath(str(m.row["file"])).name, str(m.row["unit"]), str(m.row["condition"]), m.was_type,
                      _p(m.was_probability), str(m.row["suggested_type"]), _p(m.row["probability"]), "; ".join(m.because))
                     for m in found.moves], sys.stdout)
    print()


def _p(value: object) -> str:
    return f"{value:.2f}" if isinstance(value, float) else ""
