"""Decisions by key: what each does, and that it is in the store before the next unit shows."""

import pytest
from textual.events import Paste

from tests.tui.apps import app_on, labels, press, result_of, session_in, shown
from unitclass.errors import TargetError
from unitclass.io.decisions import DecisionStore


async def test_enter_accepts_and_the_next_unit_shows(tmp_path):
    session = session_in(tmp_path)
    app = app_on(session)
    async with app.run_test(size=(80, 24)) as pilot:
        first, second = session.entries[:2]
        text = await press(app, pilot, "enter")
        assert labels(session) == {first.unit: first.suggested_type}
        assert f"unit {second.unit}" in text
        assert f"{first.unit}: {first.suggested_type}" in text


async def test_what_the_screen_shows_as_decided_is_in_the_store(tmp_path):
    session = session_in(tmp_path)
    app = app_on(session)
    async with app.run_test(size=(80, 24)) as pilot:
        await press(app, pilot, "enter", "enter", "2")
        told = DecisionStore(tmp_path / "decisions.sqlite", is_read_only=True).history(
            session.entries[0].identifier, session.entries[0].object_id)
        assert {d.unit: d.type for d in told} == labels(session)
        assert len(told) == 3


async def test_a_digit_takes_the_type_listed_with_it(tmp_path):
    session = session_in(tmp_path)
    app = app_on(session)
    async with app.run_test(size=(80, 24)) as pilot:
        entry = session.entries[0]
        await press(app, pilot, "3")
        assert labels(session) == {entry.unit: entry.ranked[2][0]}


async def test_two_letters_and_enter_name_any_type(tmp_path):
    session = session_in(tmp_path)
    app = app_on(session)
    async with app.run_test(size=(80, 24)) as pilot:
        entry = session.entries[0]
        text = await press(app, pilot, "t", "b", "i")
        assert "bi-E" in text
        await press(app, pilot, "enter")
        assert labels(session) == {entry.unit: "bi-E"}


async def test_leaving_the_list_of_types_decides_nothing_and_shows_the_verdict_again(tmp_path):
    session = session_in(tmp_path)
    app = app_on(session)
    async with app.run_test(size=(80, 24)) as pilot:
        text = await press(app, pilot, "t", "b", "escape")
        assert labels(session) == {}
        assert "suggested:" in text


async def test_keys_typed_into_a_note_decide_nothing(tmp_path):
    session = session_in(tmp_path)
    app = app_on(session)
    async with app.run_test(size=(80, 24)) as pilot:
        await press(app, pilot, "n", *"x1uq", "space", *"ok", "enter")
        assert labels(session) == {}
        assert session.entries[0].note == "x1uq ok"
        assert "note: x1uq ok" in shown(app)


async def test_a_note_can_be_changed_and_removed(tmp_path):
    session = session_in(tmp_path)
    app = app_on(session)
    async with app.run_test(size=(80, 24)) as pilot:
        await press(app, pilot, "n", *"ab", "enter", "n", "backspace", "enter")
        assert session.entries[0].note == "a"
        await press(app, pilot, "n", "backspace", "enter")
        assert session.entries[0].note == ""


async def test_undo_and_redo_go_back_and_forth_over_decisions(tmp_path):
    session = session_in(tmp_path)
    app = app_on(session)
    async with app.run_test(size=(80, 24)) as pilot:
        await press(app, pilot, "enter", "enter", "u", "u")
        assert labels(session) == {}
        text = await press(app, pilot, "u")
        assert "nothing to take back" in text
        await press(app, pilot, "r", "r")
        assert len(labels(session)) == 2


async def test_undo_reaches_into_an_earlier_session(tmp_path):
    app = app_on(session_in(tmp_path))
    async with app.run_test(size=(80, 24)) as pilot:
        await press(app, pilot, "enter")
    session = session_in(tmp_path)
    app = app_on(session)
    async with app.run_test(size=(80, 24)) as pilot:
        assert len(labels(session)) == 1
        await press(app, pilot, "u")
        assert labels(session) == {}


async def test_not_one_cell_and_later_have_a_key_each(tmp_path):
    session = session_in(tmp_path)
    app = app_on(session)
    async with app.run_test(size=(80, 24)) as pilot:
        first, second = session.entries[:2]
        await press(app, pilot, "x", "l")
        assert labels(session) == {first.unit: "not one cell"}
        assert session.entry(second.key).is_later
        assert "z" in app.screen.query("QueueColumn, Head").first().sheet.text()


