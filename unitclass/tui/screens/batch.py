"""Exactly what a batch acceptance would accept, with a way to leave single units out."""

from __future__ import annotations

from unitclass.errors import UnitclassError
from unitclass.review.entry import EntryKey, QueueEntry
from unitclass.tui.desk import Desk
from unitclass.tui.keys import BATCH, KeyMap
from unitclass.tui.messages import Picked
from unitclass.tui.renderables.bars import in_words
from unitclass.tui.renderables.listing import table_rows
from unitclass.tui.renderables.queue_rows import page_start
from unitclass.tui.renderables.sheet import Sheet
from unitclass.tui.screens.page import PageScreen
from unitclass.tui.theme import Theme


class BatchScreen(PageScreen):
    """The sure suggestions in view, before they are accepted together."""

    KEYS = BATCH

    def __init__(self, desk: Desk, theme: Theme, keys: KeyMap) -> None:
        super().__init__(desk, theme, keys)
        self._entries = desk.session.batch_candidates()
        self._left_out: set[EntryKey] = set()
        self._here = 0

    @property
    def chosen(self) -> list[QueueEntry]:
        """Return what would be accepted."""
        return [entry for entry in self._entries if entry.key not in self._left_out]

    def title_words(self) -> tuple[str, str, str]:
        """Return how many would be accepted."""
        sure = self.desk.session.sure_probability
        return (f"accept {len(self.chosen)} suggestions at once", "",
                f"probability {sure:g} or more, nothing against them")

    def on_mount(self) -> None:
        """Say what is left out when nothing is sure."""
        super().on_mount()
        undo = self.keys.shown("undo")
        self.say("None of the units in view is sure and without a flag." if not self._entries else
                 f"{self.keys.shown('confirm')} accepts all listed without looking at them; {undo} takes it back.")

    def draw_body(self, width: int, height: int) -> Sheet:
        """Draw the list."""
        rows = [self._row(entry) for entry in self._entries]
        inks = ["quiet" if entry.key in self._left_out else "" for entry in self._entries]
        head = ("unit", "type", "p", "condition", "file", "")
        return table_rows(head, rows, self._here, width, height, inks=inks, look=self.inks.look)

    def _row(self, entry: QueueEntry) -> tuple[str, ...]:
        out = "left out" if entry.key in self._left_out else ""
        return entry.unit, entry.suggested_type, in_words(entry.probability), entry.condition, entry.file, out

    def step(self, steps: int) -> None:
        """Choose another row."""
        self._here = max(0, min(self._here + steps, len(self._entries) - 1))
        self.repaint_soon()

    def action_leave_out(self) -> None:
        """Leave the chosen unit out of the batch, or take it in again."""
        if self._entries:
            self._left_out ^= {self._entries[self._here].key}
            self.step(1)

    def action_confirm(self) -> None:
        """Accept what is listed."""
        chosen = self.chosen
        if not chosen:
            self.back_with("")
            return
        try:
            accepted = self.desk.session.accept_batch(chosen)
        except UnitclassError as error:
            self.say(str(error), "warn")
            return
        self.desk.session.next_open()
        self.back_with(f"{len(accepted)} accepted without looking; {self.keys.shown('undo')} takes all of it back")

    def action_undo(self) -> None:
        """Take back the last decision."""
        self.say(self.desk.turn(True)[0])
        self._entries = self.desk.session.batch_candidates()
        self.repaint_soon()

    def on_picked(self, message: Picked) -> None:
        """Choose the row that was clicked."""
        message.stop()
        place = page_start(self._here, max(1, self.body.size.height - 2)) + message.index - 1
        if message.index > 0 and place < len(self._entries):
            self.step(place - self._here)
