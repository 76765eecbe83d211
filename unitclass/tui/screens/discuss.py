"""Units on which reviewers differ, who says what, and a way to let one label stand."""

from __future__ import annotations

from unitclass.errors import UnitclassError
from unitclass.records import Decision
from unitclass.review.entry import EntryKey
from unitclass.tui.desk import Desk
from unitclass.tui.keys import DISCUSS, KeyMap
from unitclass.tui.renderables.listing import table_rows
from unitclass.tui.renderables.sheet import Sheet
from unitclass.tui.screens.page import PageScreen
from unitclass.tui.theme import Theme


class DiscussScreen(PageScreen):
    """The list of units to discuss."""

    KEYS = DISCUSS

    def __init__(self, desk: Desk, theme: Theme, keys: KeyMap) -> None:
        super().__init__(desk, theme, keys)
        self._here = 0
        self._opinions: dict[EntryKey, tuple[Decision, ...]] = {}
        self._load()

    def _load(self) -> None:
        self.desk.session.refresh()
        self._entries = self.desk.session.disagreements()
        self._here = max(0, min(self._here, len(self._entries) - 1))
        self._opinions = {entry.key: self.desk.session.opinions(entry) for entry in self._entries}

    def title_words(self) -> tuple[str, str, str]:
        """Return how many units there are to discuss."""
        return f"{len(self._entries)} units on which reviewers differ", "", ""

    def on_mount(self) -> None:
        """Say so when there are none."""
        super().on_mount()
        if not self._entries:
            self.say("No two reviewers differ on a unit.")

    def draw_body(self, width: int, height: int) -> Sheet:
        """Draw the list."""
        rows = [(e.unit, *self._words(e.key), e.suggested_type, e.condition, e.file) for e in self._entries]
        head = ("unit", "1", "2", "more", "suggested", "condition", "file")
        return table_rows(head, rows, self._here, width, height, look=self.inks.look)

    def _words(self, key: EntryKey) -> tuple[str, str, str]:
        said = [f"{d.reviewer}: {d.type}" for d in self._opinions[key]]
        first, second, *more = [*said, "", ""]
        return first, second, ", ".join(filter(None, more))

    def step(self, steps: int) -> None:
        """Choose another unit."""
        self._here = max(0, min(self._here + steps, len(self._entries) - 1))
        self.repaint_soon()

    def action_goto(self) -> None:
        """Go to the chosen unit."""
        if self._entries:
            self.desk.session.go_to(self._entries[self._here].key)
        self.back_with("")

    def action_settle(self, number: int) -> None:
        """Let the label of the first or second opinion stand."""
        if self._entries:
            said = self._opinions[self._entries[self._here].key]
            if number <= len(said):
                self._settle(said[number - 1].type)

    def action_agree_on(self) -> None:
        """Settle on any type."""
        if self._entries:
            self.ask("settle on", self._settle, options=self.desk.type_options())

    def action_undo(self) -> None:
        """Take back the last decision."""
        self.say(self.desk.turn(True)[0])
        self._load()
        self.repaint_soon()

    def _settle(self, type_id: str) -> None:
        entry = self._entries[self._here]
        try:
            self.desk.session.settle(entry, type_id)
        except UnitclassError as error:
            self.say(str(error), "warn")
            return
        self.say(f"{entry.unit}: {type_id} stands; both opinions are kept")
        self._load()
        self.repaint_soon()
