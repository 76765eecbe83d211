"""The two lines at the foot of every screen."""

from __future__ import annotations

from collections.abc import Sequence

from unitclass.tui.renderables.footer import entry_row, footer_rows
from unitclass.tui.renderables.sheet import Sheet
from unitclass.tui.theme import Theme
from unitclass.tui.widgets.canvas import Canvas
from unitclass.tui.widgets.line_entry import LineEntry

Pairs = Sequence[tuple[str, str]]


class Foot(Canvas):
    """Message and keys; or, while something is typed, the entry and its keys."""

    DEFAULT_CSS = "Foot { dock: bottom; height: 2; }"

    def __init__(self, theme: Theme, keys: Pairs) -> None:
        super().__init__(theme)
        self._keys = tuple(keys)
        self._message, self._ink = "", ""
        self._typed: tuple[str, LineEntry, Pairs] | None = None

    def say(self, message: str, ink: str = "") -> None:
        """Show a message until the next one."""
        if (message, ink) != (self._message, self._ink):
            self._message, self._ink = message, ink
            self.redraw()

    def type_into(self, lead: str, entry: LineEntry, keys: Pairs) -> None:
        """Show an entry instead of the message."""
        self._typed = lead, entry, keys
        self.redraw()

    def end_typing(self) -> None:
        """Show message and keys again."""
        self._typed = None
        self.redraw()

    def draw(self, width: int, height: int) -> Sheet:
        """Draw both lines."""
        look = self.inks.look
        if self._typed is None:
            return footer_rows(self._message, self._keys, width, height, ink=self._ink, look=look)
        lead, entry, keys = self._typed
        sheet = footer_rows("", keys, width, height, look=look)
        sheet.paste(entry_row(lead, entry.text, entry.at, width, look=look), 0, 0)
        return sheet
