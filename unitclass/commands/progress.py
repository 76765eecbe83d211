"""Messages and progress: on stderr, and progress only when it is a terminal."""

from __future__ import annotations

import os
import sys
from collections.abc import Callable, Iterator
from contextlib import contextmanager

Step = Callable[[str], None]


def say(line: str, *, quiet: bool = False) -> None:
    """Print a message for a person."""
    if not quiet:
        print(line, file=sys.stderr)


@contextmanager
def progress(n_steps: int, *, quiet: bool) -> Iterator[Step]:
    """Show a bar with the time left while the block runs; the yielded call ends one step."""
    if quiet or not sys.stderr.isatty() or os.environ.get("TERM") == "dumb":
        yield lambda _: None
        return
    from rich.console import Console
    from rich.progress import BarColumn, MofNCompleteColumn, Progress, TextColumn, TimeRemainingColumn

    columns = (TextColumn("{task.description}", markup=False), BarColumn(), MofNCompleteColumn(),
               TimeRemainingColumn())
    # Lines printed meanwhile go above the bar; what is piped away goes where it is piped.
    with Progress(*columns, console=Console(stderr=True), transient=True, redirect_stdout=sys.stdout.isatty()) as bar:
        task = bar.add_task("reading", total=n_steps)

        def step(name: str) -> None:
            bar.update(task, advance=1, description=name)
        yield step
