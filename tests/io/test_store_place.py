"""Where decisions are kept. A folder "that cannot be written" is one where the attempt fails."""

from __future__ import annotations

import platformdirs
import pytest

from tests.io.stores import IDENTIFIER, OBJECT_ID, decision
from unitclass.errors import TargetError, UsageError
from unitclass.io import store_place
from unitclass.io.decisions import DecisionStore
from unitclass.io.store_place import existing_store, open_store, store_path


@pytest.fixture
def rig(tmp_path, monkeypatch):
    """Two folders of sessions, and a user's data folder beside them."""
    monkeypatch.setattr(platformdirs, "user_data_path", lambda name: tmp_path / "user" / name)
    for name in ("one/a.nwb", "one/b.nwb", "one/deep/c.nwb", "two/d.nwb"):
        (tmp_path / name).parent.mkdir(parents=True, exist_ok=True)
        (tmp_path / name).touch()
    return tmp_path


@pytest.fixture
def locked(rig, monkeypatch):
    """Make every write beside the data fail."""
    real = store_place._can_write
    monkeypatch.setattr(store_place, "_can_write", lambda path: (rig / "user") in path.parents and real(path))
    return rig


@pytest.mark.parametrize("inputs", [["one/a.nwb"], ["one/a.nwb", "one/b.nwb"], ["one"], ["one", "one/deep/c.nwb"],
                                    ["one/*.nwb"], ["one/**/*.nwb"]])
def test_decisions_lie_beside_the_data(rig, inputs):
    place = store_path([rig / name for name in inputs])
    assert (place.path, place.message, place.seed) == (rig / "one" / "unitclass.sqlite", "", None)


def test_a_file_named_without_a_folder_has_them_in_the_present_one(rig, monkeypatch):
    monkeypatch.chdir(rig / "one")
    assert store_path(["a.nwb"]).path.resolve() == rig / "one" / "unitclass.sqlite"


@pytest.mark.parametrize("inputs", [["one/a.nwb", "two/d.nwb"], ["one", "two"], ["one/a.nwb", "one/deep/c.nwb"]])
def test_inputs_from_several_folders_need_a_named_store(rig, inputs):
    paths = [rig / name for name in inputs]
    with pytest.raises(UsageError, match="2 folders; name a file for the decisions with --store"):
        store_path(paths)
    assert store_path(paths, rig / "mine.sqlite").path == rig / "mine.sqlite"


def test_a_named_store_that_cannot_be_written_is_refused_at_once(rig):
    with pytest.raises(TargetError, match=r"mine\.sqlite: the store cannot be written there"):
        store_path([rig / "one"], rig / "one" / "a.nwb" / "mine.sqlite")


def test_a_folder_that_cannot_be_written_sends_decisions_to_the_users_data_and_says_so(locked):
    place = store_path([locked / "one"])
    assert place.path.parent == locked / "user" / "unitclass"
    assert place.path.name.startswith("one-")
    assert f"{locked / 'one'} cannot be written" in place.message
    assert str(place.path) in place.message
    assert store_path([locked / "two"]).path != place.path
    assert store_path([locked / "one" / "a.nwb"]).path == place.path


def test_decisions_of_a_folder_that_became_unwritable_are_carried_along(locked):
    beside = locked / "one" / "unitclass.sqlite"
    with DecisionStore(beside) as store:
        store.decide([decision()])
    place = store_path([locked / "one"])
    assert place.seed == beside
    with open_store(place) as store:
        assert len(store.history(IDENTIFIER, OBJECT_ID)) == 1
        store.decide([decision()])
    with open_store(store_path([locked / "one"])) as store:
        assert len(store.history(IDENTIFIER, OBJECT_ID)) == 2
    assert existing_store([locked / "one"]) == place.path


def test_when_nothing_can_be_written_it_is_said(rig, monkeypatch):
    monkeypatch.setattr(store_place, "_can_write", lambda path: False)
    with pytest.raises(TargetError, match=r"neither this folder nor .* can be written; name a file with --store"):
        store_path([rig / "one"])


def test_the_existing_store_is_found_without_making_one(rig):
    assert existing_store([rig / "one"]) is None
    assert not (rig / "one" / "unitclass.sqlite").exists()
    DecisionStore(rig / "one" / "unitclass.sqlite").close()
    assert existing_store([rig / "one" / "a.nwb"]) == rig / "one" / "unitclass.sqlite"
    assert existing_store([rig / "two"], rig / "one" / "unitclass.sqlite") == rig / "one" / "unitclass.sqlite"
    with pytest.raises(UsageError, match="no such store; check --store"):
        existing_store([rig / "one"], rig / "missing.sqlite")


def test_decisions_in_one_of_several_folders_are_not_passed_over_in_silence(rig):
    both = [rig / "one" / "a.nwb", rig / "two" / "d.nwb"]
    assert existing_store(both) is None
    DecisionStore(rig / "two" / "unitclass.sqlite").close()
    with pytest.raises(UsageError, match="--store"):
        existing_store(both)
