"""What commands over many files share: the run itself, its exit code, its tables."""

from __future__ import annotations

import argparse
from collections.abc import Iterator, Mapping, Sequence
from pathlib import Path
from typing import TYPE_CHECKING

from unitclass.commands.progress import progress, say
from unitclass.errors import NoUsableFileError

if TYPE_CHECKING:
    from unitclass.batch import Outcome, Plan
    from unitclass.io.result_cache import ResultCache
    from unitclass.io.table_files import Cell


def run_files(args: argparse.Namespace, plan: Plan) -> Iterator[Outcome]:
    """Yield the outcome of every file named; failures are said on stderr as they come."""
    from unitclass.batch import analyse_files, runner_for
    from unitclass.io.paths import find_files

    check_table(args)
    paths = find_files(args.paths)
    runner = runner_for(len(paths), workers=args.workers, scheduler=args.scheduler)
    with progress(len(paths), quiet=args.quiet) as step, runner as who:
        for outcome in analyse_files(paths, plan, who, known_results(args)):
            step(outcome.path)
            if outcome.problem:
                say(f"unitclass: {outcome.problem}")
            elif outcome.result is not None:
                for note in outcome.result.notes:
                    say(f"{outcome.path}: {note}", quiet=args.quiet)
            yield outcome


def known_results(args: argparse.Namespace) -> ResultCache | None:
    """Return the results of earlier runs, unless they are not wanted."""
    if args.fresh:
        return None
    from unitclass.io.result_cache import ResultCache
    from unitclass.io.store_place import cache_path

    return ResultCache(cache_path())


def check_table(args: argparse.Namespace, *more: str) -> None:
    """Refuse tables that exist, or are of no known kind, before any long work."""
    from unitclass.io.atomic import check_target
    from unitclass.io.table_files import table_form

    for table in (getattr(args, "table", ""), *more):
        if table not in ("", "-"):
            table_form(table)
            check_target(table, force=args.force)


def exit_code(n_failed: int, n_done: int) -> int:
    """Return 0 when all files were done and 1 when some failed.

    Raises
    ------
    NoUsableFileError
        When none was done.
    """
    if not n_done:
        raise NoUsableFileError("no file was usable", remedy="the lines above say why; try `unitclass inventory`")
    return 1 if n_failed else 0


def write_rows(rows: Sequence[Mapping[str, Cell]], args: argparse.Namespace, *, columns: Sequence[str]) -> None:
    """Write the table named on the command line; with --json, print JSON when none is named."""
    if args.table:
        write_table_said(args.table, rows, args, columns=columns)
    if args.json and args.table != "-":
        write_table_said("-", rows, args, columns=columns)


def write_table_said(table: str, rows: Sequence[Mapping[str, Cell]], args: argparse.Namespace, *,
                     columns: Sequence[str]) -> None:
    """Write a table to a file, or to stdout ("-") as CSV or, with --json, as JSON."""
    from unitclass.io.table_files import write_table

    form = "json" if args.json and table == "-" else ""
    write_table(table, rows, force=args.force, columns=columns, form=form)
    say(f"wrote {table}", quiet=args.quiet or table == "-")


class Written:
    """The files that a run has written: a line each as they are there, or, with --json, one list at the end."""

    def __init__(self, args: argparse.Namespace) -> None:
        self._is_json = args.json
        self._files: list[str] = []

    def add(self, file: str | Path) -> None:
        """Take a file in that is whole now."""
        self._files.append(str(file))
        if not self._is_json:
            print(file, flush=True)

    def end(self) -> None:
        """Say what is left to be said."""
        if self._is_json:
            import json

            print(json.dumps(self._files, ensure_ascii=False, indent=1))
