"""`unitclass demo`: the main job on a sample session, start to end."""

from __future__ import annotations

import argparse
import os
import shutil
import sys
from pathlib import Path

FOLDER = "unitclass-demo"
SAMPLE = "quill-baseline.nwb"


def add_arguments(parser: argparse.ArgumentParser) -> None:
    """Declare the options."""
    parser.add_argument("--out", default=FOLDER, metavar="DIR", help=f"working folder (default: {FOLDER})")
    parser.add_argument("--no-review", action="store_true", help="print the table even where there is a terminal")
    parser.add_argument("--quiet", action="store_true", help="no progress, no notes")


def run(args: argparse.Namespace) -> int:
    """Copy the sample, classify it, review it where there is a terminal, write the labelled NWB."""
    from unitclass.commands.export import write_copy
    from unitclass.commands.labels import labels_of
    from unitclass.commands.options import plan_from
    from unitclass.commands.parser import parse
    from unitclass.commands.runs import run_files, write_rows
    from unitclass.commands.views import print_units
    from unitclass.io.atomic import made_folder
    from unitclass.io.tables import CLASSIFY_COLUMNS, classify_rows

    folder = made_folder(args.out)
    session, table = _copied_sample(folder), folder / "units.csv"
    if _has_terminal() and not args.no_review:
        review = parse(["review", str(session)])
        review.run(review)
    job = parse(["export", str(session), "--out", str(folder), "--force", *(["--quiet"] if args.quiet else [])])
    plan = plan_from(job)
    for outcome in run_files(job, plan):
        if outcome.result is None:
            return 1
        labels = labels_of(outcome.result, plan)
        print_units(outcome.result, labels)
        job.table = str(table)
        write_rows(classify_rows(outcome.result, labels), job, columns=CLASSIFY_COLUMNS)
        target = write_copy(outcome.result, labels, job, plan, {})
    _say_what_next(session, table, target)
    return 0


def _has_terminal() -> bool:
    return sys.stdin.isatty() and sys.stdout.isatty() and os.environ.get("TERM", "dumb") != "dumb"


def _copied_sample(folder: Path) -> Path:
    """Return the working copy; an earlier one is kept, since decisions may hang on it."""
    from unitclass.io.resolver import samples_folder

    source = samples_folder() / SAMPLE
    copy = folder / source.name
    if not copy.exists():
        shutil.copyfile(source, copy)
    return copy


def _say_what_next(session: Path, table: Path, target: str) -> None:
    print("written:")
    print(f"  {session}  the session, a copy of the sample")
    print(f"  {table}  the suggestions as a table")
    print(f"  {target}  the labelled NWB")
    print("next:")
    print(f"  unitclass inventory {session}")
    print(f"  unitclass review {session}")
    print(f"  unitclass report {session} --out {session.parent / 'report'}")
    print("  unitclass classify YOUR_FILE.nwb --table units.csv")
