"""Queue, verdict, lists and foot as text."""

import numpy as np
import pytest

from unitclass.records import Label
from unitclass.review.entry import QueueEntry
from unitclass.tui.renderables.choice_rows import choice_rows
from unitclass.tui.renderables.footer import entry_row, footer_rows
from unitclass.tui.renderables.glyphs import COLOUR, MONO, PLAIN
from unitclass.tui.renderables.listing import column_widths, scrolled, table_rows
from unitclass.tui.renderables.population_rows import HeatEntry, population_lines, population_rows
from unitclass.tui.renderables.queue_rows import queue_column, queue_line
from unitclass.tui.renderables.verdict import Verdict, verdict_in_brief, verdict_rows


def entry(unit, kind="early-I", **changes):
    return QueueEntry(path="a.nwb", session="s", animal="", identifier="i", object_id="o", unit=unit,
                      condition="baseline", digest="d", suggested_type=kind, ranked=((kind, 0.9),),
                      n_cycles=40, n_spikes=400, regime="three-phase", shape_group="A", flags=(), **changes)


QUEUE = [entry(f"u{i}", own_type="early-I" if i % 2 else "") for i in range(40)]
VERDICT = Verdict("post-I", 0.71, (("post-I", 0.71), ("dec-E", 0.2), ("aug-E", 0.09)),
                  against=("by the rule of thumb this is dec-E",), reasons=("peaks at phase 1.05",),
                  fit="differs most from post-I at phase 1.30: 12 spikes/s, fitted 3",
                  flags=("few cycles",), rule="rule of thumb: dec-E", note="check sorting")


def test_the_queue_marks_where_one_is_and_what_is_done():
    lines = queue_column(QUEUE, 3, 20, 12, look=MONO).lines()
    assert lines[3].startswith("▶✓ u3")
    assert lines[2].startswith("   u2")
    assert "early-I" in lines[0]


def test_a_step_in_the_queue_changes_two_lines_only():
    before, after = (queue_column(QUEUE, here, 20, 12, look=MONO).lines() for here in (4, 5))
    assert sum(a != b for a, b in zip(before, after, strict=True)) == 2


def test_the_queue_turns_its_page_only_at_the_end():
    assert "page 1 of 4" in queue_column(QUEUE, 10, 20, 12, look=MONO).text()
    assert "page 2 of 4" in queue_column(QUEUE, 11, 20, 12, look=MONO).text()


def test_the_last_page_of_the_queue_is_drawn_to_its_end():
    assert "u39" in queue_column(QUEUE, 39, 20, 12, look=MONO).text()


def test_one_line_of_the_queue_shows_neighbours_around_the_unit():
    line = queue_line(QUEUE, 20, 80, look=MONO).lines()[0]
    assert "[u20 early-I]" in line
    assert line.index("u19 ") < line.index("[u20") < line.index("u21 ")
    assert "early-I✓ [" in line


@pytest.mark.parametrize("here", [0, 1, 39])
@pytest.mark.parametrize("width", [5, 20, 81])
def test_one_line_of_the_queue_fits_any_width(here, width):
    assert len(queue_line(QUEUE, here, width, look=PLAIN).cells[0]) == width


def test_states_differ_without_colour():
    labels = [Label("x", "Ada", "", "viewed"), *(Label("", "", "", "", flags=(flag,)) for flag in
                                                 ("disagreement", "asks again", "stale"))]
    states = [entry("u"), entry("u", own_type="x"), entry("u", is_later=True), entry("u", is_changed=True),
              *(entry("u", label=label) for label in labels)]
    marks = {queue_column([state], 0, 20, 3, look=PLAIN).lines()[0][1] for state in states}
    assert len(marks) == len(states)


def test_a_changed_suggestion_is_marked():
    assert "*" in queue_column([entry("u", is_changed=True)], 0, 20, 3, look=PLAIN).lines()[0]


