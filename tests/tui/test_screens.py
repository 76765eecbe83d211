"""The other screens by key press: what they show, and the way back."""

from dataclasses import replace

import numpy as np
import pytest

from tests.results import session_result, vm_result
from tests.tui.apps import app_on, labels, press, result_of, session_in, shown
from unitclass.errors import FileError
from unitclass.records import Decision
from unitclass.tui.keys import DECLARED, OTHERS, REVIEW

TWO = ("baseline", "hypercapnia")


SCREENS = {"p": "population", "s": "conditions", "c": "cycles", "k": "kinds of unit", "i": "suggested:",
           "a": "accept 0", "d": "reviewers differ", "e": "end of the review", "question_mark": "help"}


@pytest.mark.parametrize("size", [(80, 24), (40, 12), (200, 60)])
async def test_every_screen_opens_at_every_size_and_escape_leads_back(tmp_path, size):
    app = app_on(session_in(tmp_path, result_of(30, conditions=TWO)))
    async with app.run_test(size=size) as pilot:
        review = app.screen
        for key, words in SCREENS.items():
            assert words in await press(app, pilot, key)
            await press(app, pilot, "escape")
            assert app.screen is review


async def test_every_key_of_the_declaration_has_an_action_on_its_screens(tmp_path):
    app = app_on(session_in(tmp_path))
    async with app.run_test(size=(80, 24)):
        for name in (REVIEW, *OTHERS):
            screen = app.screen if name == REVIEW else app.other_screen(name)
            for declared in DECLARED:
                if name in declared.screens:
                    assert callable(getattr(screen, f"action_{declared.action[0]}")), (name, declared.id)


async def test_a_remapped_key_works_and_the_old_one_does_not(tmp_path):
    session = session_in(tmp_path)
    app = app_on(session, keys={"accept": "space", "finish": "f"})
    async with app.run_test(size=(80, 24)) as pilot:
        await press(app, pilot, "enter")
        assert labels(session) == {}
        text = await press(app, pilot, "space")
        assert len(labels(session)) == 1
        assert "Space accept" in text
        assert "end of the review" in await press(app, pilot, "f")


async def test_down_and_up_step_through_the_queue_and_pages_jump(tmp_path):
    session = session_in(tmp_path, result_of(60))
    app = app_on(session)
    async with app.run_test(size=(120, 40)) as pilot:
        await press(app, pilot, "down", "down", "up")
        assert session.index == 1
        await press(app, pilot, "end")
        assert session.index == 59
        await press(app, pilot, "home", "pagedown")
        assert session.index == 36
        assert f"unit {session.current.unit}" in shown(app)


async def test_a_unit_is_found_by_name(tmp_path):
    session = session_in(tmp_path, result_of(30))
    app = app_on(session)
    async with app.run_test(size=(80, 24)) as pilot:
        assert "unit 17" in await press(app, pilot, "slash", "1", "7", "enter")
        assert "no unit in view is called zz" in await press(app, pilot, "slash", "z", "z", "enter")


async def test_units_can_be_chosen_and_ordered_without_losing_the_present_one(tmp_path):
    session = session_in(tmp_path, result_of(30))
    app = app_on(session)
    async with app.run_test(size=(120, 40)) as pilot:
        text = await press(app, pilot, "w", *"post", "enter")
        assert {e.suggested_type for e in session.entries} == {"post-I"}
        assert "5 of 30 units in view" in text
        await press(app, pilot, "w", *"all", "enter", "o", *"unit", "enter")
        assert [e.unit for e in session.entries] == [str(n) for n in range(1, 31)]
        here = session.current
        await press(app, pilot, "o", *"other", "enter")
        assert session.current == here
        assert session.entries[0].unit == "30"


async def test_the_population_is_grouped_by_type_and_leads_to_a_unit(tmp_path):
    session = session_in(tmp_path, result_of(12))
    app = app_on(session)
    async with app.run_test(size=(80, 40)) as pilot:
        text = await press(app, pilot, "p")
        order = [text.index(f"\n{name}  2") for name in ("early-I", "ramp-I", "post-I", "aug-E", "late-E")]
        assert order == sorted(order)
        await press(app, pilot, "slash", "8", "enter", "enter")
        assert session.current.unit == "8"
        assert "unit 8" in shown(app)


async def test_conditions_stand_side_by_side_on_one_scale(tmp_path):
    session = session_in(tmp_path, result_of(3, conditions=TWO))
    app = app_on(session)
    async with app.run_test(size=(120, 40)) as pilot:
        text = await press(app, pilot, "s")
        heading = next(line for line in text.splitlines() if "baseline" in line and "hypercapnia" in line)
        assert heading.index("baseline") < heading.index("hypercapnia")
        unit = session.current.unit
        await press(app, pilot, "down", "enter")
        assert (session.current.unit, session.current.condition) == (unit, "hypercapnia")


