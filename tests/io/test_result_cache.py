"""Results kept between runs: found again only while everything that shaped them is the same."""

from __future__ import annotations

import os
import sqlite3
import subprocess
import sys
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

from tests.io.test_codec import same
from tests.results import session_result
from unitclass.errors import FileError
from unitclass.io.result_cache import CacheKey, FileStamp, ResultCache
from unitclass.io.session_view import MemorySession, without_envelopes

ROOT = Path(__file__).parents[2]
KEY = CacheKey("settings", "templates", "nerve PNA")


@pytest.fixture
def nwb(tmp_path):
    path = tmp_path / "heron_04.nwb"
    path.write_bytes(b"a session")
    return path


@pytest.fixture
def cache(tmp_path):
    opened = ResultCache(tmp_path / "cache" / "results.sqlite")
    yield opened
    opened.close()


@pytest.fixture
def result(nwb):
    return session_result(str(nwb))


def keep(cache, result, **options):
    assert cache.put(result, FileStamp.of(result.path), KEY, **options)


def test_what_was_kept_comes_back_whole_and_in_parts(cache, nwb, result):
    keep(cache, result)
    found, memory = cache.find(nwb, KEY), MemorySession(result)
    assert found.head == memory.head
    assert found.units == memory.units
    assert same(found.session_result(), result)
    np.testing.assert_array_equal(found.rates_hz(), memory.rates_hz())
    for condition, unit in result.units():
        name = condition.condition.name
        assert same(found.unit_result(unit.unit, name), unit)
        bare = replace(condition, units=())
        assert same(found.condition_result(name), bare)
        assert same(found.condition_result(name, with_envelopes=False), without_envelopes(bare))
        assert same(memory.condition_result(name), bare)


def test_it_is_found_after_reopening_under_the_path_as_given_now(tmp_path, nwb, result, monkeypatch):
    cache = ResultCache(tmp_path / "results.sqlite")
    keep(cache, result)
    cache.close()
    monkeypatch.chdir(tmp_path)
    cache = ResultCache(tmp_path / "results.sqlite")
    found = cache.find("heron_04.nwb", KEY)
    assert found.head.path == "heron_04.nwb"
    assert found.session_result().path == "heron_04.nwb"
    cache.close()


@pytest.mark.parametrize("field", ["settings_digest", "template_digest", "options", "program"])
def test_nothing_is_found_under_another_key(cache, nwb, result, field):
    keep(cache, result)
    assert cache.find(nwb, replace(KEY, **{field: "x"})) is None
    assert cache.find(nwb, KEY) is not None


def test_nothing_is_found_after_the_file_changed(cache, nwb, result):
    keep(cache, result)
    os.utime(nwb, ns=(1, 1))
    assert cache.find(nwb, KEY) is None
    keep(cache, result)
    nwb.write_bytes(b"a longer session")
    os.utime(nwb, ns=(1, 1))
    assert cache.find(nwb, KEY) is None
    nwb.unlink()
    assert cache.find(nwb, KEY) is None


def test_results_belong_to_the_file_as_it_was_before_the_analysis(cache, nwb, result):
    stamp = FileStamp.of(nwb)
    nwb.write_bytes(b"written to while it was analysed")
    cache.put(result, stamp, KEY)
    assert cache.find(nwb, KEY) is None


def test_each_state_of_the_cycle_edits_has_its_own_results(cache, nwb, result):
    edited = replace(result, notes=("edited",))
    keep(cache, result)
    keep(cache, edited, edits_digest="e1")
    asked = []

    def digest(identifier, object_id):
        asked.append((identifier, object_id))
        return "e1"

    assert cache.find(nwb, KEY, edits_digest_of=digest).session_result().notes == ("edited",)
    assert set(asked) == {(result.identifier, result.object_id)}
    assert cache.find(nwb, KEY, edits_digest_of=lambda *_: "").session_result().notes == ()
    assert cache.find(nwb, KEY).session_result().notes == ()
    assert cache.find(nwb, KEY, edits_digest_of=lambda *_: "e2") is None


def test_newer_results_take_the_place_of_older_ones(cache, nwb, result):
    keep(cache, result)
    keep(cache, replace(result, notes=("newer",)))
    assert cache.find(nwb, KEY).session_result().notes == ("newer",)
    assert rows(cache, "sessions") == 1
    assert rows(cache, "pieces") == len(list(result.units())) + 2 * len(result.conditions) + 4


def test_results_of_a_file_that_changed_are_dropped(cache, nwb, result):
    keep(cache, result)
    os.utime(nwb, ns=(1, 1))
    keep(cache, result)
    assert rows(cache, "sessions") == 1


