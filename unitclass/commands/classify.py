"""`unitclass classify`: suggested firing type of every unit in every condition."""

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
    """Classify, then print or write the table."""
    from unitclass.commands.labels import labels_of
    from unitclass.commands.runs import exit_code, run_files, write_rows
    from unitclass.commands.views import print_units
    from unitclass.io.tables import CLASSIFY_COLUMNS, classify_rows

    rows, results, failed = [], [], 0
    for outcome in run_files(args):
        if outcome.result is None:
            failed += 1
            continue
        labels = labels_of(outcome.result, args)
        rows += classify_rows(outcome.result, labels)
        results.append((outcome.result, labels))
    if results and (args.table or args.json):
        write_rows(rows, args, columns=CLASSIFY_COLUMNS)
    if not args.json and args.table != "-":
        for result, labels in results:
            print_units(result, labels)
    return exit_code(failed, len(results))
