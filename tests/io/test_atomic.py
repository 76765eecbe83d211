import errno
import os
import stat

import pytest

from unitclass.errors import TargetError
from unitclass.io.atomic import made_folder, target_error, written_whole


def test_the_target_appears_whole_and_nothing_else_is_left(tmp_path):
    target = tmp_path / "table.csv"
    with written_whole(str(target)) as temporary:
        temporary.write_text("a,b\n")
        assert not target.exists()
    assert target.read_text() == "a,b\n"
    assert os.listdir(tmp_path) == ["table.csv"]


def test_an_existing_file_is_kept_without_force_and_replaced_with_it(tmp_path):
    target = tmp_path / "table.csv"
    target.write_text("old")
    with pytest.raises(TargetError, match="exists already; give --force"), written_whole(str(target)):
        pytest.fail("the block must not run")
    assert target.read_text() == "old"
    with written_whole(str(target), force=True) as temporary:
        temporary.write_text("new")
    assert target.read_text() == "new"


def test_a_file_that_appears_meanwhile_is_not_overwritten(tmp_path):
    target = tmp_path / "table.csv"

    def race():
        with written_whole(str(target)) as temporary:
            temporary.write_text("ours")
            target.write_text("theirs")

    with pytest.raises(TargetError, match="exists already"):
        race()
    assert target.read_text() == "theirs"
    assert os.listdir(tmp_path) == ["table.csv"]


@pytest.mark.parametrize("failure", [OSError(errno.ENOSPC, "No space left on device"), KeyboardInterrupt()])
def test_a_failure_leaves_the_old_file_and_no_temporary_one(tmp_path, failure):
    target = tmp_path / "table.csv"
    target.write_text("old")

    def fail():
        with written_whole(str(target), force=True) as temporary:
            temporary.write_text("half")
            raise failure

    with pytest.raises((TargetError, KeyboardInterrupt)):
        fail()
    assert target.read_text() == "old"
    assert os.listdir(tmp_path) == ["table.csv"]


def test_a_full_disk_is_named_in_one_line():
    error = target_error(OSError(errno.ENOSPC, "No space left on device"), "out/x.nwb")
    assert str(error) == "out/x.nwb: the disk is full; free some space or name another folder"


def test_a_folder_a_missing_folder_and_a_device_are_refused(tmp_path):
    with pytest.raises(TargetError, match="is a folder"), written_whole(str(tmp_path)):
        pass
    with pytest.raises(TargetError, match="the folder does not exist"), written_whole(str(tmp_path / "no" / "x")):
        pass
    with pytest.raises(TargetError, match="device or a pipe"), written_whole(os.devnull, force=True):
        pass


def test_a_file_where_a_folder_should_be_is_named(tmp_path):
    (tmp_path / "out").write_text("")
    with pytest.raises(TargetError, match="is a file, not a folder"):
        made_folder(str(tmp_path / "out"))
    assert made_folder(str(tmp_path / "a" / "b")).is_dir()


@pytest.mark.skipif(os.name != "posix", reason="permissions are POSIX")
def test_permissions_follow_the_users_own_mask(tmp_path):
    before = os.umask(0o027)
    try:
        with written_whole(str(tmp_path / "x")) as temporary:
            temporary.write_text("x")
    finally:
        os.umask(before)
    assert stat.S_IMODE((tmp_path / "x").stat().st_mode) == 0o640


def test_a_link_to_a_file_is_followed(tmp_path):
    (tmp_path / "real.csv").write_text("old")
    (tmp_path / "link.csv").symlink_to(tmp_path / "real.csv")
    with written_whole(str(tmp_path / "link.csv"), force=True) as temporary:
        temporary.write_text("new")
    assert (tmp_path / "real.csv").read_text() == "new"
    assert (tmp_path / "link.csv").is_symlink()
