"""Runs the program as a user does, in this process."""

from __future__ import annotations

import csv
import io
from collections.abc import Sequence
from contextlib import redirect_stderr, redirect_stdout
from dataclasses import dataclass
from pathlib import Path

from unitclass.__main__ import main


@dataclass(frozen=True)
class Ran:
    """What a run left behind."""

    code: int
    out: str
    err: str


def run(*argv: str | Path) -> Ran:
    """Return exit code, standard output and standard error."""
    out, err = io.StringIO(), io.StringIO()
    with redirect_stdout(out), redirect_stderr(err):
        try:
            code = main([str(a) for a in argv])
        except SystemExit as stop:
            code = int(stop.code or 0)
    return Ran(code, out.getvalue(), err.getvalue())


def rows_of(path: Path) -> list[dict[str, str]]:
    """Return the rows of a CSV table."""
    with open(path, encoding="utf-8", newline="") as file:
        return list(csv.DictReader(file))


def column(rows: Sequence[dict[str, str]], name: str) -> list[str]:
    """Return one column."""
    return [row[name] for row in rows]