async def test_a_cycle_is_dropped_the_threshold_raised_and_both_are_stored_on_enter(tmp_path):
    session = session_in(tmp_path)
    app = app_on(session)
    async with app.run_test(size=(100, 30)) as pilot:
        assert "37 of 39 cycles used" in await press(app, pilot, "c")
        text = await press(app, pilot, "right", "right", "x", "up", "up")
        assert "36 of 39 cycles used" in text
        assert "threshold x 1.21, 1 cycles turned" in text
        path = session.current.path
        assert session.cycle_edits(path) == ()
        await press(app, pilot, "u")
        assert "threshold x 1.10" in shown(app)
        await press(app, pilot, "enter")
        edits = session.cycle_edits(path)
        assert [(e.action, e.value) for e in edits if e.action == "threshold"] == [("threshold", pytest.approx(1.1))]
        dropped = next(e for e in edits if e.action == "drop")
        assert 6.5 < dropped.at_s < 9.5
        assert {e.reviewer for e in edits} == {"Ada Fischer"}


async def test_a_cycle_that_was_left_out_can_be_taken_in_again(tmp_path):
    session = session_in(tmp_path)
    app = app_on(session)
    async with app.run_test(size=(100, 30)) as pilot:
        assert "sigh, left out: burst 2.1" in await press(app, pilot, "c", *["right"] * 5)
        assert "38 of 39 cycles used" in await press(app, pilot, "x")
        await press(app, pilot, "enter")
        assert [e.action for e in session.cycle_edits(session.current.path)] == ["restore"]


async def test_after_an_edit_the_file_is_analysed_again_and_the_effect_is_shown(tmp_path):
    session = session_in(tmp_path)
    app = app_on(session)
    asked = []
    async with app.run_test(size=(100, 30)) as pilot:
        app.analyse_again = lambda paths: asked.extend(paths) or True
        await press(app, pilot, "c", "x", "enter")
        assert asked == [session.current.path]
        before = session.current
        fewer = result_of()
        fewer = replace(fewer, conditions=tuple(replace(c, units=tuple(
            replace(u, n_cycles=36, n_spikes=u.n_spikes - 11) for u in c.units)) for c in fewer.conditions))
        from unitclass.tui.messages import ANALYSIS, WorkDone
        from unitclass.tui.workers import Done
        app.post_message(WorkDone(ANALYSIS, Done(before.path, fewer)))
        await pilot.pause()
        await pilot.pause()
        line = next(line for line in shown(app).splitlines() if "; now" in line)
        assert f"{before.n_spikes} spikes in 37 cycles; now" in line
        assert f"{before.n_spikes - 11} spikes in 36 cycles" in line


async def test_kinds_show_words_members_and_the_band_of_the_family(tmp_path):
    app = app_on(session_in(tmp_path, result_of(12)))
    async with app.run_test(size=(100, 30)) as pilot:
        text = await press(app, pilot, "k")
    assert "2 here: " in text
    assert "░" in text
    assert "not one cell" in text


async def test_a_reviewer_settles_what_two_see_differently(tmp_path):
    first = session_in(tmp_path, reviewer="Bo Lindqvist")
    entry = first.entries[0]
    first.name_type("ramp-I")
    session = session_in(tmp_path)
    session.go_to(entry.key)
    session.name_type("late-I")
    app = app_on(session)
    async with app.run_test(size=(120, 30)) as pilot:
        text = await press(app, pilot, "d")
        assert "1 units on which reviewers differ" in text
        assert "Bo Lindqvist: ramp-I" in text
        assert "Ada Fischer: late-I" in text
        await press(app, pilot, "2")
        assert session.disagreements() == ()
        assert session.entry(entry.key).label.type in ("ramp-I", "late-I")
        said = {(d.reviewer, d.type) for d in session.opinions(session.entry(entry.key))}
        assert said == {("Bo Lindqvist", "ramp-I"), ("Ada Fischer", "late-I")}
        assert isinstance(session.opinions(entry)[0], Decision)


async def test_the_end_tells_what_is_left_what_was_not_looked_at_and_where_files_go(tmp_path):
    path = str(tmp_path / "heron_04.nwb")
    session = session_in(tmp_path, result_of(8, probability=0.97, path=path))
    app = app_on(session, export=written)
    async with app.run_test(size=(120, 40)) as pilot:
        await press(app, pilot, "a", "x", "enter")
        text = await press(app, pilot, "e")
        assert "1 units and conditions without your label" in text
        assert "7 accepted in a batch, without looking" in text
        assert str(tmp_path / "heron_04.labelled.nwb") in text
        await press(app, pilot, "enter")
        for _ in range(100):
            await pilot.pause(0.1)
            if "Done" in shown(app):
                break
        assert f"written: {tmp_path / 'heron_04.labelled.nwb'}" in shown(app)
        assert (tmp_path / "heron_04.labelled.nwb").read_text() == "7 labels of 8"


def written(path, result, labels_, target, is_replacing):
    """Stand in for the export; runs in another process."""
    from pathlib import Path

    Path(target).write_text(f"{len(labels_)} labels of {sum(1 for _ in result.units())}")
    return target


