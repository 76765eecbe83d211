"""The three parts of the review screen's middle: queue, unit page, verdict."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from textual import events

from unitclass.records import NerveProfile, UnitResult
from unitclass.review.entry import QueueEntry
from unitclass.tui.messages import Picked
from unitclass.tui.renderables.queue_rows import page_start, queue_column
from unitclass.tui.renderables.sheet import Sheet
from unitclass.tui.renderables.unit_picture import unit_picture
from unitclass.tui.renderables.verdict import Verdict, verdict_in_brief, verdict_rows
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


class UnitPage(Canvas):
    """The unit's picture on the cycle axis."""

    view: UnitView | None = None
    words = ""

    def show(self, view: UnitView | None, words: str = "") -> None:
        """Show a unit, or words when there is none."""
        self.view, self.words = view, words
        self.redraw()

    def draw(self, width: int, height: int) -> Sheet:
        """Draw the picture, one column left free at the right."""
        look = self.inks.look
        sheet = Sheet(width, height, look)
        if self.view is None:
            for y, line in enumerate(self.words.splitlines()):
                sheet.put(1, 1 + y, line)
            return sheet
        v = self.view
        picture = unit_picture(v.unit, v.nerves, v.ti_s, v.te_s, width - 1, height, family=v.family,
                               look=look)
        sheet.paste(picture, 0, 0)
        return sheet


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
