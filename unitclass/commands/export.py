"""`unitclass export`: labelled NWB copies and tables."""

from __future__ import annotations

import argparse
from typing import TYPE_CHECKING

from unitclass.commands.options import add_crosswalk, add_paths, add_run_options, add_session_options

if TYPE_CHECKING:
    from unitclass.batch import Plan
    from unitclass.records import Labels, SessionResult

CHANGES = "changes.csv"  # written when some session has several conditions


def add_arguments(parser: argparse.ArgumentParser) -> None:
    """Declare the options."""
    add_paths(parser)
    parser.add_argument("--out", required=True, metavar="DIR", help="folder for the labelled files and tables")
    parser.add_argument("--link-raw", action="store_true", help="link to the source's raw data instead of copying it")
    add_crosswalk(parser)
    add_session_options(parser)
    add_run_options(parser)


def run(args: argparse.Namespace) -> int:
    """Classify, write a labelled copy of every session, and the two tables."""
    from unitclass.analysis.changes import type_changes
    from unitclass.commands.labels import in_words, words_of
    from unitclass.commands.options import plan_from
    from unitclass.commands.progress import say
    from unitclass.commands.runs import Written, exit_code, run_files
    from unitclass.errors import UnitclassError
    from unitclass.io.atomic import check_target, made_folder
    from unitclass.io.table_files import write_table
    from unitclass.io.tables import (
        CHANGE_COLUMNS,
        CLASSIFY_COLUMNS,
        CYCLE_COLUMNS,
        change_rows,
        classify_rows,
        cycle_rows,
    )

    folder = made_folder(args.out)
    tables = {"units.csv": CLASSIFY_COLUMNS, "cycles.csv": CYCLE_COLUMNS, CHANGES: CHANGE_COLUMNS}
    for name in tables:
        check_target(str(folder / name), force=args.force)
    units, cycles, changes, failed = [], [], [], 0
    written: dict[str, str] = {}
    told = Written(args)
    plan = plan_from(args)
    words = words_of(args, plan)
    for outcome in run_files(args, plan):
        if outcome.result is None:
            failed += 1
            continue
        result, labels = in_words(outcome.result, plan, words)
        try:
            target = write_copy(result, labels, args, plan, written)
        except UnitclassError as error:
            failed += 1
            say(f"unitclass: {error}")
            continue
        units += classify_rows(result, labels)
        cycles += cycle_rows(result)
        changes += change_rows(type_changes(result, labels))
        told.add(target)
    if written:
        for (name, columns), rows in zip(tables.items(), (units, cycles, changes), strict=True):
            if name == CHANGES and not rows:
                continue
            write_table(str(folder / name), rows, force=args.force, columns=columns)
            told.add(folder / name)
    told.end()
    return exit_code(failed, len(written))


def write_copy(result: SessionResult, labels: Labels, args: argparse.Namespace, plan: Plan,
               written: dict[str, str]) -> str:
    """Write one labelled copy and return its path.

    `written`, target to source, holds the copies of this run and gains the new one.

    Raises
    ------
    TargetError
        When it cannot be written, or another file of the run has the same name; nothing
        half-written remains.
    """
    from pathlib import Path

    from unitclass.batch import read_planned
    from unitclass.errors import TargetError
    from unitclass.io.nwb_write import labelled_name, write_labelled

    target = str(Path(args.out) / labelled_name(result.path))
    if target in written:
        raise TargetError(f"has the name of {written[target]}, exported just now", where=result.path,
                          remedy="export it into another folder")
    write_labelled(result.path, target, read_planned(result.path, plan), result, labels, only=args.only,
                   link_raw=args.link_raw, force=args.force, settings=plan.settings)
    written[target] = result.path
    return target
