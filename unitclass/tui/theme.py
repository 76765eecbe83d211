"""Inks to styles. Shape and words carry every meaning; colour only helps.

The sixteen colours of the terminal's own palette are used on its own background, so a light
terminal stays light; shading for inspiration is the one background, and sets its own text colour.
"""

from __future__ import annotations

import os
from collections.abc import Mapping

from rich.style import Style

from unitclass.tui.renderables.glyphs import ASCII, BLOCKS, Look
from unitclass.tui.renderables.sheet import SHADED

COLOURED: Mapping[str, str] = {
    "quiet": "dim", "axis": "dim", "shade": "dim", "strong": "bold", "key": "cyan", "fit": "bold magenta",
    "bar": "blue", "burst": "green", "warn": "bold red", "good": "green", "here": "reverse",
    "title": "bold", "inspiration": "bold blue", "threshold": "bold magenta"}
BARE: Mapping[str, str] = {
    "quiet": "dim", "axis": "", "shade": "dim", "strong": "bold", "key": "bold", "fit": "bold", "bar": "",
    "burst": "", "warn": "bold", "good": "", "here": "reverse", "title": "bold", "inspiration": "bold",
    "threshold": "bold"}
SHADES = {"dark": "color(15) on color(236)", "light": "color(0) on color(254)"}


class Theme:
    """The styles in force for one terminal."""

    def __init__(self, look: Look, background: str = "dark") -> None:
        self.look = look
        self._shade = Style.parse(SHADES.get(background, SHADES["dark"]))
        self._styles: dict[str, Style | None] = {"": None}

    def style(self, ink: str) -> Style | None:
        """Return the style of an ink; None leaves the terminal's own."""
        if ink not in self._styles:
            self._styles[ink] = self._made(ink)
        return self._styles[ink]

    def _made(self, ink: str) -> Style | None:
        name = ink.rstrip(SHADED)
        words = (COLOURED if self.look.has_colour else BARE).get(name, "")
        style = Style.parse(words) if words else None
        if name != ink and self.look.has_colour:
            return self._shade + style if style else self._shade
        return style


def look_of_terminal(environment: Mapping[str, str] | None = None) -> Look:
    """Return how pictures may be drawn here, from NO_COLOR, TERM and the locale."""
    env = os.environ if environment is None else environment
    term = env.get("TERM", "")
    has_colour = not env.get("NO_COLOR") and "NO_COLOR" not in env and not term.startswith("vt") \
        and not term.endswith("-mono") and term != "dumb"
    return Look(BLOCKS if is_utf8(env) else ASCII, has_colour)


def is_utf8(env: Mapping[str, str]) -> bool:
    """Return whether the locale the user set (not the one Python coerced it to) is UTF-8.

    With no locale set at all the terminal is taken to be a modern one.
    """
    env = {**env, **_before_coercion()} if env is os.environ else env
    named = env.get("LC_ALL") or env.get("LC_CTYPE") or env.get("LANG") or ""
    if not named:
        return True
    return "utf8" in named.lower().replace("-", "")


def _before_coercion() -> dict[str, str]:
    """Return LC_CTYPE as it was before Python turned the C locale into C.UTF-8 (PEP 538)."""
    if os.environ.get("LC_CTYPE") != "C.UTF-8" or os.environ.get("LC_ALL"):
        return {}
    try:
        with open("/proc/self/environ", "rb") as file:
            given = dict(item.partition(b"=")[::2] for item in file.read().split(b"\0"))
    except OSError:
        return {}
    return {"LC_CTYPE": given.get(b"LC_CTYPE", b"").decode("ascii", "replace")}


def background_of_terminal(wanted: str = "auto", environment: Mapping[str, str] | None = None) -> str:
    """Return "light" or "dark": the setting, else what COLORFGBG tells, else dark."""
    if wanted in SHADES:
        return wanted
    env = os.environ if environment is None else environment
    last = env.get("COLORFGBG", "").rpartition(";")[2]
    return "light" if last in ("7", "15") else "dark"
