"""Suggestions falsified on purpose stand out on the unit page; right ones do not."""

from dataclasses import replace

import pytest

from tests.results import suggestion
from tests.tui.apps import app_on, result_of, session_in, shown
from unitclass.io.template_files import read_library
from unitclass.records import SessionResult
from unitclass.tui.desk import Desk
from unitclass.tui.renderables.glyphs import MONO
from unitclass.tui.renderables.verdict import verdict_rows

WRONG = {"early-I": "post-I", "post-I": "early-I", "aug-E": "ramp-I", "ramp-I": "aug-E", "late-E": "early-I",
         "pre-I": "post-I"}
FALSIFIED = {str(n) for n in range(3, 33, 3)}


def only_the_name(unit, wrong):
    """Replace nothing but the type: probabilities, reasons and fit stay those of the right one."""
    return replace(unit.suggestion, type=wrong)


def name_and_probabilities(unit, wrong):
    """Exchange the right type and the wrong one, in rule of thumb too; the fit stays the right one."""
    p = dict(unit.suggestion.probabilities)
    right = unit.suggestion.type
    p[right], p[wrong] = p[wrong], p[right]
    return replace(unit.suggestion, type=wrong, probabilities=p, rule_type=wrong)


def everything(unit, wrong):
    """Give the wrong type's own fit, reasons and probabilities, and its rule of thumb."""
    from tests.results import unit_result

    other = unit_result("x", wrong)
    return suggestion(wrong, other.histogram)


def falsified(how) -> SessionResult:
    session = result_of(36)
    condition = session.conditions[0]
    units = tuple(replace(u, suggestion=how(u, WRONG[u.suggestion.type])) if u.unit in FALSIFIED else u
                  for u in condition.units)
    return replace(session, conditions=(replace(condition, units=units),))


@pytest.mark.parametrize("how", [only_the_name, name_and_probabilities, everything])
def test_a_falsified_suggestion_shows_a_contradiction_and_a_right_one_none(tmp_path, how):
    session = session_in(tmp_path, falsified(how))
    desk = Desk(session, read_library)
    assert desk.library is not None
    marked = set()
    for place, entry in enumerate(session.entries):
        desk.go(place)
        lines = verdict_rows(desk.view().verdict, 25, 20, look=MONO).lines()
        if any(line.startswith("! ") for line in lines[:8]):
            marked.add(entry.unit)
    assert marked == FALSIFIED


async def test_the_picture_of_a_falsified_unit_shows_the_wrong_family_beside_the_data(tmp_path):
    session = session_in(tmp_path, falsified(everything))
    session.go_to(("rig/heron_04.nwb", "3", "baseline"))
    app = app_on(session)
    async with app.run_test(size=(80, 24)) as pilot:
        await pilot.pause()
        picture = app.screen.page.picture.sheet.lines()
        assert "ramp-I as fitted" in app.screen.page.sheet(20).text()
    fitted = [x for line in picture[4:11] for x, c in enumerate(line) if c in "━▔"]
    bars = [x for line in picture[4:11] for x, c in enumerate(line) if c in "█▓"]
    assert max(fitted) < min(bars)


async def test_the_small_screen_shows_the_contradiction_too(tmp_path):
    session = session_in(tmp_path, falsified(everything))
    session.go_to(("rig/heron_04.nwb", "3", "baseline"))
    app = app_on(session)
    async with app.run_test(size=(40, 12)) as pilot:
        await pilot.pause()
        assert "! does not fit ramp-I" in shown(app)
