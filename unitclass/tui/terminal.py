"""Whether this is a terminal that can show the review, and one clear message when it is not."""

from __future__ import annotations

import os
import sys

from unitclass.errors import UsageError


def check_terminal() -> None:
    """Raise UsageError where the review cannot be shown: no terminal, or one without a cursor.

    Also points the toolkit, which paints on standard error, to standard output when only the
    latter is a terminal (as in ``unitclass review … 2>log``).
    """
    term = os.environ.get("TERM", "")
    if term in ("", "dumb", "unknown"):
        raise UsageError(f"the review needs a terminal that can place a cursor (TERM is {term!r})",
                         remedy="set TERM, or use classify --table and export")
    if not (_is_terminal(sys.__stdin__) and (_is_terminal(sys.__stdout__) or _is_terminal(sys.__stderr__))):
        raise UsageError("the review needs a terminal for keys and screen",
                         remedy="run it without pipes, or use classify --table and export")
    if not _is_terminal(sys.__stderr__):
        sys.__stderr__ = sys.__stdout__  # type: ignore[misc]


def _is_terminal(stream: object) -> bool:
    try:
        return stream is not None and bool(stream.isatty())  # type: ignore[attr-defined]
    except ValueError:  # a closed stream
        return False
