"""`unitclass cycles`: respiratory cycles, table and summary."""

from __future__ import annotations

import argparse

from unitclass.commands.options import add_paths, add_run_options, add_session_options


def add_arguments(parser: argparse.ArgumentParser) -> None:
    """Declare the options."""
    add_paths(parser)
    parser.add_argument("--table", default="", metavar="FILE", help="write the table as CSV or JSON (- is stdout)")
    add_session_options(parser)
    add_run_options(parser)


def run(args: argparse.Namespace) -> int:
    """Find the cycles, then print or write them."""
    from dataclasses import replace

    from unitclass.commands.options import plan_from
    from unitclass.commands.runs import exit_code, run_files, write_rows
    from unitclass.commands.views import print_cycles
    from unitclass.io.tables import CYCLE_COLUMNS, cycle_rows

    rows, n_done, failed = [], 0, 0
    for outcome in run_files(args, replace(plan_from(args), cycles_only=True)):
        if outcome.result is None:
            failed += 1
            continue
        n_done += 1
        rows += cycle_rows(outcome.result)
        if not args.json and args.table != "-":
            print_cycles(outcome.result)
    if n_done:
        write_rows(rows, args, columns=CYCLE_COLUMNS)
    return exit_code(failed, n_done)
