"""Killed processes, two at once, full disks, folders that cannot be written, files of other kinds."""

from __future__ import annotations

import os
import random
import resource
import shutil
import signal
import sqlite3
import subprocess
import sys
import time
from collections import Counter
from pathlib import Path

import pytest

from tests.io.stores import IDENTIFIER, OBJECT_ID, decision
from unitclass.errors import FileError, TargetError
from unitclass.io import store_schema
from unitclass.io.decisions import DecisionStore

ROOT = Path(__file__).parents[2]
N_KILLS = 12


def child(store: Path, reviewer: str, first: int, count: int) -> subprocess.Popen[str]:
    return subprocess.Popen([sys.executable, "-m", "tests.io.deciding_child", str(store), reviewer, str(first),
                             str(count)], cwd=ROOT, stdout=subprocess.PIPE, text=True)


def acknowledged(process: subprocess.Popen[str]) -> list[int]:
    return [int(line) for line in process.stdout.read().split() if line != "ready"]


def stored(path: Path) -> Counter[int]:
    with DecisionStore(path) as store:
        return Counter(int(d.unit) for d in store.history(IDENTIFIER, OBJECT_ID))


def decide_much(store: DecisionStore) -> None:
    for _ in range(100):
        store.decide([decision(note="x" * 5000)])


def test_every_decision_told_before_a_kill_is_there_once(tmp_path):
    path = tmp_path / "unitclass.sqlite"
    rng = random.Random(7)
    told: list[int] = []
    for i in range(N_KILLS):
        process = child(path, "anna", 100_000 * i, 100_000)
        assert process.stdout.readline() == "ready\n"
        time.sleep(rng.uniform(0.0, 0.15))
        process.send_signal(signal.SIGKILL)
        told += acknowledged(process)
        process.wait()
        kept = stored(path)
        assert set(told) <= set(kept)
        assert set(kept.values()) <= {1}
        assert len(kept) - len(told) <= i + 1  # at most the one in flight at each kill
    assert len(told) > N_KILLS
    with sqlite3.connect(path) as db:
        assert db.execute("PRAGMA integrity_check").fetchone() == ("ok",)


def test_two_processes_at_once_lose_nothing(tmp_path):
    path = tmp_path / "unitclass.sqlite"
    both = [child(path, "anna", 0, 40), child(path, "ben", 0, 40)]
    told = [acknowledged(process) for process in both]
    assert [process.wait() for process in both] == [0, 0]
    assert told == [list(range(40))] * 2
    assert stored(path) == Counter(dict.fromkeys(range(40), 2))


def test_a_store_whose_writer_died_half_way_opens_read_only_without_the_half(tmp_path):
    """The state is a copy of both files in the middle of a transaction that has reached the file."""
    path, died = tmp_path / "unitclass.sqlite", tmp_path / "died.sqlite"
    with DecisionStore(path) as store:
        store.decide([decision()])
        db = store._connection
        db.execute("PRAGMA cache_size = 1")
        db.execute("BEGIN IMMEDIATE")
        for i in range(200):
            db.execute("INSERT INTO acts (reviewer, made_at, kind) VALUES (?, '', 'decide')", (f"{i}" * 500,))
        shutil.copy(path, died)
        shutil.copy(f"{path}-journal", f"{died}-journal")
        db.execute("ROLLBACK")
        assert died.read_bytes() != path.read_bytes()
    with DecisionStore(died, is_read_only=True) as store:
        assert store.version() == 1
        assert store.reviewers() == ("anna",)


def test_a_decision_is_synced_to_disk_before_it_is_told(tmp_path):
    """The journal and the file are both synced: read from the connection itself."""
    with DecisionStore(tmp_path / "unitclass.sqlite") as store:
        db = store._connection
        assert db.execute("PRAGMA journal_mode").fetchone() == ("persist",)
        assert db.execute("PRAGMA synchronous").fetchone()[0] >= 2


def test_a_full_disk_is_said_and_spoils_nothing(tmp_path):
    """SQLITE_FULL, as a full disk gives it, by a limit on the number of pages."""
    with DecisionStore(tmp_path / "unitclass.sqlite") as store:
        store.decide([decision()])
        db = store._connection
        db.execute(f"PRAGMA max_page_count = {db.execute('PRAGMA page_count').fetchone()[0]}")
        with pytest.raises(TargetError, match=r"unitclass\.sqlite: the disk is full; nothing was saved.*free"):
            decide_much(store)
        n = len(store.history(IDENTIFIER, OBJECT_ID))
        db.execute("PRAGMA max_page_count = 100000")
        store.decide([decision()])
        assert len(store.history(IDENTIFIER, OBJECT_ID)) == n + 1


@pytest.mark.skipif(not hasattr(resource, "RLIMIT_FSIZE"), reason="needs a limit on file size")
def test_a_write_that_fails_is_said_and_spoils_nothing(tmp_path):
    path = tmp_path / "unitclass.sqlite"
    with DecisionStore(path) as store:
        store.decide([decision()])
        before = signal.signal(signal.SIGXFSZ, signal.SIG_IGN)
        soft, hard = resource.getrlimit(resource.RLIMIT_FSIZE)
        resource.setrlimit(resource.RLIMIT_FSIZE, (path.stat().st_size, hard))
        try:
            with pytest.raises(TargetError, match="nothing was saved"):
                decide_much(store)
        finally:
            resource.setrlimit(resource.RLIMIT_FSIZE, (soft, hard))
            signal.signal(signal.SIGXFSZ, before)
        n = len(store.history(IDENTIFIER, OBJECT_ID))
        store.decide([decision()])
        assert len(store.history(IDENTIFIER, OBJECT_ID)) == n + 1