def test_results_half_written_are_not_found(cache, nwb, result, monkeypatch):
    from unitclass.io import cached_pieces

    def breaks_off(result, real=cached_pieces.pieces_of):
        for i, piece in enumerate(real(result)):
            if i == 5:
                raise sqlite3.OperationalError("disk I/O error")
            yield piece

    monkeypatch.setattr(cached_pieces, "pieces_of", breaks_off)
    assert not cache.put(result, FileStamp.of(nwb), KEY)
    assert cache.find(nwb, KEY) is None


def test_the_longest_unused_are_dropped_when_it_grows_too_large(tmp_path, result):
    cache = ResultCache(tmp_path / "results.sqlite", max_bytes=150_000)
    paths = [tmp_path / f"{i}.nwb" for i in range(6)]
    for path in paths:
        path.write_bytes(b"a session")
        keep(cache, replace(result, path=str(path)))
    found = [cache.find(path, KEY) is not None for path in paths]
    assert found[-1]
    assert not found[0]
    cache.close()


@pytest.mark.parametrize("content", [b"no database at all " * 100, b"", b"SQLite format 3\0" + b"\0" * 4000])
def test_a_damaged_cache_is_made_anew(tmp_path, nwb, result, content):
    path = tmp_path / "results.sqlite"
    path.write_bytes(content)
    cache = ResultCache(path)
    keep(cache, result)
    assert cache.find(nwb, KEY) is not None
    cache.close()


def test_a_cache_of_another_layout_is_made_anew(tmp_path, nwb, result):
    path = tmp_path / "results.sqlite"
    with sqlite3.connect(path) as db:
        db.execute("CREATE TABLE sessions (other TEXT)")
        db.execute("PRAGMA user_version = 77")
    db.close()
    cache = ResultCache(path)
    keep(cache, result)
    cache.close()


@pytest.mark.parametrize("kind", ["head", "light"])
def test_damaged_lists_are_not_found(cache, nwb, result, kind):
    keep(cache, result)
    damage(cache, kind)
    assert cache.find(nwb, KEY) is None


@pytest.mark.parametrize("kind", ["unit", "condition", "rates", "session"])
def test_damaged_or_dropped_pieces_are_said(cache, nwb, result, kind):
    keep(cache, result)
    found = cache.find(nwb, KEY)
    damage(cache, kind)
    with pytest.raises(FileError, match=r"gone or damaged.*open it again"):
        read_all(found)
    cache._db.execute("DELETE FROM sessions")
    with pytest.raises(FileError, match="open it again"):
        read_all(found)


def test_an_unknown_unit_is_a_key_error(cache, nwb, result):
    keep(cache, result)
    with pytest.raises(KeyError):
        cache.find(nwb, KEY).unit_result("99", "baseline")


def test_it_may_be_deleted_at_any_time(cache, nwb, result):
    keep(cache, result)
    found = cache.find(nwb, KEY)
    cache.path.unlink()
    assert found.unit_result("3", "baseline").unit == "3"
    assert cache.put(result, FileStamp.of(nwb), KEY) in (True, False)
    again = ResultCache(cache.path)
    assert again.find(nwb, KEY) is None
    keep(again, result)
    again.close()


def test_where_nothing_can_be_kept_the_program_goes_on_without(tmp_path, nwb, result):
    (tmp_path / "file").touch()
    cache = ResultCache(tmp_path / "file" / "results.sqlite")
    assert not cache.put(result, FileStamp.of(nwb), KEY)
    assert cache.find(nwb, KEY) is None
    cache.close()


def test_a_second_process_finds_what_the_first_kept_without_loading_the_readers(cache, nwb, result):
    keep(cache, result)
    code = ("import sys; from unitclass.io.result_cache import *; from unitclass.review.session import *;"
            f"k = CacheKey('settings', 'templates', 'nerve PNA'); c = ResultCache({str(cache.path)!r});"
            f"s = c.find({str(nwb)!r}, k); s.unit_result('3', 'baseline'); s.condition_result('baseline');"
            "print(len(s.units), sorted({'pynwb', 'h5py', 'hdmf', 'scipy', 'sklearn', 'pandas'} & set(sys.modules)))")
    done = subprocess.run([sys.executable, "-c", code], cwd=ROOT, capture_output=True, text=True, check=True)
    assert done.stdout.split(maxsplit=1) == ["10", "[]\n"]


def rows(cache, table):
    return cache._db.execute(f"SELECT count(*) FROM {table}").fetchone()[0]


def damage(cache, kind):
    cache._db.execute("UPDATE pieces SET content = x'789c00' || substr(content, 5) WHERE kind = ?", (kind,))


def read_all(found):
    found.rates_hz()
    found.session_result()
