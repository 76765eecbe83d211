"""All keys, made from their one declaration, and what the marks in a picture mean."""

from __future__ import annotations

from unitclass.tui.desk import Desk
from unitclass.tui.keys import HELP, REVIEW, KeyMap
from unitclass.tui.renderables.listing import scrolled
from unitclass.tui.renderables.queue_rows import MARKS
from unitclass.tui.renderables.sheet import Sheet
from unitclass.tui.renderables.words import wrapped
from unitclass.tui.screens.page import PageScreen
from unitclass.tui.theme import Theme

MARK_WORDS = {"later": "left for later", "disagreement": "reviewers differ",
              "asks again": "the spike train changed since it was labelled",
              "stale": "the label is older than a change of the cycles", "labelled": "labelled by someone else"}


class HelpScreen(PageScreen):
    """Help for the screen it was called from."""

    KEYS = HELP

    def __init__(self, desk: Desk, theme: Theme, keys: KeyMap, *, about: str = REVIEW) -> None:
        super().__init__(desk, theme, keys)
        self._about = about
        self._first = 0

    def title_words(self) -> tuple[str, str, str]:
        """Return the title."""
        return "help", f"keys of: {self._about}", ""

    def draw_body(self, width: int, height: int) -> Sheet:
        """Draw the keys and the marks."""
        look = self.inks.look
        lines = [line for key, words in self.keys.help(self._about) for line in self._line(key, words, width)]
        if self._about == REVIEW:
            lines += [("", "")] + [line for mark, words in self._marks() for line in self._line(mark, words, width)]
        self._first = max(0, min(self._first, len(lines) - height))
        return scrolled(lines, self._first, width, height, look=look)

    def _line(self, key: str, words: str, width: int) -> list[tuple[str, str]]:
        text = f"{key:>7}  {words}"
        return [(line, "") for line in wrapped_keeping(text, width, self)]

    def _marks(self) -> list[tuple[str, str]]:
        g = self.inks.look.glyphs
        pictures = [
            (g.sure, "bar: spikes/s, solid up to the lower 95 % limit"), (g.doubtful, "bar above that limit"),
            (g.whisker, "up to the upper 95 % limit"), (g.fit[1], "the suggested family, as fitted"),
            (g.done, "labelled by you"), ("*", "the suggestion has changed")]
        return pictures + [(MARKS[state], words) for state, words in MARK_WORDS.items()]

    def step(self, steps: int) -> None:
        """Scroll."""
        self._first = max(0, self._first + min(steps, 10**6))
        self.repaint_soon()


def wrapped_keeping(text: str, width: int, screen: HelpScreen) -> list[str]:
    """Return a help line, continued under its words when it is too long."""
    lines = wrapped(text[9:], max(10, width - 9), screen.inks.look)
    return [text[:9] + lines[0], *(" " * 9 + line for line in lines[1:])] if lines else [text]