async def test_labels_teach_and_changed_suggestions_are_marked_but_nothing_moves(tmp_path):
    session = session_in(tmp_path, result_of(30, probability=0.6))
    app = app_on(session, relearn=learned)
    async with app.run_test(size=(80, 24)) as pilot:
        order = [e.key for e in session.entries]
        await press(app, pilot, *["enter"] * 5)
        here = session.current
        for _ in range(100):
            await pilot.pause(0.1)
            if any(e.is_changed for e in session.entries):
                break
        assert [e.key for e in session.entries] == order
        assert session.current.key == here.key
        changed = [e for e in session.entries if e.is_changed]
        assert [e.unit for e in changed] == ["30"]
        assert "was pre-I 0.60" in changed[0].change
        text = await press(app, pilot, "g")
        assert "unit 30" in text
        assert "was pre-I" in text


def learned(lessons):
    """Stand in for the learner: after five labels unit 30 looks like ramp-I; runs in another process."""
    from unitclass.records import Suggestion

    if len(lessons) < 5:
        return {}
    nothing = np.zeros(0)
    return {("rig/heron_04.nwb", "30", "baseline"): Suggestion("ramp-I", {"ramp-I": 0.9, "pre-I": 0.1}, (), {},
                                                               nothing, nothing, nothing)}


async def test_shape_groups_come_from_the_background_and_the_queue_can_be_cut_down_to_one(tmp_path):
    session = session_in(tmp_path, result_of(30))
    app = app_on(session, group=groups_of_thirty)
    async with app.run_test(size=(100, 30)) as pilot:
        here = session.current.key
        await press(app, pilot, "p")
        for _ in range(100):
            await pilot.pause(0.1)
            if "G2" in shown(app):
                break
        text = shown(app)
        assert "G1" in text
        assert "G2" in text
        await press(app, pilot, "escape")
        assert session.current.key == here
        await press(app, pilot, "w", *"shape group G2")
        await press(app, pilot, "enter")
        assert {e.shape_group for e in session.entries} == {"G2"}
        assert len(session.entries) == 10
        assert "G2" in await press(app, pilot, "i")


def groups_of_thirty():
    """Stand in for the grouping: ten of thirty units are in G2; runs in another process."""
    return {("rig/heron_04.nwb", str(n), "baseline"): "G2" if n % 3 == 0 else "G1" for n in range(1, 31)}


async def test_the_account_holds_reasons_features_and_evidence(tmp_path):
    app = app_on(session_in(tmp_path))
    async with app.run_test(size=(100, 60)) as pilot:
        text = await press(app, pilot, "i")
    for words in ("begins at phase", "onset, peak, offset", "eta squared", "evidence for the first type",
                  "histogram", "refractory violations", "region"):
        assert words in text


async def test_an_intracellular_unit_shows_its_membrane_potential(tmp_path):
    session = session_result()
    first = session.conditions[0]
    session = replace(session, conditions=(replace(first, units=(vm_result(),)),))
    app = app_on(session_in(tmp_path, session))
    async with app.run_test(size=(80, 24)) as pilot:
        await pilot.pause()
        assert "Vm mV" in shown(app)


async def test_silent_and_undetermined_units_show_no_family_and_no_probability(tmp_path):
    session = session_in(tmp_path, session_result(conditions=("baseline",)))
    app = app_on(session)
    async with app.run_test(size=(80, 24)) as pilot:
        for name in ("20", "31"):
            text = await press(app, pilot, "slash", *name, "enter")
            assert "as fitted" not in text
            assert "nan" not in text


async def test_results_that_cannot_be_read_any_more_are_told_and_the_review_goes_on(tmp_path, monkeypatch):
    session = session_in(tmp_path)
    app = app_on(session)

    def lost(entry, **given):
        raise FileError("its results cannot be read", where="cache.sqlite", remedy="open the review again")

    async with app.run_test(size=(80, 24)) as pilot:
        monkeypatch.setattr(session, "unit_result", lost)
        assert "its results cannot be read" in await press(app, pilot, "down")
        assert "its results cannot be read" in await press(app, pilot, "s")
        monkeypatch.undo()
        assert "suggested:" in await press(app, pilot, "down")


async def test_a_click_in_the_queue_goes_to_that_unit_and_the_wheel_steps(tmp_path):
    session = session_in(tmp_path, result_of(60))
    app = app_on(session)
    async with app.run_test(size=(120, 40)) as pilot:
        await pilot.click("QueueColumn", offset=(4, 7))
        await pilot.pause()
        assert session.index == 7
        await press(app, pilot, "question_mark")


async def test_nothing_waits_on_a_clock_while_nobody_does_anything(tmp_path):
    app = app_on(session_in(tmp_path))
    async with app.run_test(size=(80, 24)) as pilot:
        await pilot.pause(0.3)
        timers = [timer for node in (app, app.screen, *app.screen.query("*")) for timer in node._timers]
        assert all(not timer._active.is_set() for timer in timers)