def test_the_verdict_gives_type_probability_doubts_and_reasons():
    text = verdict_rows(VERDICT, 30, 24, look=MONO).text()
    for words in ("suggested: post-I 0.71", "! by the rule of thumb", "2 dec-E  0.20", "! few cycles",
                  "- peaks at phase 1.05", "note: check sorting", "differs most"):
        assert words in text


def test_what_contradicts_stands_directly_under_the_suggestion():
    lines = verdict_rows(VERDICT, 40, 24, look=MONO).lines()
    assert lines[1] == "! by the rule of thumb this is dec-E"


def test_a_verdict_that_does_not_fit_says_how_to_see_the_rest():
    sheet = verdict_rows(VERDICT, 24, 8, more="i: all of it", look=MONO)
    assert sheet.lines()[-1] == "… i: all of it"


def test_a_blind_verdict_gives_nothing_away():
    from dataclasses import replace
    text = verdict_rows(replace(VERDICT, is_blind=True), 30, 24, look=MONO).text()
    brief = "".join(line for line, _ in verdict_in_brief(replace(VERDICT, is_blind=True), 60))
    for words in ("post-I", "dec-E", "0.71", "peaks"):
        assert words not in text
        assert words not in brief


def test_two_lines_hold_the_verdict_of_a_small_terminal():
    first, second = (line for line, _ in verdict_in_brief(VERDICT, 40, look=MONO))
    assert first.startswith("post-I 0.71")
    assert second.startswith("! by the rule of thumb")
    assert max(len(first), len(second)) <= 40


def test_the_foot_shows_the_first_keys_that_fit():
    keys = [("?", "help"), ("Enter", "accept"), ("t", "type")]
    assert footer_rows("done", keys, 24).lines() == ["done", "? help  Enter accept"]


def test_an_entry_keeps_its_cursor_in_sight():
    sheet = entry_row("note", "abcdefghijklmnop", 16, 12, look=COLOUR)
    assert sheet.inks[0].count("here") == 1
    assert "p" in sheet.lines()[0]


def test_a_choice_out_of_sight_is_scrolled_to():
    options = [(f"type {i}", "words") for i in range(30)]
    text = choice_rows("type", options, 25, 30, 6, look=PLAIN).text()
    assert "> type 25" in text
    assert "nothing matches" in choice_rows("type", [], 0, 30, 6).text()


def test_a_table_never_exceeds_its_width():
    rows = [("unit 17", "heron_04.nwb" * 4, "post-I"), ("unit 2", "x", "aug-E")]
    assert sum(column_widths(rows, 30)) + 4 <= 30
    sheet = table_rows(("unit", "file", "type"), rows, 1, 34, 5, look=PLAIN)
    assert sheet.lines()[2].startswith("> unit 2")


def test_a_long_table_says_which_part_is_shown():
    rows = [(f"unit {i}",) for i in range(50)]
    assert "9-16 of 50" in table_rows(("unit",), rows, 9, 30, 10, look=PLAIN).text()


def test_paragraphs_say_how_much_is_left():
    lines = [(f"line {i}", "") for i in range(20)]
    assert "16 more lines below" in scrolled(lines, 0, 30, 5, look=PLAIN).text()
    assert "line 19" in scrolled(lines, 99, 30, 5, look=PLAIN).text()


def heat(unit, kind, peak):
    rate = np.zeros(8, np.float32)
    rate[peak] = 5
    return HeatEntry(entry(unit, kind), rate)


def test_the_population_has_a_heading_per_type_and_a_row_per_unit():
    groups = [("early-I", [heat("u1", "early-I", 0)]), ("late-E", []), ("aug-E", [heat("u2", "aug-E", 7)])]
    lines = population_rows(groups, 1, 1.0, 1.0, 60, 14, look=PLAIN).lines()
    assert lines[0].startswith("early-I  1")
    assert lines[2].startswith("aug-E  1")
    assert lines[3].startswith("> u2")
    assert lines[3].rstrip().endswith("A   0.90")
    assert lines[3].index("#") > lines[1].index("#")


def test_types_without_units_have_no_heading():
    assert population_lines([("a", 0), ("b", 2)]) == [("b", 2), 0, 1]
