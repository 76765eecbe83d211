"""`unitclass classify`: suggestions for every unit in every condition."""

from __future__ import annotations

import argparse
from dataclasses import dataclass, field
from typing import TYPE_CHECKING

from unitclass.commands.options import add_crosswalk, add_paths, add_run_options, add_session_options

if TYPE_CHECKING:
    from unitclass.analysis.changes import TypeChange
    from unitclass.analysis.groups import ShapedRow
    from unitclass.io.table_files import Cell
    from unitclass.records import Labels, SessionResult

STORE = "store"


def add_arguments(parser: argparse.ArgumentParser) -> None:
    """Declare the options."""
    add_paths(parser)
    parser.add_argument("--table", default="", metavar="FILE", help="write the table as CSV or JSON (- is stdout)")
    parser.add_argument("--changes", default="", metavar="FILE",
                        help="write what becomes of each unit from one condition to the next")
    parser.add_argument("--groups", action="store_true", help="group all units by shape, whatever the templates say")
    parser.add_argument("--against", default="", metavar="OLD.csv|store",
                        help="list what moved since an older table, or since the reviewers' decisions in the store, "
                             "and because of what")
    add_crosswalk(parser)
    add_session_options(parser)
    add_run_options(parser)


@dataclass
class _Collected:
    """What all files gave, kept small: tables, not results."""

    rows: list[dict[str, Cell]] = field(default_factory=list)
    changes: list[TypeChange] = field(default_factory=list)
    shapes: list[ShapedRow] = field(default_factory=list)
    n_done: int = 0
    n_failed: int = 0

    def add(self, result: SessionResult, labels: Labels, *, with_shapes: bool) -> None:
        """Take one session in."""
        from unitclass.analysis.changes import type_changes
        from unitclass.io.tables import classify_rows

        self.n_done += 1
        self.changes += type_changes(result, labels)
        if with_shapes:
            from unitclass.analysis.groups import shaped_rows

            self.shapes += shaped_rows(result, first=len(self.rows))
        self.rows += classify_rows(result, labels)


def run(args: argparse.Namespace) -> int:
    """Classify, then print or write the table."""
    from unitclass.commands.labels import in_words, seen_rows, words_of
    from unitclass.commands.options import plan_from
    from unitclass.commands.runs import check_table, exit_code, run_files
    from unitclass.commands.views import print_units

    check_table(args, args.changes)
    plan, found, older = plan_from(args), _Collected(), _older(args)
    words = words_of(args, plan)
    for outcome in run_files(args, plan):
        if outcome.result is None:
            found.n_failed += 1
            continue
        result, labels = in_words(outcome.result, plan, words)
        found.add(result, labels, with_shapes=args.groups)
        if args.against == STORE:
            older += seen_rows(outcome.result, plan, words)
        if _is_shown(args):
            print_units(result, labels)
    if found.n_done:
        _write(found, older, args)
    return exit_code(found.n_failed, found.n_done)


def _is_shown(args: argparse.Namespace) -> bool:
    return not args.json and "-" not in (args.table, args.changes)


def _older(args: argparse.Namespace) -> list[dict[str, str]]:
    if args.against in ("", STORE):
        return []
    from unitclass.io.against import read_older

    return read_older(args.against)


def _write(found: _Collected, older: list[dict[str, str]], args: argparse.Namespace) -> None:
    """Write the tables asked for; say what is about all files together."""
    from unitclass.commands.runs import write_rows, write_table_said
    from unitclass.commands.summaries import print_changes, print_groups, print_moves
    from unitclass.io.tables import CHANGE_COLUMNS, CLASSIFY_COLUMNS, change_rows

    rows = found.rows
    columns: tuple[str, ...] = CLASSIFY_COLUMNS
    if args.groups:
        from unitclass.analysis.groups import groups_of

        groups = groups_of(found.shapes)
        for shape, name in zip(found.shapes, groups.names, strict=True):
            rows[shape.row]["shape_group"] = name
        if _is_shown(args):
            print_groups(groups)
    if args.against:
        from unitclass.io.against import AGAINST_COLUMNS, compared, with_moves

        comparison = compared(rows, older, args.against)
        rows, columns = with_moves(rows, comparison), (*columns, *AGAINST_COLUMNS)
        if _is_shown(args):
            print_moves(comparison, args.against)
    if _is_shown(args):
        print_changes(found.changes)
    if args.table or args.json:
        write_rows(rows, args, columns=columns)
    if args.changes:
        write_table_said(args.changes, change_rows(found.changes), args, columns=CHANGE_COLUMNS)
