"""`unitclass export`: labelled NWB copies and tables."""

from __future__ import annotations

import argparse
from typing import TYPE_CHECKING

from unitclass.commands.options import add_paths, add_run_options, add_session_options

if TYPE_CHECKING:
    from unitclass.batch import Outcome


def add_arguments(parser: argparse.ArgumentParser) -> None:
    """Declare the options."""
    add_paths(parser)
    parser.add_argument("--out", required=True, metavar="DIR", help="folder for the labelled files and tables")
    parser.add_argument("--link-raw", action="store_true", help="link to the source's raw data instead of copying it")
    add_session_options(parser)
    add_run_options(parser)


def run(args: argparse.Namespace) -> int:
    """Classify, write a labelled copy of every session, and the two tables."""
    from pathlib import Path

    from unitclass.commands.labels import labels_of
    from unitclass.commands.progress import say
    from unitclass.commands.runs import exit_code, run_files
    from unitclass.errors import TargetError, UnitclassError
    from unitclass.io.table_files import write_table
    from unitclass.io.tables import CLASSIFY_COLUMNS, CYCLE_COLUMNS, classify_rows, cycle_rows

    folder = made_folder(args.out)
    tables = {"units.csv": CLASSIFY_COLUMNS, "cycles.csv": CYCLE_COLUMNS}
    for name in tables:
        if (Path(folder) / name).exists() and not args.force:
            raise TargetError("exists already", where=str(Path(folder) / name), remedy="name another folder or --force")
    units, cycles, n_done, failed = [], [], 0, 0
    for outcome in run_files(args):
        if outcome.result is None:
            failed += 1
            continue
        try:
            target = write_copy(outcome, args)
        except UnitclassError as error:
            failed += 1
            say(f"unitclass: {error}")
            continue
        n_done += 1
        units += classify_rows(outcome.result, labels_of(outcome.result, args))
        cycles += cycle_rows(outcome.result)
        print(target, flush=True)
    if n_done:
        for (name, columns), rows in zip(tables.items(), (units, cycles), strict=True):
            write_table(str(Path(folder) / name), rows, force=args.force, columns=columns)
            print(Path(folder) / name)
    return exit_code(failed, n_done)


def write_copy(outcome: Outcome, args: argparse.Namespace) -> str:
    """Write one labelled copy and return its path.

    Raises
    ------
    TargetError
        When it cannot be written; nothing half-written remains.
    """
    from pathlib import Path

    from unitclass.commands.labels import labels_of
    from unitclass.io.nwb_write import labelled_name, write_labelled

    assert outcome.result is not None
    assert outcome.recording is not None
    target = str(Path(args.out) / labelled_name(outcome.path))
    write_labelled(outcome.path, target, outcome.recording, outcome.result, labels_of(outcome.result, args),
                   only=args.only, link_raw=args.link_raw, force=args.force)
    return target


def made_folder(out: str) -> str:
    """Return the folder, made if it is not there.

    Raises
    ------
    TargetError
        When it cannot be made.
    """
    from pathlib import Path

    from unitclass.errors import TargetError

    try:
        Path(out).mkdir(parents=True, exist_ok=True)
    except OSError as error:
        raise TargetError("cannot be made", where=out, remedy=error.strerror or str(error)) from error
    return out
