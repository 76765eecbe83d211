"""Heavy work in a process of its own: results, failures, output, and its end."""

import os
import queue
import time

import pytest

from unitclass.errors import FileError
from unitclass.tui.workers import NICENESS, Work


def work_on(name):
    """Do what the name says; runs in the process."""
    if name == "broken":
        raise FileError("cannot be read", where="broken.nwb", remedy="name another file")
    if name == "bug":
        raise ValueError("a bug")
    if name == "dies":
        os._exit(3)
    if name == "waits":
        time.sleep(60)
    print("loud")
    os.write(1, b"louder\n")
    return name.upper(), os.nice(0), os.getpid()


def run(*names):
    told = queue.Queue()
    work = Work(work_on, [(name, (name,)) for name in names], told.put).start()
    found = []
    while (done := told.get(timeout=20)) is not None:
        found.append(done)
    return found, work


def test_results_come_one_by_one_from_one_niced_process_that_prints_nothing(capfd):
    found, _ = run("a", "b")
    assert [done.name for done in found] == ["a", "b"]
    assert [done.result[0] for done in found] == ["A", "B"]
    assert all(done.result[1] >= NICENESS for done in found)
    assert len({done.result[2] for done in found}) == 1
    assert found[0].result[2] != os.getpid()
    assert capfd.readouterr() == ("", "")


def test_a_piece_that_fails_does_not_stop_the_rest():
    found, _ = run("broken", "bug", "a")
    assert [bool(done.problem) for done in found] == [True, True, False]
    assert "cannot be read" in found[0].problem
    assert "name another file" in found[0].problem
    assert "ValueError: a bug" in found[1].problem


def test_a_process_that_dies_is_told_with_its_exit_code():
    found, _ = run("dies")
    assert "ended unexpectedly (exit code 3)" in found[0].problem


def test_stopped_work_ends_its_process_and_says_nothing_more():
    told = queue.Queue()
    work = Work(work_on, [("waits", ("waits",))], told.put).start()
    deadline = time.monotonic() + 10
    while (work._process is None or not work._process.is_alive()) and time.monotonic() < deadline:
        time.sleep(0.02)
    time.sleep(0.2)
    work.stop()
    work._process.join(5)
    assert not work._process.is_alive()
    with pytest.raises(queue.Empty):
        told.get(timeout=0.3)
