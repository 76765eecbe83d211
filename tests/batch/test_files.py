"""Many files: the same results whoever does the work, and nothing made twice."""

from __future__ import annotations

import os
import shutil
from pathlib import Path

import pytest

from tests.commands.program import rows_of, run
from unitclass.batch import Plan, analyse_files, runner_for
from unitclass.batch.runners import Here, Processes, Task
from unitclass.errors import UnitclassError
from unitclass.io.codec import encoded
from unitclass.io.decisions import DecisionStore
from unitclass.io.resolver import samples_folder
from unitclass.io.result_cache import ResultCache
from unitclass.io.template_files import read_library
from unitclass.records import CycleEdit
from unitclass.settings import Settings

PLAN = Plan(Settings(), read_library())


@pytest.fixture(scope="module")
def archive(tmp_path_factory) -> list[str]:
    """Return five copies of the slice sample, and one file that is no NWB."""
    folder = tmp_path_factory.mktemp("archive")
    for i in range(5):
        shutil.copyfile(samples_folder() / "sorrel-slice.nwb", folder / f"slice-{i}.nwb")
    (folder / "slice-2b.nwb").write_text("no HDF5")
    return sorted(str(path) for path in folder.glob("*.nwb"))


class Counting(Here):
    """Does the work here and counts it; says how many files were begun before their turn."""

    def __init__(self, n_ahead: int = 0) -> None:
        self.n_ahead, self.n_calls = n_ahead, 0

    def submit(self, *call: object) -> Task:
        self.n_calls += 1
        return super().submit(*call)


def outcomes(paths: list[str], runner: Here, cache: ResultCache | None = None) -> list[tuple[str, bytes, str]]:
    return [(o.path, encoded(o.result) if o.result else b"", o.problem) for o in analyse_files(paths, PLAN, runner, cache)]


def test_two_worker_processes_give_what_this_process_gives_in_the_same_order(archive):
    with runner_for(len(archive), workers=2) as two:
        assert isinstance(two, Processes)
        assert outcomes(archive, two) == outcomes(archive, Here())  # type: ignore[arg-type]


def test_one_bad_file_is_a_line_and_the_others_are_done(archive):
    found = list(analyse_files(archive, PLAN, Here()))
    bad, = [o for o in found if o.problem]
    assert Path(bad.path).name == "slice-2b.nwb"
    assert bad.problem.startswith(bad.path)
    assert sum(o.result is not None for o in found) == 5


def test_a_second_run_makes_only_what_is_new_or_changed(archive, tmp_path):
    files = [str(tmp_path / Path(p).name) for p in archive]
    for source, copy in zip(archive, files, strict=True):
        shutil.copyfile(source, copy)
    cache = ResultCache(tmp_path / "results.sqlite")
    first, second, third = Counting(), Counting(), Counting()
    whole = outcomes(files, first, cache)
    assert outcomes(files, second, cache) == whole
    os.utime(files[0], (1, 1))
    outcomes(files, third, cache)
    assert (first.n_calls, second.n_calls, third.n_calls) == (6, 1, 2)  # the bad file is tried every time


def test_other_settings_templates_or_cycle_edits_make_results_anew(archive, tmp_path):
    from dataclasses import replace

    cache, path = ResultCache(tmp_path / "results.sqlite"), archive[0]
    store = tmp_path / "store.sqlite"
    first = next(analyse_files([path], PLAN, Here(), cache)).result
    assert first is not None
    with DecisionStore(store) as decisions:
        decisions.edit_cycles(first.identifier, first.object_id, CycleEdit(
            condition="", action="drop", reviewer="anna",
            at_s=float(first.conditions[0].nerve_cycles.cycles.onset_s[3]) + 0.01))
    settings = replace(PLAN.settings, classify=replace(PLAN.settings.classify, concentration=200.0))
    for plan in (replace(PLAN, settings=settings), replace(PLAN, store=str(store)), replace(PLAN, nerve="other")):
        counting = Counting()
        list(analyse_files([path], plan, counting, cache))
        assert counting.n_calls == 1
    counting = Counting()
    list(analyse_files([path], PLAN, counting, cache))
    assert counting.n_calls == 0


def test_no_more_files_are_begun_than_there_are_hands(archive):
    counting = Counting(n_ahead=2)
    begun = []
    for _ in analyse_files(archive, PLAN, counting):
        begun.append(counting.n_calls)
    assert begun[0] == 3
    assert max(n - i for i, n in enumerate(begun)) <= 3


class Lost(Here):
    """Loses the second call."""

    def submit(self, *call: object) -> Task:
        return Task(call, None)

    def result(self, task: Task) -> object:
        if "slice-1" in str(task.call[1]):
            raise UnitclassError("its worker process died")
        return task.call[0](*task.call[1:])


def test_a_lost_worker_costs_its_file_and_no_other(archive):
    found = list(analyse_files(archive[:3], PLAN, Lost()))
    assert [bool(o.result) for o in found] == [True, False, True]
    assert "worker process died" in found[1].problem


def die_over(path: str, marker: str) -> str:
    if path == "killer":
        os._exit(9)
    return path + marker


def test_a_call_that_kills_its_worker_fails_alone() -> None:
    processes = Processes(2)
    tasks = [processes.submit(die_over, name, "!") for name in ("a", "killer", "b", "c")]
    got = []
    for task in tasks:
        try:
            got.append(processes.result(task))
        except UnitclassError as error:
            got.append(str(error))
    processes.close()
    assert got[0] == "a!"
    assert "worker process died" in got[1]
    assert got[2:] == ["b!", "c!"]


def test_a_bug_in_one_file_is_a_line_too(archive, monkeypatch):
    import unitclass.batch.files as files

    def failing(path: str, plan: Plan) -> None:
        raise ZeroDivisionError("division by zero")

    monkeypatch.setattr(files, "read_planned", failing)
    outcome, = analyse_files(archive[:1], PLAN, Here())
    assert "ZeroDivisionError" in outcome.problem
    assert "--debug" in outcome.problem


def test_the_second_classify_is_the_first_byte_for_byte_and_fresh_makes_it_anew(archive, tmp_path):
    folder = Path(archive[0]).parent
    for name, more in (("one", ()), ("two", ()), ("three", ("--fresh", "--workers", "2"))):
        assert run("classify", folder, "--table", tmp_path / f"{name}.csv", "--quiet", *more).code == 1
    one, two, three = ((tmp_path / f"{name}.csv").read_bytes() for name in ("one", "two", "three"))
    assert one == two == three
    assert len({row["file"] for row in rows_of(tmp_path / "one.csv")}) == 5
