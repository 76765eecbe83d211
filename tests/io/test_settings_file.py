import pytest

from unitclass.errors import UsageError
from unitclass.io import settings_file
from unitclass.io.settings_file import find_settings, read_settings
from unitclass.settings import Settings


@pytest.fixture
def own_folder(tmp_path, monkeypatch):
    monkeypatch.setattr(settings_file, "settings_path", lambda: tmp_path / "settings.toml")
    return tmp_path


def written(path, content):
    path.write_bytes(content.encode() if isinstance(content, str) else content)
    return str(path)


def test_a_file_is_laid_over_the_defaults(tmp_path):
    path = written(tmp_path / "s.toml", '[cycles]\nafter_sigh = 2\n[rig]\nnerve = "PNA"\n')
    settings = read_settings(path)
    assert (settings.cycles.after_sigh, settings.rig.nerve) == (2, "PNA")
    assert settings.nerve == Settings().nerve


def test_the_explicit_file_wins_over_the_users_own_and_that_over_the_defaults(own_folder):
    assert find_settings() == Settings()
    written(own_folder / "settings.toml", '[rig]\nnerve = "own"\n')
    assert find_settings().rig.nerve == "own"
    other = written(own_folder / "other.toml", '[rig]\nnerve = "other"\n')
    assert find_settings(other).rig.nerve == "other"


def test_the_users_own_file_lies_in_the_folder_of_this_program():
    assert settings_file.settings_path().name == "settings.toml"
    assert "unitclass" in settings_file.settings_path().parts


@pytest.mark.parametrize(("content", "said"), [
    ("[cycles\n", "not valid TOML.*line 1"),
    ("[cycles]\nafter_sigh = 99\n", "after_sigh = 99 is out of range"),
    ("[cycels]\n", "nearest is 'cycles'"),
    (b"\xff\xfe\x00", "not UTF-8"),
])
def test_what_is_wrong_with_a_file_is_said_in_one_line_that_names_it(tmp_path, content, said):
    path = written(tmp_path / "s.toml", content)
    with pytest.raises(UsageError, match=said) as caught:
        read_settings(path)
    assert str(caught.value).startswith(path)
    assert "\n" not in str(caught.value)


def test_a_missing_file_and_a_folder_are_wrong_use(tmp_path):
    with pytest.raises(UsageError, match="no such settings file"):
        read_settings(str(tmp_path / "none.toml"))
    with pytest.raises(UsageError, match="cannot read the settings file"):
        read_settings(str(tmp_path))


def test_a_byte_order_mark_does_no_harm(tmp_path):
    assert read_settings(written(tmp_path / "s.toml", b"\xef\xbb\xbf[rig]\nnerve = 'PNA'\n")).rig.nerve == "PNA"
