"""Who does the work on many files: this process, worker processes, or a Dask cluster."""

from __future__ import annotations

import os
from collections.abc import Iterator
from concurrent.futures import ProcessPoolExecutor
from contextlib import contextmanager
from dataclasses import dataclass
from typing import Any, Protocol

from unitclass.errors import UnitclassError, UsageError

CONNECT_S = 10
AHEAD = 2  # files begun for each worker: one in work, one waiting


@dataclass
class Task:
    """One call that was handed over, kept so that it can be handed over again."""

    call: tuple[Any, ...]
    promise: Any
    """What the runner gives the result for."""


class Runner(Protocol):
    """Whoever takes calls and gives back their results."""

    n_ahead: int

    def path_there(self, path: str) -> str:
        """Return the path by which whoever does the work finds a file."""
        ...

    def submit(self, *call: Any) -> Task:
        """Hand over a function and its arguments."""
        ...

    def result(self, task: Task) -> Any:
        """Wait for a result; raises UnitclassError in one line when the worker was lost."""
        ...


class Here:
    """This process, at once."""

    n_ahead = 0

    def path_there(self, path: str) -> str:
        """Return the path as it is."""
        return path

    def submit(self, *call: Any) -> Task:
        """Call now."""
        return Task(call, call[0](*call[1:]))

    def result(self, task: Task) -> Any:
        """Return what the call gave."""
        return task.promise


class Processes:
    """Worker processes. Spawned, never forked: threads of numerical libraries do not survive a fork."""

    def __init__(self, n_workers: int) -> None:
        self.n_ahead = AHEAD * n_workers
        self._n_workers = n_workers
        self._pool = self._made()

    def path_there(self, path: str) -> str:
        """Return the path as it is: workers start in the same folder."""
        return path

    def _made(self) -> ProcessPoolExecutor:
        import multiprocessing

        return ProcessPoolExecutor(self._n_workers, mp_context=multiprocessing.get_context("spawn"))

    def submit(self, *call: Any) -> Task:
        """Hand over to the next free worker."""
        from concurrent.futures.process import BrokenProcessPool

        try:
            return Task(call, self._pool.submit(*call))
        except BrokenProcessPool:
            self._pool = self._made()
            return Task(call, self._pool.submit(*call))

    def result(self, task: Task) -> Any:
        """Wait; what was lost with a dead worker is tried once more, alone, in new ones.

        Raises
        ------
        UnitclassError
            When the worker dies over it again.
        """
        from concurrent.futures.process import BrokenProcessPool

        try:
            return task.promise.result()
        except BrokenProcessPool:
            pass
        try:
            return self.submit(*task.call).promise.result()
        except BrokenProcessPool:
            raise UnitclassError("its worker process died", remedy="perhaps memory ran out: try it alone, or with "
                                                                   "fewer --workers") from None

    def close(self) -> None:
        """End the workers; files not begun are not begun any more."""
        self._pool.shutdown(wait=True, cancel_futures=True)


class Cluster:
    """A Dask cluster whose workers see the same files under the same paths."""

    def __init__(self, address: str) -> None:
        self._address = address
        self._client = _client(address)
        self.n_ahead = AHEAD * max(1, sum(self._client.nthreads().values()))

    def path_there(self, path: str) -> str:
        """Return the whole path: workers started elsewhere."""
        return os.path.abspath(path)

    def submit(self, *call: Any) -> Task:
        """Hand over to the scheduler, which tries again elsewhere when a worker is lost."""
        return Task(call, self._client.submit(*call, pure=False))

    def result(self, task: Task) -> Any:
        """Wait for the cluster.

        Raises
        ------
        UnitclassError
            When workers die over this call.
        UsageError
            When the scheduler is gone.
        """
        from concurrent.futures import CancelledError

        from distributed import KilledWorker

        try:
            return task.promise.result()
        except KilledWorker:
            raise UnitclassError("the cluster's workers died over it", remedy="perhaps memory ran out") from None
        except (CancelledError, OSError, TimeoutError) as error:
            raise SchedulerLostError(f"the scheduler was lost ({type(error).__name__})", where=self._address,
                                     remedy="what was finished is kept: run the same command again") from None

    def close(self) -> None:
        """Leave the cluster; it goes on without us."""
        self._client.close(timeout=2)


class SchedulerLostError(UsageError):
    """The scheduler cannot be reached: no file can be done, so the run ends."""


def _client(address: str) -> Any:
    try:
        from distributed import Client
    except ImportError:
        raise UsageError("--scheduler needs dask.distributed", remedy="pip install 'unitclass[dask]'") from None
    try:
        return Client(address, timeout=CONNECT_S, set_as_default=False)  # type: ignore[no-untyped-call]
    except (OSError, ValueError, TimeoutError) as error:
        raise SchedulerLostError("no Dask scheduler answers", where=address,
                                 remedy="start one with `dask scheduler`, or use --workers") from error


@contextmanager
def runner_for(n_files: int, *, workers: int = 1, scheduler: str = "") -> Iterator[Runner]:
    """Give whoever is to do the work; ended with the block.

    Raises
    ------
    UsageError
        When the scheduler cannot be reached.
    """
    if not scheduler and (workers < 2 or n_files < 2):
        yield Here()
        return
    runner = Cluster(scheduler) if scheduler else Processes(min(workers, n_files))
    try:
        yield runner
    finally:
        runner.close()
