"""The line at the top: which unit of which file, and how far the queue is; below it the neighbours."""

from __future__ import annotations

from collections.abc import Sequence

from unitclass.review.entry import QueueEntry
from unitclass.tui.renderables.queue_rows import queue_line
from unitclass.tui.renderables.sheet import Sheet, width_of
from unitclass.tui.renderables.words import shortened, shortened_middle
from unitclass.tui.widgets.canvas import Canvas


class Head(Canvas):
    """One line, or two with the queue in the second."""

    DEFAULT_CSS = "Head { dock: top; height: 1; }"

    def __init__(self, *args: object, **kwargs: object) -> None:
        super().__init__(*args, **kwargs)  # type: ignore[arg-type]
        self._title, self._where, self._right = "", "", ""
        self._entries: Sequence[QueueEntry] = ()
        self._here, self._with_condition = 0, False

    def show(self, title: str, where: str, right: str, entries: Sequence[QueueEntry] = (),
             here: int = 0, with_condition: bool = False) -> None:
        """Show a title, the file it is about, a few words at the right, and the queue's neighbours."""
        self._title, self._where, self._right = title, where, right
        self._entries, self._here, self._with_condition = entries, here, with_condition
        self.redraw()

    def draw(self, width: int, height: int) -> Sheet:
        """Draw the line or lines."""
        look = self.inks.look
        sheet = Sheet(width, height, look)
        right = shortened(self._right, max(0, width // 2), look)
        sheet.right(width, 0, right, "quiet")
        title = shortened(self._title, max(0, width - width_of(right) - 2), look)
        sheet.put(0, 0, title, "title")
        room = width - width_of(title) - width_of(right) - 4
        if room >= 8:
            sheet.put(width_of(title) + 2, 0, shortened_middle(self._where, room, look))
        if height > 1:
            sheet.paste(queue_line(self._entries, self._here, width,
                                   with_condition=self._with_condition, look=look), 0, 1)
        return sheet
