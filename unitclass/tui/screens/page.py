"""Screens of one part: a line at the top, a body, the foot. Most of the others are such."""

from __future__ import annotations

from textual import events
from textual.app import ComposeResult

from unitclass.tui.desk import Desk
from unitclass.tui.keys import KeyMap
from unitclass.tui.messages import Picked, Stepped
from unitclass.tui.renderables.sheet import Sheet
from unitclass.tui.screens.base import BaseScreen
from unitclass.tui.theme import Theme
from unitclass.tui.widgets.canvas import Canvas
from unitclass.tui.widgets.head import Head


class Body(Canvas):
    """A part that the screen draws; clicks and the wheel go to the screen."""

    def __init__(self, theme: Theme, screen: PageScreen) -> None:
        super().__init__(theme)
        self._owner = screen

    def draw(self, width: int, height: int) -> Sheet:
        """Let the screen draw."""
        return self._owner.draw_body(width, height)

    def on_click(self, event: events.Click) -> None:
        """Tell which row was clicked."""
        event.stop()
        self.post_message(Picked(event.y))


class PageScreen(BaseScreen):
    """A screen whose body is drawn as a whole."""

    def __init__(self, desk: Desk, theme: Theme, keys: KeyMap) -> None:
        super().__init__(theme, keys)
        self.desk = desk
        self.head = Head(theme)
        self.body = Body(theme, self)

    def compose(self) -> ComposeResult:
        """Lay the parts out, with their content in them."""
        self.repaint()
        yield self.head
        yield self.foot
        yield self.body

    def on_mount(self) -> None:
        """Say what is to be said at the beginning; subclasses may."""

    def title_words(self) -> tuple[str, str, str]:
        """Return title, file, and a few words for the right; subclasses say which."""
        return self.KEYS, "", ""

    def draw_body(self, width: int, height: int) -> Sheet:
        """Return the body at this size; subclasses say what."""
        return Sheet(width, height, self.inks.look)

    def list_area(self) -> Canvas:
        """Return where lists to choose from are shown."""
        return self.body

    def repaint(self) -> None:
        """Show the present state."""
        self.head.show(*self.title_words())
        self.body.redraw()

    def step(self, steps: int) -> None:
        """Move what is chosen, or what is in sight; subclasses say how."""

    def page_length(self) -> int:
        """Return how far a page reaches."""
        return max(1, self.body.size.height - 3)

    def action_next(self) -> None:
        """Go one on."""
        self.step(1)

    def action_previous(self) -> None:
        """Go one back."""
        self.step(-1)

    def action_forward(self) -> None:
        """Go a page on."""
        self.step(self.page_length())

    def action_back(self) -> None:
        """Go a page back."""
        self.step(-self.page_length())

    def action_first(self) -> None:
        """Go to the beginning."""
        self.step(-(10**9))

    def action_last(self) -> None:
        """Go to the end."""
        self.step(10**9)

    def action_close(self) -> None:
        """Go back to the unit."""
        self.back_with("")

    def back_with(self, message: str) -> None:
        """Go back to the screen before, which says `message`."""
        self.dismiss(message)

    def action_help(self) -> None:
        """Show all keys."""
        from unitclass.tui.screens.help import HelpScreen

        self.app.push_screen(HelpScreen(self.desk, self.inks, self.keys, about=self.KEYS))

    def on_stepped(self, message: Stepped) -> None:
        """Step with the wheel."""
        message.stop()
        self.step(message.steps)
