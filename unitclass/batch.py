"""Many files: read and judge each, here or in worker processes; one bad file never stops the rest."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass, replace

from unitclass import __version__
from unitclass.classify.templates import TypeLibrary
from unitclass.errors import FileError, UnitclassError
from unitclass.io.condition_table import ConditionTable
from unitclass.io.nwb_read import read_recording
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


@dataclass(frozen=True)
class Outcome:
    """What became of one file: a result, or one line that says why there is none."""

    path: str
    result: SessionResult | None = None
    recording: Recording | None = None
    problem: str = ""


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


def analyse_file(path: str, plan: Plan) -> Outcome:
    """Read and judge one file; every expected failure becomes the outcome's problem."""
    from unitclass.analysis import analyse, cycles_only

    method = cycles_only if plan.cycles_only else analyse
    try:
        recording = read_planned(path, plan)
        result = method(recording, plan.library, plan.settings, edits=edits_of(recording, plan),
                        program_version=__version__)
    except UnitclassError as error:
        return Outcome(path, problem=str(error))
    return Outcome(path, result, recording)


def analyse_files(paths: Sequence[str], plan: Plan, *, workers: int = 1) -> Iterator[Outcome]:
    """Yield every file's outcome, in the order of `paths`, whatever the number of workers."""
    if workers <= 1 or len(paths) < 2:
        yield from (analyse_file(path, plan) for path in paths)
        return
    import multiprocessing
    from concurrent.futures import ProcessPoolExecutor

    # Spawned, never forked: threads of numerical libraries do not survive a fork.
    with ProcessPoolExecutor(min(workers, len(paths)), mp_context=multiprocessing.get_context("spawn")) as pool:
        yield from pool.map(analyse_file, paths, [plan] * len(paths))