def test_a_folder_that_does_not_exist_is_said(tmp_path):
    with pytest.raises(TargetError, match="cannot be opened; make its folder writable"):
        DecisionStore(tmp_path / "nowhere" / "unitclass.sqlite")


@pytest.mark.skipif(os.geteuid() == 0, reason="the superuser may write everywhere")
def test_a_folder_that_cannot_be_written_is_said(tmp_path):
    tmp_path.chmod(0o500)
    try:
        with pytest.raises(TargetError, match="cannot be opened"):
            DecisionStore(tmp_path / "unitclass.sqlite")
    finally:
        tmp_path.chmod(0o700)


def test_a_store_opened_read_only_refuses_decisions_and_leaves_its_folder_alone(tmp_path):
    path = tmp_path / "unitclass.sqlite"
    with DecisionStore(path) as store:
        store.decide([decision()])
    (tmp_path / "unitclass.sqlite-journal").unlink()
    before = path.read_bytes()
    with DecisionStore(path, is_read_only=True) as store:
        assert store.reviewers() == ("anna",)
        with pytest.raises(TargetError, match="cannot be written"):
            store.decide([decision()])
    assert path.read_bytes() == before
    assert sorted(p.name for p in tmp_path.iterdir()) == ["unitclass.sqlite"]


def test_a_missing_store_is_not_made_by_reading(tmp_path):
    with pytest.raises(TargetError):
        DecisionStore(tmp_path / "unitclass.sqlite", is_read_only=True)
    assert list(tmp_path.iterdir()) == []


def test_a_store_removed_while_it_is_open_is_said(tmp_path):
    path = tmp_path / "unitclass.sqlite"
    with DecisionStore(path) as store:
        store.decide([decision()])
        path.unlink()
        with pytest.raises(TargetError):
            store.decide([decision()])


def test_a_store_held_by_another_program_is_said_and_then_works(tmp_path):
    path = tmp_path / "unitclass.sqlite"
    with DecisionStore(path, busy_timeout_s=0.05) as store:
        other = sqlite3.connect(path, isolation_level=None)
        other.execute("BEGIN EXCLUSIVE")
        with pytest.raises(TargetError, match="another program holds the store; wait a moment"):
            store.decide([decision()])
        other.execute("ROLLBACK")
        other.close()
        store.decide([decision()])
        assert store.version() == 1


def test_files_of_other_kinds_are_refused_and_left_as_they_are(tmp_path):
    path = tmp_path / "notes.sqlite"
    with sqlite3.connect(path) as db:
        db.execute("CREATE TABLE birds (name TEXT)")
    db.close()
    before = path.read_bytes()
    with pytest.raises(FileError, match="no store of this program; name another file with --store"):
        DecisionStore(path)
    assert path.read_bytes() == before
    text = tmp_path / "text.sqlite"
    text.write_text("not a database, but long enough to be looked at " * 20)
    with pytest.raises(FileError, match="damaged or no store"):
        DecisionStore(text)


def test_a_store_of_a_newer_version_is_refused(tmp_path):
    path = tmp_path / "unitclass.sqlite"
    DecisionStore(path).close()
    with sqlite3.connect(path) as db:
        db.execute("PRAGMA user_version = 99")
    db.close()
    with pytest.raises(FileError, match="newer version of unitclass; update unitclass"):
        DecisionStore(path)


def test_an_older_store_is_brought_up_to_date_once_and_keeps_its_decisions(tmp_path, monkeypatch):
    path = tmp_path / "unitclass.sqlite"
    with DecisionStore(path) as store:
        store.decide([decision()])
    later = "CREATE TABLE moods (name TEXT); CREATE INDEX moods_by_name ON moods(name);"
    monkeypatch.setattr(store_schema, "MIGRATIONS", (*store_schema.MIGRATIONS, later))
    with pytest.raises(FileError, match="older version"):
        DecisionStore(path, is_read_only=True)
    for _ in range(2):
        with DecisionStore(path) as store:
            assert store.reviewers() == ("anna",)
    with sqlite3.connect(path) as db:
        assert db.execute("PRAGMA user_version").fetchone() == (len(store_schema.MIGRATIONS),)
        assert db.execute("SELECT count(*) FROM moods").fetchone() == (0,)


def test_a_migration_that_fails_leaves_the_store_as_it_was(tmp_path, monkeypatch):
    path = tmp_path / "unitclass.sqlite"
    with DecisionStore(path) as store:
        store.decide([decision()])
    broken = "CREATE TABLE moods (name TEXT); CREATE TABLE moods (name TEXT);"
    with monkeypatch.context() as patch:
        patch.setattr(store_schema, "MIGRATIONS", (*store_schema.MIGRATIONS, broken))
        with pytest.raises(TargetError):
            DecisionStore(path)
    with DecisionStore(path) as store:
        assert store.reviewers() == ("anna",)


def test_everything_can_be_carried_to_another_file(tmp_path):
    with DecisionStore(tmp_path / "unitclass.sqlite") as store:
        store.decide([decision("ramp-I")])
        store.decide([decision("con-I")])
        store.undo("anna")
        with store.copy_to(tmp_path / "copy.sqlite") as copy:
            assert copy.history(IDENTIFIER, OBJECT_ID) == store.history(IDENTIFIER, OBJECT_ID)
            copy.redo("anna")
        with pytest.raises(TargetError, match="exists already"):
            store.copy_to(tmp_path / "copy.sqlite")
    shutil.copy(tmp_path / "copy.sqlite", tmp_path / "again.sqlite")
    with DecisionStore(tmp_path / "again.sqlite") as again:
        assert again.undo("anna").seq == 2
