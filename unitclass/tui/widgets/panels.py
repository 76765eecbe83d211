"""The three parts of the review screen's middle: queue, unit page, verdict."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass

from textual import events
from textual.app import ComposeResult
from textual.widget import Widget

from unitclass.records import NerveProfile, UnitResult
from unitclass.review.entry import QueueEntry
from unitclass.tui.messages import Picked
from unitclass.tui.renderables.queue_rows import page_start, queue_column
from unitclass.tui.renderables.sheet import Sheet
from unitclass.tui.renderables.unit_picture import gutter_of, unit_picture
from unitclass.tui.renderables.verdict import Verdict, verdict_in_brief, verdict_rows
from unitclass.tui.renderables.words import wrapped
from unitclass.tui.theme import Theme
from unitclass.tui.widgets.canvas import Canvas


@dataclass(frozen=True)
class UnitView:
    """What the middle of the review screen shows of one unit."""

    unit: UnitResult
    nerves: tuple[NerveProfile, ...]
    ti_s: float
    te_s: float
    family: str
    verdict: Verdict


class QueueColumn(Canvas):
    """The page of the queue around the unit."""

    entries: Sequence[QueueEntry] = ()
    here = 0
    with_condition = False

    def show(self, entries: Sequence[QueueEntry], here: int, with_condition: bool) -> None:
        """Show another place of the queue."""
        self.entries, self.here, self.with_condition = entries, here, with_condition
        self.redraw()

    def draw(self, width: int, height: int) -> Sheet:
        """Draw the page."""
        sheet = Sheet(width, height, self.inks.look)
        column = queue_column(self.entries, self.here, width - 2, height,
                              with_condition=self.with_condition, look=self.inks.look)
        sheet.paste(column, 0, 0)
        for y in range(height):
            sheet.put(width - 2, y, self.inks.look.glyphs.upright, "axis")
        return sheet

    def on_click(self, event: events.Click) -> None:
        """Tell which unit was clicked."""
        event.stop()
        place = page_start(self.here, self.size.height - 1) + event.y
        if event.y < self.size.height - 1 and place < len(self.entries):
            self.post_message(Picked(place))


class UnitPage(Widget):
    """The unit's picture on the cycle axis.

    The labels at the left and the picture are two parts of the screen, because a part's row is
    repainted from its left end: labels hardly ever change, the picture does.
    """

    DEFAULT_CSS = """
    UnitPage { layout: horizontal; width: 1fr; height: 1fr; }
    """

    def __init__(self, theme: Theme) -> None:
        super().__init__()
        self.inks = theme
        self.view: UnitView | None = None
        self.words = ""
        self.labels = Part(theme, self)
        self.picture = Part(theme, self, self.labels)
        self._drawn_view: UnitView | None = None
        self._drawn: tuple[object, ...] = ()
        self._sheet = Sheet(0, 0, theme.look)

    def compose(self) -> ComposeResult:
        """Lay both parts out."""
        yield self.labels
        yield self.picture

    def give_width(self, width: int) -> None:
        """Divide the room there will be between labels and picture."""
        self.labels.styles.width = gutter_of(width - 1)

    def show(self, view: UnitView | None, words: str = "") -> None:
        """Show a unit, or words when there is none."""
        self.view, self.words = view, words
        self.labels.redraw()
        self.picture.redraw()

    def cover(self, draw: Callable[[int, int], Sheet] | None) -> None:
        """Show something else over the picture."""
        self.picture.cover(draw)

    def sheet(self, height: int) -> Sheet:
        """Return the whole, drawn once for both parts."""
        width = self.labels.size.width + self.picture.size.width
        wanted = (self.words, width, height)
        if self.view is not self._drawn_view or wanted != self._drawn:
            self._drawn_view, self._drawn = self.view, wanted
            self._sheet = self._draw(width, height)
        return self._sheet

    def _draw(self, width: int, height: int) -> Sheet:
        look = self.inks.look
        sheet = Sheet(width, height, look)
        if self.view is None:
            lines = [line for words in self.words.splitlines() for line in wrapped(words, width - 2, look)]
            for y, line in enumerate(lines):
                sheet.put(1, y, line)
            return sheet
        v = self.view
        picture = unit_picture(v.unit, v.nerves, v.ti_s, v.te_s, width - 1, height, family=v.family,
                               look=look)
        sheet.paste(picture, 0, 0)
        return sheet


class Part(Canvas):
    """Columns of the unit page, beginning where part `after` ends."""

    def __init__(self, theme: Theme, page: UnitPage, after: Canvas | None = None) -> None:
        super().__init__(theme)
        self._page, self._after = page, after

    def draw(self, width: int, height: int) -> Sheet:
        """Take these columns out of the whole."""
        return self._page.sheet(height).columns(self._after.size.width if self._after else 0, width)


class VerdictPanel(Canvas):
    """The verdict beside the picture, or in two lines when it is that low."""

    verdict: Verdict | None = None
    more = ""

    def show(self, verdict: Verdict | None, more: str) -> None:
        """Show a verdict; `more` tells the key of the full account."""
        self.verdict, self.more = verdict, more
        self.redraw()

    def draw(self, width: int, height: int) -> Sheet:
        """Draw it for the room there is."""
        look = self.inks.look
        if self.verdict is None:
            return Sheet(width, height, look)
        if height > 3:
            return verdict_rows(self.verdict, width, height, more=self.more, look=look)
        sheet = Sheet(width, height, look)
        for y, (text, ink) in enumerate(verdict_in_brief(self.verdict, width, look=look)):
            sheet.put(0, y, text, ink)
        return sheet
