"""The review as a program in the terminal."""

from __future__ import annotations

import os
from typing import ClassVar

os.environ.setdefault("TEXTUAL_FPS", "120")  # read once by the toolkit: a repaint waits 8 ms, not 16

from textual.app import App
from textual.screen import Screen

from unitclass.tui.desk import Desk
from unitclass.tui.keys import KeyMap
from unitclass.tui.screens.review import ReviewScreen
from unitclass.tui.theme import Theme, background_of_terminal, look_of_terminal


class ReviewApp(App[int]):
    """One review session on the screen."""

    ENABLE_COMMAND_PALETTE = False
    BINDINGS: ClassVar = []
    CSS = ""

    def __init__(self, desk: Desk, keys: KeyMap) -> None:
        super().__init__(ansi_color=True)
        self.animation_level = "none"
        self.desk, self.keys = desk, keys
        self.inks = Theme(look_of_terminal(), background_of_terminal())

    def get_default_screen(self) -> Screen[object]:
        """Return the review screen."""
        return ReviewScreen(self.desk, self.inks, self.keys)

    def action_quit(self) -> None:
        self.exit(0)
