"""The population: every unit in view as a heat-map row, grouped by type, in order of phase."""

from __future__ import annotations

from unitclass.review.entry import QueueEntry
from unitclass.review.unit_facts import by_phase, grouped
from unitclass.tui.desk import Desk
from unitclass.tui.keys import POPULATION, KeyMap
from unitclass.tui.messages import Picked
from unitclass.tui.renderables.population_rows import HeatEntry, population_lines, population_rows
from unitclass.tui.renderables.queue_rows import page_start, type_of
from unitclass.tui.renderables.sheet import Sheet
from unitclass.tui.screens.page import PageScreen
from unitclass.tui.theme import Theme

HIDDEN = "not shown yet (blind)"


class PopulationScreen(PageScreen):
    """All units of the queue at a glance."""

    KEYS = POPULATION

    def __init__(self, desk: Desk, theme: Theme, keys: KeyMap) -> None:
        super().__init__(desk, theme, keys)
        self._load(desk.session.current)

    def _load(self, here: QueueEntry | None) -> None:
        """Take the units in view as they are now and choose the one that was chosen."""
        self._groups = population_of(self.desk)
        self._units = [unit for _, members in self._groups for unit in members]
        keys_in_order = [unit.entry.key for unit in self._units]
        self._here = keys_in_order.index(here.key) if here is not None and here.key in keys_in_order else 0

    def results_changed(self, path: str) -> None:
        """Show what is new after work in the background."""
        self._load(self._units[self._here].entry if self._units else self.desk.session.current)
        self.repaint_soon()

    def title_words(self) -> tuple[str, str, str]:
        """Return the title and how many units there are."""
        return "population", "rows: units; each to its own greatest rate", f"{len(self._units)} units"

    def draw_body(self, width: int, height: int) -> Sheet:
        """Draw the page around the chosen unit."""
        here = self._units[self._here].entry if self._units else self.desk.session.current
        facts = self.desk.condition(here) if here is not None else None
        ti_s, te_s = (facts.ti_s, facts.te_s) if facts is not None else (1.0, 1.0)
        return population_rows(self._groups, self._here, ti_s, te_s, width, height, look=self.inks.look)

    def step(self, steps: int) -> None:
        """Choose another unit."""
        self._here = max(0, min(self._here + steps, len(self._units) - 1))
        self.repaint_soon()

    def action_goto(self) -> None:
        """Go to the chosen unit."""
        if self._units:
            self.desk.session.go_to(self._units[self._here].entry.key)
        self.back_with("")

    def action_find(self) -> None:
        """Choose the next unit whose name holds what is typed."""
        self.ask("find unit", lambda text: None, live=self._find)

    def _find(self, text: str) -> None:
        names = [unit.entry.unit.casefold() for unit in self._units]
        found = [i for i, name in enumerate(names) if name == text.casefold()]
        found += [i for i, name in enumerate(names) if text.casefold() in name]
        if found and text:
            self._here = found[0]
            self.repaint_soon()

    def on_picked(self, message: Picked) -> None:
        """Choose the unit that was clicked."""
        message.stop()
        lines = population_lines([(name, len(members)) for name, members in self._groups])
        if not lines:
            return
        place = page_start(lines.index(self._here), max(1, self.body.size.height - 4)) + message.index
        if place < len(lines) and isinstance(line := lines[place], int):
            self.step(line - self._here)


def population_of(desk: Desk) -> list[tuple[str, list[HeatEntry]]]:
    """Return the units in view by type, each type's in the order of the phase of their peaks."""
    entries = desk.entries
    rates = desk.session.profiles(entries)
    groups = grouped([type_of(entry) or HIDDEN for entry in entries], desk.type_ids())
    result = []
    for name, places in groups.items():
        order = [places[i] for i in by_phase(rates[places])]
        result.append((name, [HeatEntry(entries[i], rates[i]) for i in order]))
    return result
