"""Heavy work beside the screen: a spawned, niced process whose output goes nowhere.

A thread would share the interpreter lock with the repaint, a forked process the toolkit's
threads; a spawned one shares nothing, and when this program dies its pipe closes and it ends.
"""

from __future__ import annotations

import os
import signal
import sys
import threading
from collections.abc import Callable, Iterable
from contextlib import redirect_stderr
from dataclasses import dataclass
from typing import Any

from unitclass.errors import UnitclassError

NICENESS = 10


@dataclass(frozen=True)
class Done:
    """What came of one piece of work: `result`, or in `problem` one line why there is none."""

    name: str
    result: Any = None
    problem: str = ""


class Work:
    """Calls `function` for each of several pieces of work in one process, one after the other.

    Parameters
    ----------
    function : callable
        A module-level function or a partial of one, so that the process can find it.
    pieces : iterable of (name, arguments)
        Gone through in a thread while the process works; may be a generator that takes its time.
    report : callable
        Called from that thread with a Done for each piece as it comes, and with None at the end.
    """

    def __init__(self, function: Callable[..., Any], pieces: Iterable[tuple[str, tuple[Any, ...]]],
                 report: Callable[[Done | None], None]) -> None:
        self._function, self._pieces, self._report = function, pieces, report
        self._is_stopped = False
        self._process: Any = None
        self._thread = threading.Thread(target=self._run, daemon=True, name="work")

    def start(self) -> Work:
        """Start without waiting."""
        self._thread.start()
        return self

    def stop(self) -> None:
        """End the process now; nothing more is reported."""
        self._is_stopped = True
        if self._process is not None and self._process.is_alive():
            self._process.terminate()

    def _run(self) -> None:
        import multiprocessing

        context = multiprocessing.get_context("spawn")
        ours, theirs = context.Pipe()
        self._process = context.Process(target=_serve, args=(theirs,), daemon=True)
        try:
            with redirect_stderr(sys.__stderr__):  # the toolkit's stand-in has no file handle to pass on
                self._process.start()
            theirs.close()
            ours.send(self._function)
            self._pass_on(ours)
        except Exception as error:
            self._tell(Done("", problem=f"the work could not be started: {error}"))
        finally:
            ours.close()
        self._tell(None)

    def _pass_on(self, pipe: Any) -> None:
        for name, arguments in self._pieces:
            if self._is_stopped:
                return
            try:
                pipe.send(arguments)
                result, problem = pipe.recv()
                self._tell(Done(name, result, problem))
            except (EOFError, OSError):
                self._process.join(5.0)
                code = self._process.exitcode
                self._tell(Done(name, problem=f"{name}: the work ended unexpectedly (exit code {code})"))
                return
        pipe.send(None)

    def _tell(self, done: Done | None) -> None:
        if not self._is_stopped:
            self._report(done)


def _serve(pipe: Any) -> None:
    """Work off what comes through the pipe, the function first; runs in the process."""
    signal.signal(signal.SIGINT, signal.SIG_IGN)
    _silence()
    if hasattr(os, "nice"):
        os.nice(NICENESS)
    function = pipe.recv()
    while True:
        try:
            arguments = pipe.recv()
        except EOFError:
            return
        if arguments is None:
            return
        pipe.send(_outcome(function, arguments))


def _outcome(function: Callable[..., Any], arguments: tuple[Any, ...]) -> tuple[Any, str]:
    try:
        return function(*arguments), ""
    except UnitclassError as error:
        return None, str(error)
    except Exception as error:
        return None, f"{type(error).__name__}: {error}"


def _silence() -> None:
    """Point standard output and error at nothing, below Python too: libraries print on file handles."""
    nowhere = os.open(os.devnull, os.O_WRONLY)
    for handle in (1, 2):
        os.dup2(nowhere, handle)
    os.close(nowhere)
    sys.stdout = sys.stderr = open(os.devnull, "w")  # noqa: SIM115
