"""Nothing from a file steers the terminal, and columns stay where they are."""

import pytest

from unitclass.tui.renderables.glyphs import BLOCKS, COLOUR, MONO, PLAIN
from unitclass.tui.renderables.sheet import Sheet, printable, width_of
from unitclass.tui.renderables.words import shortened, shortened_middle, wrapped

HOSTILE = ["\x1b[2J", "\x1b]0;title\x07", "a\rb", "a\nb", "a\tb", "\x9b31m", "\u202egnp.exe", "\u2066x\u2069",
           "\u200b\u200f", "\ud800", "\x00",
           "[bold red]no[/]", "e\u0301" * 3, "\U0001f1e6\U0001f1f9", "a\ufe0f"]


@pytest.mark.parametrize("text", HOSTILE)
def test_no_control_or_format_character_of_a_file_reaches_a_sheet(text):
    sheet = Sheet(20, 1)
    sheet.put(0, 0, text)
    shown = "".join(sheet.cells[0])
    assert shown.isprintable()
    assert not any(c in shown for c in "\x1b\x9b\r\n\t\x00\u202e\u200f\u2066\u200b")


@pytest.mark.parametrize("text", [*HOSTILE, "naïve µ", "神経", "Ω–→κ"])
def test_without_utf8_only_ascii_is_written(text):
    sheet = Sheet(20, 1, PLAIN)
    sheet.put(0, 0, text)
    assert "".join(sheet.cells[0]).isascii()


def test_markup_is_shown_as_the_text_it_is():
    sheet = Sheet(30, 1)
    sheet.put(0, 0, "[bold red]unit[/] {x}")
    assert sheet.lines() == ["[bold red]unit[/] {x}"]


def test_accents_and_symbols_have_ascii_stand_ins():
    assert printable("Müller 5 µV ≤ 3 × 2", ascii_only=True) == "Muller 5 uV <= 3 x 2"


def test_wide_characters_take_two_columns():
    sheet = Sheet(8, 1)
    sheet.put(0, 0, "神経X")
    assert "".join(sheet.cells[0]) == "神経X   "
    assert len(sheet.cells[0]) == 8


def test_a_wide_character_is_not_cut_in_half_at_the_edge():
    sheet = Sheet(3, 1)
    sheet.put(0, 0, "a神経")
    assert width_of("".join(sheet.cells[0])) == 3


def test_text_outside_the_sheet_is_cut_off():
    sheet = Sheet(4, 2)
    sheet.put(-2, 0, "abcdef")
    sheet.put(2, 1, "abcdef")
    sheet.put(0, 5, "x")
    sheet.put(9, 0, "x")
    assert sheet.lines() == ["cdef", "  ab"]


def test_shading_leaves_data_alone_and_is_sparse_without_colour():
    sheet = Sheet(6, 2, MONO)
    sheet.put(0, 0, "##")
    sheet.shade(0, 0, 4, 2)
    assert sheet.lines() == ["##·", " · ·"]


def test_shading_is_an_ink_with_colour():
    sheet = Sheet(3, 1, COLOUR)
    sheet.put(0, 0, "ab", "fit")
    sheet.shade(0, 0, 3, 1)
    assert list(sheet.runs(0)) == [("ab", "fit+"), (" ", "+")]


def test_runs_join_cells_of_one_ink():
    sheet = Sheet(5, 1)
    sheet.put(0, 0, "ab", "x")
    assert list(sheet.runs(0)) == [("ab", "x"), ("   ", "")]


def test_pasting_clips_at_the_edge():
    small, large = Sheet(3, 2), Sheet(4, 2)
    small.put(0, 0, "abc")
    large.paste(small, 2, 1)
    assert large.lines() == ["", "  ab"]


def test_shortening_keeps_within_the_width():
    for width in range(0, 12):
        assert width_of(shortened("unit 神経 17", width, COLOUR)) <= width
        assert width_of(shortened_middle("/data/rig/heron_04.nwb", width, COLOUR)) <= width
    assert shortened("unit 17", 20, COLOUR) == "unit 17"
    assert shortened("abcdef", 4, COLOUR) == "abc" + BLOCKS.ellipsis


def test_wrapping_breaks_at_spaces_and_never_exceeds_the_width():
    lines = wrapped("begins at phase 0.05 and declines through inspiration", 20, COLOUR, indent="  ")
    assert all(width_of(line) <= 20 for line in lines)
    assert lines[0] == "begins at phase 0.05"
    assert "".join(" ".join(lines).split()) == "beginsatphase0.05anddeclinesthroughinspiration"


def test_wrapping_cuts_a_word_that_is_too_long():
    assert wrapped("abcdefghij", 4, COLOUR) == ["abcd", "efgh", "ij"]
    assert wrapped("", 4, COLOUR) == []
