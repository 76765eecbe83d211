"""One unit in full: verdict without a limit of room, features, evidence, who said what."""

from __future__ import annotations

from unitclass.review.unit_facts import facts
from unitclass.tui.desk import Desk
from unitclass.tui.keys import ACCOUNT, KeyMap
from unitclass.tui.renderables.listing import scrolled
from unitclass.tui.renderables.sheet import Sheet
from unitclass.tui.renderables.verdict import Lines, verdict_lines
from unitclass.tui.renderables.words import shortened
from unitclass.tui.screens.page import PageScreen
from unitclass.tui.theme import Theme


class AccountScreen(PageScreen):
    """The whole account of the current unit."""

    KEYS = ACCOUNT

    def __init__(self, desk: Desk, theme: Theme, keys: KeyMap) -> None:
        super().__init__(desk, theme, keys)
        self._first = 0

    def title_words(self) -> tuple[str, str, str]:
        """Return which unit."""
        title, where, _ = self.desk.head()
        return title, where, ""

    def draw_body(self, width: int, height: int) -> Sheet:
        """Draw the account, in two columns where there is room."""
        lines = self._lines(min(width, 100))
        self._first = max(0, min(self._first, len(lines) - height))
        return scrolled(lines, self._first, width, height, look=self.inks.look)

    def _lines(self, width: int) -> Lines:
        entry = self.desk.session.current
        if entry is None:
            return []
        unit, look = self.desk.session.unit_result(entry), self.inks.look
        lines = verdict_lines(self.desk.verdict(entry, unit), width, look)
        if unit.suggestion.evidence:
            lines += [("", ""), ("evidence for the first type over the second, in log units", "title")]
            lines += [(f"  {name:<28} {value:+.1f}", "") for name, value in unit.suggestion.evidence.items()]
        lines += [("", ""), ("measured", "title")]
        lines += [(shortened(f"  {name:<42} {value}", width, look), "") for name, value in facts(unit)]
        opinions = self.desk.session.opinions(entry)
        if opinions:
            lines += [("", ""), ("opinions", "title")]
            lines += [(f"  {d.reviewer}: {d.type} ({d.how}, {d.decided_at[:16]})", "") for d in opinions]
        return lines

    def step(self, steps: int) -> None:
        """Scroll."""
        self._first = max(0, self._first + min(steps, 10**6))
        self.repaint_soon()
