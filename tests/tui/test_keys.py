"""Keys: one declaration, no clash, nothing a terminal swallows."""

import pytest

from unitclass.errors import UsageError
from unitclass.tui.keys import DECLARED, OTHERS, REVIEW, SWALLOWED, KeyMap


def test_every_action_has_one_id():
    ids = [declared.id for declared in DECLARED]
    assert len(ids) == len(set(ids))


@pytest.mark.parametrize("screen", [REVIEW, *OTHERS])
def test_no_key_does_two_things_on_one_screen(screen):
    keys = [declared.key for declared in KeyMap().on(screen)]
    assert len(keys) == len(set(keys))


def test_no_key_is_swallowed_on_its_way():
    for declared in DECLARED:
        assert not declared.key.startswith(SWALLOWED)
        assert not (declared.key[0] == "f" and declared.key[1:].isdigit())


@pytest.mark.parametrize("screen", [REVIEW, *OTHERS])
def test_every_key_of_a_screen_is_in_its_help(screen):
    keys = KeyMap()
    shown = {key for key, _ in keys.help(screen)}
    assert shown >= {keys.shown(d.id) for d in keys.on(screen) if not d.id.startswith("take-")}


def test_the_first_keys_of_the_footer_are_help_accept_and_the_end():
    assert [key for key, _ in KeyMap().footer(REVIEW)][:3] == ["?", "Enter", "e"]


def test_a_changed_key_is_in_footer_and_help():
    keys = KeyMap.of({"later": "z"})
    assert ("z", "later") in keys.footer(REVIEW)
    assert "z" in {key for key, _ in keys.help(REVIEW)}
    assert "l" not in {key for key, _ in keys.help(REVIEW)}


def test_readable_names_are_understood():
    assert KeyMap.of({"later": "Space"}).key("later") == "space"
    assert KeyMap.of({"find": "+"}).key("find") == "plus"


@pytest.mark.parametrize(("wanted", "words"), [
    ({"latr": "z"}, "the nearest is 'later'"), ({"later": "ctrl+b"}, "may never reach"),
    ({"later": "u"}, "asked for both"), ({"later": ""}, "may never reach")])
def test_a_wrong_key_setting_is_refused_with_a_remedy(wanted, words):
    with pytest.raises(UsageError, match=words):
        KeyMap.of(wanted)
