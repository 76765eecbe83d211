"""Review programs on invented results, for tests by key press."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import replace
from pathlib import Path

from textual.events import Key
from textual.pilot import Pilot

from tests.results import session_result
from unitclass.io.decisions import DecisionStore
from unitclass.io.template_files import read_library
from unitclass.records import SessionResult
from unitclass.review.session import ReviewSession
from unitclass.settings import Settings
from unitclass.tui.app import ReviewApp
from unitclass.tui.widgets.canvas import Canvas

KINDS = ("early-I", "post-I", "aug-E", "ramp-I", "late-E", "pre-I")


def result_of(n_units: int = 6, *, probability: float = 0.0, path: str = "rig/heron_04.nwb",
              conditions: tuple[str, ...] = ("baseline",), **changes: object) -> SessionResult:
    """Return a session of `n_units` units of different kinds; `probability` replaces the usual 0.93."""
    units = {str(n + 1): KINDS[n % len(KINDS)] for n in range(n_units)}
    session = session_result(path, units=units, conditions=conditions, **changes)
    if not probability:
        return session
    return replace(session, conditions=tuple(replace(c, units=tuple(
        replace(u, suggestion=replace(u.suggestion, probabilities={
            kind: probability if kind == u.suggestion.type else (1 - probability) / 8
            for kind in u.suggestion.probabilities})) for u in c.units)) for c in session.conditions))


def session_in(folder: Path, *results: SessionResult, reviewer: str = "Ada Fischer",
               is_blind: bool = False) -> ReviewSession:
    """Return a review session on results, its store in `folder`."""
    session = ReviewSession(DecisionStore(folder / "decisions.sqlite"), reviewer, is_blind=is_blind)
    for result in results or (result_of(),):
        session.add_result(result)
    return session


def app_on(session: ReviewSession, *, keys: Mapping[str, str] | None = None, **parts: object) -> ReviewApp:
    """Return the program on a session."""
    settings = Settings.from_mapping({"review": {"keys": dict(keys or {})}})
    return ReviewApp(session, settings=settings, library=lambda: read_library(), **parts)  # type: ignore[arg-type]


def shown(app: ReviewApp) -> str:
    """Return what the screen's parts show, as text."""
    return "\n".join(canvas.sheet.text() for canvas in app.screen.query(Canvas))


CHARACTERS = {"slash": "/", "question_mark": "?", "space": " ", "enter": "\r"}


async def press(app: ReviewApp, pilot: Pilot[int], *keys: str) -> str:
    """Press keys, all in one packet, and return what the screen shows once all is done."""
    for key in keys:
        app.post_message(Key(key, key if len(key) == 1 else CHARACTERS.get(key)))
    await pilot.pause()
    return shown(app)


def labels(session: ReviewSession) -> dict[str, str]:
    """Return this reviewer's labels by unit, of the first condition that has one."""
    return {e.unit: e.own_type for e in session.all_entries if e.own_type}
