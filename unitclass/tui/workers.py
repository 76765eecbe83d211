"""Heavy work beside the screen: a spawned, niced process whose output goes nowhere.

A thread would share the interpreter lock with the repaint, a forked process the toolkit's
threads; a spawned one shares nothing, and when this program dies its pipe closes and it ends.
"""

from __future__ import annotations

import os
import signal
import sys
import threading
from collections.abc import Callable, Sequence
from typing import Any

from unitclass.errors import UnitclassError

Report = tuple[str, str, Any]
"""(path, "done" or "failed", result or reason)."""

NICENESS = 10


class Analysis:
    """Runs `analyse(path)` for each of several paths in one process, one after the other.

    Parameters
    ----------
    analyse : callable
        A module-level function or a partial of one, so that the process can find it.
    report : callable
        Called from a thread with each Report as it comes, and with None after the last.
    """

    def __init__(self, analyse: Callable[[str], Any], paths: Sequence[str],
                 report: Callable[[Report | None], None]) -> None:
        self._report = report
        self._left = list(paths)
        self._is_stopped = False
        self._thread = threading.Thread(target=self._run, args=(analyse, tuple(paths)), daemon=True,
                                        name="analysis")
        self._process: Any = None

    def start(self) -> None:
        """Start without waiting."""
        self._thread.start()

    def stop(self) -> None:
        """End the process now; nothing more is reported."""
        self._is_stopped = True
        if self._process is not None and self._process.is_alive():
            self._process.terminate()

    def _run(self, analyse: Callable[[str], Any], paths: tuple[str, ...]) -> None:
        import multiprocessing

        context = multiprocessing.get_context("spawn")
        receiver, sender = context.Pipe(duplex=False)
        self._process = context.Process(target=_work, args=(analyse, paths, sender), daemon=True)
        try:
            self._process.start()
            sender.close()
            self._pass_on(receiver)
        except Exception as error:
            self._fail_rest(f"the analysis could not be started: {error}")
        if not self._is_stopped:
            self._report(None)

    def _pass_on(self, receiver: Any) -> None:
        while self._left and not self._is_stopped:
            try:
                report = receiver.recv()
            except (EOFError, OSError):
                self._process.join(5.0)
                self._fail_rest(f"the analysis ended unexpectedly (exit code {self._process.exitcode})")
                return
            self._left.remove(report[0])
            if not self._is_stopped:
                self._report(report)

    def _fail_rest(self, reason: str) -> None:
        left, self._left = self._left, []
        for path in left:
            if not self._is_stopped:
                self._report((path, "failed", reason))


def _work(analyse: Callable[[str], Any], paths: tuple[str, ...], sender: Any) -> None:
    """Analyse each path and send what comes of it; runs in the process."""
    signal.signal(signal.SIGINT, signal.SIG_IGN)
    _silence()
    os.nice(NICENESS)
    for path in paths:
        sender.send(_outcome(analyse, path))


def _outcome(analyse: Callable[[str], Any], path: str) -> Report:
    try:
        return path, "done", analyse(path)
    except UnitclassError as error:
        return path, "failed", str(error)
    except Exception as error:
        return path, "failed", f"{path}: {type(error).__name__}: {error}"


def _silence() -> None:
    """Point standard output and error at nothing, below Python too: libraries print on file handles."""
    nowhere = os.open(os.devnull, os.O_WRONLY)
    for handle in (1, 2):
        os.dup2(nowhere, handle)
    os.close(nowhere)
    sys.stdout = sys.stderr = open(os.devnull, "w")  # noqa: SIM115
