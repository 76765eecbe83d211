"""Many files: read and judge each, here, in worker processes or on a Dask cluster.

One bad file never stops the rest, results come in the order of the files whatever did the work,
and what an earlier run left in the cache is not made again.
"""

from __future__ import annotations

from collections import deque
from collections.abc import Iterator, Sequence
from dataclasses import dataclass, replace
from functools import cached_property

from unitclass import __version__
from unitclass.batch.runners import Runner, SchedulerLostError, Task
from unitclass.classify.templates import TypeLibrary
from unitclass.errors import FileError, UnitclassError
from unitclass.io.condition_table import ConditionTable
from unitclass.io.nwb_read import read_recording
from unitclass.io.result_cache import CacheKey, FileStamp, ResultCache, cache_options
from unitclass.io.store_reading import digest_of_edits
from unitclass.records import CycleEdit, Recording, SessionResult
from unitclass.settings import Settings


@dataclass(frozen=True)
class Plan:
    """How every file of a run is read and judged. `store` is an existing file of decisions, or empty."""

    settings: Settings
    library: TypeLibrary
    nerve: str = ""
    condition_column: str = ""
    condition_table: ConditionTable | None = None
    only: str = ""
    store: str = ""
    cycles_only: bool = False
    is_debug: bool = False

    @cached_property
    def key(self) -> CacheKey:
        """Return what besides a file shapes its results."""
        return CacheKey(self.settings.digest(), self.library.digest(),
                        cache_options(self.nerve, self.condition_column, self.only, self.condition_table,
                                      is_cycles_only=self.cycles_only))


@dataclass(frozen=True)
class Outcome:
    """What became of one file: a result, or one line that says why there is none."""

    path: str
    result: SessionResult | None = None
    problem: str = ""
    is_kept: bool = False
    edits_digest: str = ""
    """Tells apart the cycle edits that the result was made with."""


def read_planned(path: str, plan: Plan) -> Recording:
    """Return the recording at `path`, its conditions cut down to the one asked for.

    Raises
    ------
    FileError
        When the file cannot be used, or holds no condition of the name in `plan.only`.
    """
    recording = read_recording(path, rig=plan.settings.rig, nerve=plan.nerve,
                               condition_column=plan.condition_column, condition_table=plan.condition_table)
    if not plan.only:
        return recording
    kept = tuple(c for c in recording.conditions if plan.only in (c.name, c.label))
    if not kept:
        names = ", ".join(c.name for c in recording.conditions) or "none"
        raise FileError(f"no condition called {plan.only!r}", where=path, remedy=f"the file's conditions: {names}")
    return replace(recording, conditions=kept)


def edits_of(recording: Recording, plan: Plan) -> tuple[CycleEdit, ...]:
    """Return what people changed about the cycles, if their decisions are on disk."""
    if not plan.store:
        return ()
    from unitclass.io.decisions import DecisionStore

    with DecisionStore(plan.store, is_read_only=True) as store:
        return store.edits_for(recording.identifier, recording.object_id)


def _edits_digest(plan: Plan, identifier: str, object_id: str) -> str:
    """Return what tells apart a session's cycle edits; as the review computes it."""
    if not plan.store:
        return ""
    from unitclass.io.decisions import DecisionStore

    with DecisionStore(plan.store, is_read_only=True) as store:
        return store.edits_digest(identifier, object_id)


def analyse_file(path: str, plan: Plan) -> Outcome:
    """Read and judge one file; whatever fails, even a bug of ours, becomes the outcome's problem."""
    from unitclass.analysis import analyse, cycles_only

    method = cycles_only if plan.cycles_only else analyse
    try:
        recording = read_planned(path, plan)
        edits = edits_of(recording, plan)
        result = method(recording, plan.library, plan.settings, edits=edits, program_version=__version__)
    except UnitclassError as error:
        return Outcome(path, problem=str(error))
    except Exception as error:
        if plan.is_debug:
            raise
        return Outcome(path, problem=f"{path}: failed in a way that nobody foresaw ({type(error).__name__}: {error}); "
                                     "run it alone with --debug and report what it prints")
    return Outcome(path, result, edits_digest=digest_of_edits(edits))


@dataclass(frozen=True)
class _Begun:
    """A file whose results are known already, or on their way."""

    path: str
    stamp: FileStamp | None
    known: Outcome | None = None
    task: Task | None = None


def analyse_files(paths: Sequence[str], plan: Plan, runner: Runner, cache: ResultCache | None = None) -> Iterator[Outcome]:
    """Yield every file's outcome, in the order of `paths`, whatever the runner.

    Parameters
    ----------
    runner : Runner
        Who does the work; see `runners.runner_for`. Only a few files more than it has workers are
        begun before their turn, so memory stays the same however many there are.
    cache : ResultCache, optional
        Where results are looked for first and kept afterwards.
    """
    begun: deque[_Begun] = deque()
    for path in paths:
        begun.append(_begin(path, plan, runner, cache))
        if len(begun) > runner.n_ahead:
            yield _finished(begun.popleft(), plan, runner, cache)
    while begun:
        yield _finished(begun.popleft(), plan, runner, cache)


def _begin(path: str, plan: Plan, runner: Runner, cache: ResultCache | None) -> _Begun:
    stamp = _stamp(path)
    if cache is not None:
        found = cache.find(path, plan.key, edits_digest_of=lambda *names: _edits_digest(plan, *names))
        if found is not None:
            return _Begun(path, stamp, known=Outcome(path, found.session_result(), is_kept=True))
    return _Begun(path, stamp, task=runner.submit(analyse_file, runner.path_there(path), plan))


def _finished(one: _Begun, plan: Plan, runner: Runner, cache: ResultCache | None) -> Outcome:
    if one.known is not None:
        return one.known
    assert one.task is not None
    try:
        outcome: Outcome = runner.result(one.task)
    except SchedulerLostError:
        raise
    except UnitclassError as error:
        return Outcome(one.path, problem=f"{one.path}: {error}")
    outcome = _as_named(outcome, one.path)
    if cache is not None and one.stamp is not None and outcome.result is not None:
        cache.put(outcome.result, one.stamp, plan.key, edits_digest=outcome.edits_digest)
    return outcome


def _as_named(outcome: Outcome, path: str) -> Outcome:
    """Return the outcome under the name that the user gave the file."""
    if outcome.path == path:
        return outcome
    result = None if outcome.result is None else replace(outcome.result, path=path)
    return replace(outcome, path=path, result=result, problem=outcome.problem.replace(outcome.path, path))


def _stamp(path: str) -> FileStamp | None:
    try:
        return FileStamp.of(path)
    except OSError:
        return None
