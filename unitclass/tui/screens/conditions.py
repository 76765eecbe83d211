"""One unit, its conditions side by side on the same axis."""

from __future__ import annotations

from unitclass.review.entry import QueueEntry
from unitclass.tui.desk import Desk
from unitclass.tui.keys import CONDITIONS, KeyMap
from unitclass.tui.renderables.bars import in_words
from unitclass.tui.renderables.condition_rows import ConditionView, condition_rows
from unitclass.tui.renderables.sheet import Sheet
from unitclass.tui.screens.page import PageScreen
from unitclass.tui.theme import Theme
from unitclass.tui.wording import family_shown, standing_words


class ConditionsScreen(PageScreen):
    """The current unit in all conditions of its file."""

    KEYS = CONDITIONS

    def __init__(self, desk: Desk, theme: Theme, keys: KeyMap) -> None:
        super().__init__(desk, theme, keys)
        current = desk.session.current
        self._entries = desk.session.conditions_of(current) if current is not None else ()
        self._views = [condition_view(desk, entry) for entry in self._entries]
        self._here = next((i for i, e in enumerate(self._entries) if current and e.key == current.key), 0)

    def title_words(self) -> tuple[str, str, str]:
        """Return which unit."""
        name = self._entries[0].unit if self._entries else ""
        path = self._entries[0].path if self._entries else ""
        return f"unit {name} in its conditions", path, f"{len(self._views)} conditions"

    def draw_body(self, width: int, height: int) -> Sheet:
        """Draw them beside each other."""
        return condition_rows(self._views, self._here, width, height, look=self.inks.look)

    def step(self, steps: int) -> None:
        """Choose another condition."""
        self._here = max(0, min(self._here + steps, len(self._views) - 1))
        self.repaint_soon()

    def action_goto(self) -> None:
        """Go to the unit in the chosen condition."""
        if self._entries:
            self.desk.session.go_to(self._entries[self._here].key)
        self.back_with("")


def condition_view(desk: Desk, entry: QueueEntry) -> ConditionView:
    """Return what is shown of a unit in one condition."""
    unit, facts = desk.session.unit_result(entry), desk.condition(entry)
    suggested = "blind" if entry.is_hidden else f"{entry.suggested_type} {in_words(entry.probability).strip()}"
    lines = (suggested, standing_words(entry) or "no label yet", f"{facts.regime}; {unit.n_spikes} spikes")
    return ConditionView(entry.condition or "whole recording", lines, unit, facts.nerves, facts.ti_s, facts.te_s,
                         family_shown(entry, unit))
