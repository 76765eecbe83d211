"""Writes docs/settings.md from the settings themselves: `python -m tests.settings_page`."""

from __future__ import annotations

import math
from pathlib import Path

from unitclass.settings import Settings, Tunable

PAGE = Path(__file__).parent.parent / "docs" / "settings.md"
HEAD = """# Settings

`unitclass settings` prints the values in force; this page is made from the same list (`python -m tests.settings_page`).
A settings file is TOML with a table per group, given with `--settings FILE`; unknown names and values out of range
are refused with the nearest right one.

| name | default | unit | range | meaning | source |
|---|---|---|---|---|---|
"""


def line(t: Tunable) -> str:
    """Return one row of the table."""
    span = "" if math.isnan(t.low) else f"{t.low:g} to {t.high:g}"
    value = "" if t.value in ({}, (), "") else str(t.value)
    cells = (f"`{t.name}`", value, t.unit, span, t.meaning, t.source)
    return "| " + " | ".join(cell.replace("|", "or") for cell in cells) + " |"


def page() -> str:
    """Return the whole page."""
    return HEAD + "\n".join(line(t) for t in Settings().tunables()) + "\n"


if __name__ == "__main__":
    PAGE.write_text(page(), encoding="utf-8")