async def test_blind_nothing_is_given_away_until_a_type_is_named(tmp_path):
    session = session_in(tmp_path, is_blind=True)
    app = app_on(session)
    async with app.run_test(size=(120, 40)) as pilot:
        text = shown(app)
        for words in ("early-I", "post-I", "0.93", "as fitted", "peaks at"):
            assert words not in text
        text = await press(app, pilot, "enter")
        assert labels(session) == {}
        assert "hidden until" in text
        await press(app, pilot, "t", *"ramp", "enter", "up")
        assert session.all_entries
        assert "suggested:" in shown(app)
        assert [e.own_how for e in session.all_entries if e.own_type] == ["blind"]


async def test_blind_mode_can_be_turned_on_and_off(tmp_path):
    app = app_on(session_in(tmp_path))
    async with app.run_test(size=(80, 24)) as pilot:
        assert "suggested:" not in await press(app, pilot, "b")
        assert "suggested:" in await press(app, pilot, "b")


async def test_a_batch_shows_exactly_what_it_accepts_and_is_undone_as_one(tmp_path):
    session = session_in(tmp_path, result_of(8, probability=0.97))
    app = app_on(session)
    async with app.run_test(size=(80, 24)) as pilot:
        listed = await press(app, pilot, "a")
        assert "accept 8 suggestions" in listed
        assert labels(session) == {}
        text = await press(app, pilot, "x")
        assert "accept 7 suggestions" in text
        left_out = session.batch_candidates()[0].unit
        text = await press(app, pilot, "enter")
        assert "7 accepted without looking" in text
        assert set(labels(session)) == {str(n) for n in range(1, 9)} - {left_out}
        assert {e.own_how for e in session.all_entries if e.own_type} == {"batch"}
        await press(app, pilot, "u")
        assert labels(session) == {}


async def test_a_batch_without_sure_units_says_so(tmp_path):
    app = app_on(session_in(tmp_path, result_of(3, probability=0.5)))
    async with app.run_test(size=(80, 24)) as pilot:
        assert "None of the units in view is sure" in await press(app, pilot, "a")


@pytest.mark.parametrize("key", ["enter", "2", "x"])
async def test_what_cannot_be_saved_is_said_at_once_and_not_shown_as_taken(tmp_path, key, monkeypatch):
    session = session_in(tmp_path)
    app = app_on(session)

    def full(*given, **named):
        raise TargetError("no space left on device", where="decisions.sqlite", remedy="make room")

    async with app.run_test(size=(120, 40)) as pilot:
        before = session.current
        monkeypatch.setattr(DecisionStore, "decide", full)
        text = await press(app, pilot, key)
        assert "no space left on device" in text
        assert labels(session) == {}
        assert session.current == before
        monkeypatch.undo()
        await press(app, pilot, "m", "ctrl+u")
        app.post_message(Paste(str(tmp_path / "other.sqlite")))
        await press(app, pilot, "enter")
        assert session.store_path == tmp_path / "other.sqlite"
        assert len(labels(session)) == 1


async def test_a_paste_outside_an_entry_is_not_a_row_of_keys(tmp_path):
    session = session_in(tmp_path)
    app = app_on(session)
    async with app.run_test(size=(80, 24)) as pilot:
        app.post_message(Paste("1x2q"))
        await pilot.pause()
        assert labels(session) == {}
        assert app.is_running


async def test_a_reviewer_who_agrees_with_nearly_all_presses_less_than_six_keys_for_five_units(tmp_path):
    session = session_in(tmp_path, result_of(40, probability=0.7))
    app = app_on(session)
    wrong = {"7", "32"}
    keys = []
    async with app.run_test(size=(80, 24)) as pilot:
        while len(labels(session)) < 40:
            now = ("t", "b", "i", "enter") if session.current.unit in wrong else ("enter",)
            keys += now
            await press(app, pilot, *now)
        assert "every unit" in await press(app, pilot, "e")
    assert len(keys) <= 1.2 * 40
    assert all((label == "bi-E") == (unit in wrong) for unit, label in labels(session).items())
