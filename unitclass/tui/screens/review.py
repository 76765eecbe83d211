"""The review screen: queue, one unit on the cycle axis, the verdict beside it."""

from __future__ import annotations

from collections.abc import Callable
from typing import ClassVar

from textual import events
from textual.app import ComposeResult

from unitclass.errors import UnitclassError
from unitclass.tui.desk import Desk
from unitclass.tui.keys import REVIEW, KeyMap
from unitclass.tui.messages import Picked
from unitclass.tui.screens.base import BaseScreen, bindings_of
from unitclass.tui.theme import Theme
from unitclass.tui.widgets.canvas import Canvas
from unitclass.tui.widgets.head import Head
from unitclass.tui.widgets.panels import QueueColumn, UnitPage, VerdictPanel

COLUMN_FROM = 100
BESIDE_FROM = 64
LEAST = (30, 9)


class ReviewScreen(BaseScreen):
    """Where nearly all the work is done."""

    KEYS = REVIEW
    BINDINGS: ClassVar = bindings_of(REVIEW)
    DEFAULT_CSS = """
    ReviewScreen QueueColumn { width: 20; display: none; }
    ReviewScreen VerdictPanel { width: 26; }
    ReviewScreen.-brief VerdictPanel { dock: bottom; width: 1fr; height: 2; margin-bottom: 2; }
    """

    def __init__(self, desk: Desk, theme: Theme, keys: KeyMap) -> None:
        super().__init__(theme, keys)
        self.desk = desk
        self.head = Head(theme)
        self.queue = QueueColumn(theme)
        self.page = UnitPage(theme)
        self.verdict = VerdictPanel(theme)

    def compose(self) -> ComposeResult:
        """Lay the parts out."""
        yield self.head
        yield self.foot
        yield self.queue
        yield self.page
        yield self.verdict

    def on_mount(self) -> None:
        """Show the first unit."""
        self._arrange(*self.app.size)
        self.repaint()

    def on_resize(self, event: events.Resize) -> None:
        """Give every part the room it needs at this size."""
        self._arrange(event.size.width, event.size.height)
        self.repaint_soon()

    def list_area(self) -> Canvas:
        """Return where lists are shown: the verdict's place, or the picture's on a narrow terminal."""
        return self.page if self.has_class("-brief") else self.verdict

    def repaint(self) -> None:
        """Show the unit the queue stands at."""
        desk = self.desk
        view = desk.view()
        entries, here = desk.entries, desk.here
        title, where, right = desk.head()
        has_column = self.queue.display
        self.head.show(title, where, right, () if has_column else entries, here)
        if has_column:
            self.queue.show(entries, here)
        if view is None or self._is_too_small():
            words = desk.why_empty() if view is None else "This terminal is too small: make it 40 x 12 or larger."
            self.page.show(None, words)
            self.verdict.show(None, "")
            return
        self.page.show(view)
        self.verdict.show(view.verdict, f"{self.keys.shown('account')}: all of it")

    def _is_too_small(self) -> bool:
        width, height = self.size
        return width < LEAST[0] or height < LEAST[1]

    def _arrange(self, width: int, height: int) -> None:
        has_column = width >= COLUMN_FROM and height >= 16
        is_brief = width < BESIDE_FROM
        self.queue.display = has_column
        self.queue.styles.width = min(28, 20 + max(0, width - COLUMN_FROM) // 12)
        self.head.styles.height = 1 if has_column or height < 16 else 2
        self.set_class(is_brief, "-brief")
        self.verdict.styles.width = "1fr" if is_brief else max(25, min(60, round(width * 0.3)))

    # --------------------------------------------------------------------------- moving

    def action_next(self) -> None:
        """Go to the next unit."""
        self._go(self.desk.here + 1)

    def action_previous(self) -> None:
        """Go to the unit before."""
        self._go(self.desk.here - 1)

    def action_forward(self) -> None:
        """Go a page on."""
        self._go(self.desk.here + self._page_length())

    def action_back(self) -> None:
        """Go a page back."""
        self._go(self.desk.here - self._page_length())

    def action_first(self) -> None:
        """Go to the first unit."""
        self._go(0)

    def action_last(self) -> None:
        """Go to the last unit."""
        self._go(len(self.desk.entries) - 1)

    def _page_length(self) -> int:
        return max(1, self.queue.size.height - 1) if self.queue.display else 10

    def _go(self, place: int) -> None:
        self.desk.go(place)
        self.say("")
        self.repaint_soon()

    def on_picked(self, message: Picked) -> None:
        """Go to the unit that was clicked."""
        message.stop()
        self._go(message.index)

    # ------------------------------------------------------------------------- deciding

    def _do(self, act: Callable[[], str]) -> None:
        """Do something that is written to the store, and say what came of it."""
        try:
            message, ink = act(), ""
        except UnitclassError as error:
            message, ink = str(error), "warn"
        self.say(message, ink)
        self.repaint_soon()

    def action_accept(self) -> None:
        """Accept the suggestion."""
        self._do(self.desk.accept)
