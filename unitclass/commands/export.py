"""`unitclass export`: labelled NWB copies and tables."""

from __future__ import annotations

import argparse
from typing import TYPE_CHECKING

from unitclass.commands.options import add_paths, add_run_options, add_session_options

if TYPE_CHECKING:
    from unitclass.batch import Outcome
    from unitclass.records import Labels


def add_arguments(parser: argparse.ArgumentParser) -> None:
    """Declare the options."""
    add_paths(parser)
    parser.add_argument("--out", required=True, metavar="DIR", help="folder for the labelled files and tables")
    parser.add_argument("--link-raw", action="store_true", help="link to the source's raw data instead of copying it")
    add_session_options(parser)
    add_run_options(parser)


def run(args: argparse.Namespace) -> int:
    """Classify, write a labelled copy of every session, and the two tables."""
    from unitclass.commands.labels import labels_of
    from unitclass.commands.progress import say
    from unitclass.commands.runs import exit_code, run_files
    from unitclass.errors import UnitclassError
    from unitclass.io.atomic import check_target, made_folder
    from unitclass.io.table_files import write_table
    from unitclass.io.tables import CLASSIFY_COLUMNS, CYCLE_COLUMNS, classify_rows, cycle_rows

    folder = made_folder(args.out)
    tables = {"units.csv": CLASSIFY_COLUMNS, "cycles.csv": CYCLE_COLUMNS}
    for name in tables:
        check_target(str(folder / name), force=args.force)
    units, cycles, failed = [], [], 0
    written: dict[str, str] = {}
    for outcome in run_files(args):
        if outcome.result is None:
            failed += 1
            continue
        labels = labels_of(outcome.result, args)
        try:
            target = write_copy(outcome, labels, args, written)
        except UnitclassError as error:
            failed += 1
            say(f"unitclass: {error}")
            continue
        units += classify_rows(outcome.result, labels)
        cycles += cycle_rows(outcome.result)
        print(target, flush=True)
    if written:
        for (name, columns), rows in zip(tables.items(), (units, cycles), strict=True):
            write_table(str(folder / name), rows, force=args.force, columns=columns)
            print(folder / name)
    return exit_code(failed, len(written))


def write_copy(outcome: Outcome, labels: Labels, args: argparse.Namespace, written: dict[str, str]) -> str:
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
    from unitclass.commands.options import plan_from
    from unitclass.errors import TargetError
    from unitclass.io.nwb_write import labelled_name, write_labelled

    assert outcome.result is not None
    target = str(Path(args.out) / labelled_name(outcome.path))
    if target in written:
        raise TargetError(f"has the name of {written[target]}, exported just now", where=outcome.path,
                          remedy="export it into another folder")
    plan = plan_from(args)
    write_labelled(outcome.path, target, read_planned(outcome.path, plan), outcome.result, labels, only=args.only,
                   link_raw=args.link_raw, force=args.force, settings=plan.settings)
    written[target] = outcome.path
    return target
