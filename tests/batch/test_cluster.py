"""A real Dask scheduler and two worker processes, one of them killed in the middle."""

from __future__ import annotations

import json
import shutil
import signal
import subprocess
import sys
import time
from collections.abc import Iterator
from pathlib import Path

import pytest

from tests.commands.program import run
from unitclass.batch import Plan, analyse_files, runner_for
from unitclass.batch.runners import Here, SchedulerLostError
from unitclass.io.codec import encoded
from unitclass.io.resolver import samples_folder
from unitclass.io.template_files import read_library
from unitclass.settings import Settings

PLAN = Plan(Settings(), read_library())
WORKER = ("--nworkers", "1", "--nthreads", "1", "--no-dashboard", "--no-nanny")


class Processes:
    """A scheduler and its workers, all in processes of their own."""

    def __init__(self, folder: Path) -> None:
        told = folder / "scheduler.json"
        self.scheduler = self._start("scheduler", "--port", "0", "--no-dashboard", "--scheduler-file", str(told))
        self.address = json.loads(_waited_for(told))["address"]
        self.workers = [self._start("worker", self.address, *WORKER, "--local-directory", str(folder)) for _ in range(2)]

    def _start(self, *words: str) -> subprocess.Popen[bytes]:
        return subprocess.Popen([sys.executable, "-m", "dask", *words], stdout=subprocess.DEVNULL,
                                stderr=subprocess.DEVNULL)

    def end(self) -> None:
        for process in (*self.workers, self.scheduler):
            process.kill()
            process.wait()


def _waited_for(file: Path) -> str:
    for _ in range(300):
        if file.exists() and file.read_text().strip().endswith("}"):
            return file.read_text()
        time.sleep(0.1)
    raise TimeoutError("the scheduler did not start")


@pytest.fixture
def cluster(tmp_path) -> Iterator[Processes]:
    made = Processes(tmp_path)
    yield made
    made.end()


@pytest.fixture(scope="module")
def archive(tmp_path_factory) -> list[str]:
    folder = tmp_path_factory.mktemp("archive")
    for i in range(8):
        shutil.copyfile(samples_folder() / "sorrel-slice.nwb", folder / f"slice-{i}.nwb")
    return sorted(str(path) for path in folder.glob("*.nwb"))


def test_with_one_of_two_workers_killed_the_cluster_gives_what_this_process_gives(cluster, archive):
    expected = [(o.path, encoded(o.result)) for o in analyse_files(archive, PLAN, Here())]
    got = []
    with runner_for(len(archive), scheduler=cluster.address) as runner:
        for outcome in analyse_files(archive, PLAN, runner):
            got.append((outcome.path, encoded(outcome.result)))
            if len(got) == 1:
                cluster.workers[0].send_signal(signal.SIGKILL)
    assert cluster.workers[0].wait() == -signal.SIGKILL
    assert got == expected


def test_files_named_by_a_short_path_are_found_by_workers_elsewhere_and_keep_that_name(cluster, archive, monkeypatch):
    monkeypatch.chdir(Path(archive[0]).parent)
    names = [Path(archive[0]).name, "not-there.nwb"]
    with runner_for(2, scheduler=cluster.address) as runner:
        good, bad = analyse_files(names, PLAN, runner)
    assert good.result is not None
    assert (good.path, good.result.path) == (names[0], names[0])
    assert bad.problem.startswith("not-there.nwb: ")


def test_a_scheduler_that_goes_away_is_one_line_and_what_was_finished_is_kept(cluster, archive, tmp_path):
    from unitclass.io.result_cache import ResultCache

    cache, done = ResultCache(tmp_path / "results.sqlite"), []

    def until_it_is_gone() -> None:
        with runner_for(len(archive), scheduler=cluster.address) as runner:
            for outcome in analyse_files(archive, PLAN, runner, cache):
                done.append(outcome.path)
                cluster.end()

    with pytest.raises(SchedulerLostError, match="run the same command again"):
        until_it_is_gone()
    assert done
    assert all(cache.find(path, PLAN.key) for path in done)


def test_a_scheduler_that_does_not_answer_is_one_line(archive, monkeypatch):
    monkeypatch.setattr("unitclass.batch.runners.CONNECT_S", 1)
    ran = run("classify", archive[0], "--scheduler", "tcp://127.0.0.1:9", "--quiet")
    assert ran.code == 2
    assert "no Dask scheduler answers" in ran.err
    assert len(ran.err.strip().splitlines()) == 1
