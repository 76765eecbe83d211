"""A widget that shows a sheet and repaints only the cells that have changed."""

from __future__ import annotations

from collections.abc import Callable, Iterator

from rich.segment import Segment
from textual import events
from textual.geometry import Region
from textual.strip import Strip
from textual.widget import Widget

from unitclass.tui.messages import Stepped
from unitclass.tui.renderables.sheet import Sheet
from unitclass.tui.theme import Theme


class Canvas(Widget):
    """Base of every part of a screen: subclasses draw a sheet, this one puts it on the terminal."""

    DEFAULT_CSS = "Canvas { width: 1fr; height: 1fr; }"
    can_focus = False

    def __init__(self, theme: Theme, *, id: str | None = None) -> None:
        super().__init__(id=id)
        self.inks = theme
        self.sheet = Sheet(0, 0, theme.look)
        self._shown_instead: Callable[[int, int], Sheet] | None = None

    def draw(self, width: int, height: int) -> Sheet:
        """Return what to show at this size; subclasses say what."""
        return Sheet(width, height, self.inks.look)

    def cover(self, draw: Callable[[int, int], Sheet] | None) -> None:
        """Show something else in this place until it is uncovered with None."""
        self._shown_instead = draw
        self.redraw()

    def redraw(self) -> None:
        """Draw again and repaint the parts that differ from what is on the screen."""
        width, height = self.size
        if not width or not height:
            return
        old, self.sheet = self.sheet, (self._shown_instead or self.draw)(width, height)
        if (old.width, old.height) != (width, height):
            self.refresh()
            return
        regions = list(changed_regions(old, self.sheet))
        if regions:
            self.refresh(*regions)

    def on_resize(self, event: events.Resize) -> None:
        """Draw for the new size."""
        event.stop()
        self.redraw()

    def render_line(self, y: int) -> Strip:
        """Return row `y` as the toolkit wants it; the first paint draws the sheet."""
        if (self.sheet.width, self.sheet.height) != tuple(self.size):
            self.sheet = (self._shown_instead or self.draw)(*self.size)
        if y >= self.sheet.height:
            return Strip.blank(self.size.width)
        style = self.inks.style
        segments = [Segment(text, style(ink)) for text, ink in self.sheet.runs(y) if text]
        return Strip(segments, self.sheet.width)

    def on_mouse_scroll_down(self, event: events.MouseScrollDown) -> None:
        """Ask for the next unit."""
        event.stop()
        self.post_message(Stepped(1))

    def on_mouse_scroll_up(self, event: events.MouseScrollUp) -> None:
        """Ask for the unit before."""
        event.stop()
        self.post_message(Stepped(-1))

    @property
    def allow_select(self) -> bool:
        """Return False: pictures are not text to select."""
        return False


def changed_regions(old: Sheet, new: Sheet) -> Iterator[Region]:
    """Yield, row by row, the stretch of cells that differ between two sheets of one size."""
    for y in range(new.height):
        if old.cells[y] == new.cells[y] and old.inks[y] == new.inks[y]:
            continue
        before, after = (list(zip(s.cells[y], s.inks[y], strict=True)) for s in (old, new))
        differs = [x for x in range(new.width) if before[x] != after[x]]
        start, stop = differs[0], differs[-1] + 1
        if stop < new.width and "" in (before[stop][0], after[stop][0]):
            stop += 1  # the second half of a wide character
        yield Region(start, y, stop - start, 1)
