"""The order of the queue, filters, and a cursor that stays on its unit."""

from __future__ import annotations

import pytest

from tests.review.reviews import changed_unit, result_with, review, row, units
from unitclass.errors import UsageError
from unitclass.review.entry import flag_kind, natural
from unitclass.review.filters import Filter

MIXED = {"1": ("ramp-I", 0.99), "2": ("post-I", 0.55), "3": ("aug-E", 0.97), "4": ("silent", 0.0),
         "5": ("pre-I", 0.80), "6": ("ramp-I", 0.96), "7": ("aug-E", 0.98), "8": ("late-I", 0.96)}


@pytest.fixture
def session(tmp_path):
    result = changed_unit(result_with(units=MIXED), "8", flags=("halves of the session disagree (r 0.21)",))
    return review(tmp_path, changed_unit(result, "5", shape_group="B", columns={"Brain_Region": "caudal"}))


def test_the_most_informative_come_first_and_the_sure_ones_last_type_by_type(session):
    # uncertain by margin: 2, 5; sure but contradicted: 8; states: 4; sure: aug-E 7, 3, then ramp-I 1, 6
    assert units(session) == ["2", "5", "8", "4", "7", "3", "1", "6"]


@pytest.mark.parametrize(("by", "order"), [
    ("unit", "12345678"), ("probability", "25683714"), ("type", "73825164"), ("condition", "12345678"),
    ("region", "51234678"), ("shape group", "41236785"), ("file", "12345678")])
def test_the_queue_is_sorted_by_what_is_named(session, by, order):
    session.sort(by)
    assert "".join(units(session)) == order
    session.sort(by, is_reversed=True)
    assert "".join(units(session)) == order[::-1]
    assert (session.sorted_by, session.is_reversed) == (by, True)


def test_an_unknown_sort_is_refused_and_names_the_known_ones(session):
    with pytest.raises(UsageError, match="sorted by 'colour'; use one of informative, type"):
        session.sort("colour")


def test_reviewed_units_can_be_sorted_to_the_end(session):
    session.accept()
    session.sort("reviewed")
    assert units(session)[-1] == "2"


@pytest.mark.parametrize(("chosen", "shown"), [
    (Filter(types=("ramp-I", "silent")), "146"), (Filter(high=0.9), "25"), (Filter(low=0.97), "137"),
    (Filter(regions=("caudal",)), "5"), (Filter(shape_groups=("B",)), "5"),
    (Filter(flags=("halves of the session disagree",)), "8"), (Filter(conditions=("baseline",)), "12345678"),
    (Filter(conditions=("other",)), ""), (Filter(files=("a.nwb",)), "12345678"),
    (Filter(files=("rig/a.nwb",), types=("aug-E",)), "37"), (Filter(is_reviewed=True), ""),
    (Filter(is_reviewed=False), "12345678"), (Filter(text="CAUDAL 5"), "5"), (Filter(states=("open",)), "12345678"),
    (Filter(), "12345678")])
def test_a_filter_lets_through_what_meets_all_of_it(session, chosen, shown):
    session.show(chosen)
    assert "".join(sorted(units(session))) == shown
    assert chosen.is_empty == (chosen == Filter())


def test_a_filter_by_type_goes_by_the_own_label_where_there_is_one(session):
    session.name_type("con-I")  # unit 2
    session.show(Filter(types=("con-I",)))
    assert units(session) == ["2"]
    session.show(Filter(is_reviewed=True))
    assert units(session) == ["2"]


def test_choices_of_a_filter_come_with_their_numbers(session):
    assert dict(session.choices("types"))["ramp-I"] == 2
    assert session.choices("flags") == (("halves of the session disagree", 1),)
    assert session.choices("files") == (("rig/a.nwb", 8),)
    assert session.choices("regions") == (("caudal", 1), ("rostral column", 7))


