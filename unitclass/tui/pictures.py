"""The screens as SVG pictures, made by the program itself without a terminal: for the manual."""

from __future__ import annotations

import asyncio
import re
from collections.abc import Mapping, Sequence
from pathlib import Path

from unitclass.tui.app import ReviewApp

SCREENS: Mapping[str, Sequence[str]] = {
    "review": (), "type": ("name",), "population": ("population",), "conditions": ("conditions",),
    "cycles": ("cycles",), "kinds": ("types",), "account": ("account",), "batch": ("batch",),
    "end": ("finish",), "help": ("help",)}
"""Name of a picture to the actions, by their ids, that lead from the review to it."""

BRIGHT = ("#fdfdc5", "#f0f0f0")
"""The drawing library's bright white is a yellow; a terminal's is not."""

_FONT_FROM_AFAR = re.compile(r"@font-face\s*\{[^}]*\}\s*")
"""A picture in the manual asks nothing of the network."""


def save_pictures(app: ReviewApp, folder: Path, *, size: tuple[int, int] = (110, 34)) -> list[Path]:
    """Write one SVG per screen into `folder`, from the unit the session stands at; return the files.

    Nothing is decided on the way.
    """
    folder.mkdir(parents=True, exist_ok=True)
    return asyncio.run(_saved(app, folder, size))


async def _saved(app: ReviewApp, folder: Path, size: tuple[int, int]) -> list[Path]:
    written = []
    async with app.run_test(size=size) as pilot:
        await pilot.pause()
        for name, actions in SCREENS.items():
            _press(app, [app.keys.key(action) for action in actions])
            await pilot.pause()
            written.append(folder / f"{name}.svg")
            drawn = app.export_screenshot(title=f"unitclass: {name}")
            written[-1].write_text(_FONT_FROM_AFAR.sub("", drawn.replace(*BRIGHT)), encoding="utf-8")
            if actions:
                _press(app, ["escape"])
                await pilot.pause()
    return written


def _press(app: ReviewApp, keys: Sequence[str]) -> None:
    from textual.events import Key

    for key in keys:
        first = key.partition(",")[0]
        app.post_message(Key(first, first if len(first) == 1 else None))
