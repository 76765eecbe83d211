"""Two or three letters find a type."""

import pytest

from unitclass.tui.choice import Option, matching
from unitclass.tui.widgets.line_entry import LineEntry

TYPES = [Option(t, t, words) for t, words in (
    ("pre-I", "from late expiration through inspiration"), ("early-I", "declines"), ("ramp-I", "rises"),
    ("late-I", ""), ("con-I", ""), ("I-E", ""), ("post-I", "declines after inspiration"), ("aug-E", ""),
    ("con-E", ""), ("late-E", ""), ("dec-E", ""), ("bi-E", ""), ("tonic", ""), ("NRM", "not modulated"),
    ("not one cell", ""))]


@pytest.mark.parametrize(("typed", "first"), [
    ("po", "post-I"), ("au", "aug-E"), ("ea", "early-I"), ("prei", "pre-I"), ("lae", "late-E"), ("latei", "late-I"),
    ("ie", "I-E"), ("nr", "NRM"), ("not", "not one cell"), ("RAMP", "ramp-I"), ("be", "bi-E")])
def test_a_few_letters_find_the_type(typed, first):
    assert matching(TYPES, typed)[0].value == first


def test_words_of_the_description_find_it_too():
    assert matching(TYPES, "rises")[0].value == "ramp-I"


def test_no_letters_show_all_and_nonsense_none():
    assert len(matching(TYPES, "")) == len(TYPES)
    assert matching(TYPES, "zzz") == []


def test_an_entry_is_edited_in_place():
    entry = LineEntry().typed("post").pressed("home").typed("x").pressed("right").pressed("backspace")
    assert entry == LineEntry("xost", 1)
    assert entry.pressed("end").pressed("backspace").text == "xos"
    assert entry.pressed("ctrl+u") == LineEntry("ost", 0)
    assert entry.pressed("delete").text == "xst"


def test_an_entry_takes_no_control_characters():
    assert LineEntry().typed("a\x1b[2Jb\nc").text == "a[2Jb c"