def test_choices_are_counted_among_what_else_is_asked_for(session):
    session.show(Filter(regions=("caudal",)))  # unit 5 alone
    assert dict(session.choices("types")) == {session.current.suggested_type: 1}
    assert dict(session.choices("regions")) == {"caudal": 1, "rostral column": 7}
    for name, count in session.choices("regions"):
        session.show(Filter(regions=(name,)))
        assert len(session.entries) == count


def test_the_cursor_stays_through_filters_and_sorts_or_goes_to_the_next_in_order(session):
    session.go_to(("rig/a.nwb", "7", "baseline"))
    session.show(Filter(types=("aug-E",)))
    assert (session.current.unit, session.index) == ("7", 0)
    session.sort("unit")
    assert (session.current.unit, session.index) == ("7", 1)
    session.show(Filter(types=("ramp-I", "late-I")))
    assert session.current.unit == "8"
    session.show(Filter(types=("nothing",)))
    assert (session.current, session.index, session.entries) == (None, -1, ())
    session.show(Filter())
    assert session.current.unit == "8"


def test_a_decided_unit_keeps_its_place_under_a_filter_for_open_ones(session):
    session.show(Filter(is_reviewed=False))
    before = units(session)
    session.accept()
    assert units(session) == before
    session.show(Filter(is_reviewed=False))
    assert units(session) == before[1:]


def test_undo_brings_a_unit_back_that_the_filter_hides(session):
    session.accept()
    session.show(Filter(is_reviewed=False))
    assert "2" not in units(session)
    session.undo()
    assert session.current.unit == "2"
    assert units(session)[0] == "2"


def test_the_cursor_stops_at_the_ends(session):
    assert session.move_previous().unit == "2"
    assert session.jump(99).unit == "6"
    assert session.move_next().unit == "6"
    assert session.jump(-5).unit == "2"
    assert [session.move_next().unit for _ in range(3)] == ["5", "8", "4"]


def test_the_cursor_starts_on_the_first_open_unit(tmp_path):
    first = review(tmp_path)
    first.accept()
    first.later()
    assert review(tmp_path).current.key == first.current.key
    assert review(tmp_path).index == 2


def test_find_goes_to_the_exact_name_first_and_then_round(tmp_path):
    session = review(tmp_path, result_with(units={"10": ("ramp-I", 0.6), "1": ("ramp-I", 0.7), "21": ("ramp-I", 0.8)}))
    assert session.current.unit == "10"
    assert session.find("1").unit == "1"
    assert session.find("2").unit == "21"
    assert session.find("ROSTRAL 0").unit == "10"
    assert session.find("a.nwb").unit == "1"
    assert session.find("nowhere") is None
    assert session.current.unit == "1"


def test_jumping_to_an_unknown_row_is_a_key_error(session):
    with pytest.raises(KeyError):
        session.go_to(("rig/a.nwb", "99", "baseline"))


def test_numbers_in_names_sort_by_value():
    names = ["unit 10", "unit 9", "Unit 9b", "9", "unit 009", "", "x" + "7" * 5000, "unit −3", "\x1b[1m"]
    assert [n for n in sorted(names, key=natural) if n in ("unit 9", "unit 10", "9")] == ["9", "unit 9", "unit 10"]


@pytest.mark.parametrize(("flag", "kind"), [
    ("few cycles (12)", "few cycles"), ("rate drifts by +55 %", "rate drifts"), ("unsure", "unsure"), ("", ""),
    ("1.3 % of intervals under 1 ms: perhaps not one cell", "intervals under ms: perhaps not one cell")])
def test_flags_are_one_kind_whatever_their_numbers(flag, kind):
    assert flag_kind(flag) == kind


def test_hostile_names_do_no_harm(tmp_path):
    names = ["\x1b[31m", "[bold]", "\u202ertl", "a\nb", "", "12" * 400]
    session = review(tmp_path, result_with(units=dict.fromkeys(names, ("ramp-I", 0.6))))
    session.sort("unit")
    for _ in names:
        session.accept()
    assert {e.unit for e in session.entries if e.is_reviewed} == set(names)
    assert row(session, "a\nb").own_type == "ramp-I"
