"""The kinds of unit: each family's words, what its profiles look like, and who belongs."""

from __future__ import annotations

from unitclass.review.entry import QueueEntry
from unitclass.review.unit_facts import family_band
from unitclass.tui.desk import Desk
from unitclass.tui.keys import TYPES, KeyMap
from unitclass.tui.messages import Picked
from unitclass.tui.renderables.family_picture import Band, family_picture
from unitclass.tui.renderables.queue_rows import type_of
from unitclass.tui.renderables.sheet import Sheet
from unitclass.tui.renderables.words import shortened, wrapped
from unitclass.tui.screens.page import PageScreen
from unitclass.tui.theme import Theme

LIST_WIDTH = 22
N_DRAWS, N_BINS = 128, 80


class TypesScreen(PageScreen):
    """The families behind the suggestions."""

    KEYS = TYPES

    def __init__(self, desk: Desk, theme: Theme, keys: KeyMap) -> None:
        super().__init__(desk, theme, keys)
        self._members: dict[str, list[QueueEntry]] = {}
        for entry in desk.entries:
            self._members.setdefault(type_of(entry), []).append(entry)
        self._names = desk.type_ids()
        current = desk.session.current
        name = type_of(current) if current is not None else ""
        self._here = self._names.index(name) if name in self._names else 0

    def title_words(self) -> tuple[str, str, str]:
        """Return which library."""
        library = self.desk.library
        return "kinds of unit", library.name if library is not None else "", f"{len(self._names)} kinds"

    def draw_body(self, width: int, height: int) -> Sheet:
        """Draw the list of types and, beside it, the chosen family."""
        look = self.inks.look
        sheet = Sheet(width, height, look)
        room = LIST_WIDTH if width >= 60 else 0
        for y, name in enumerate(self._names[:height] if room else ()):
            is_here = y == self._here
            sheet.put(0, y, look.glyphs.here if is_here else " ", "strong")
            sheet.put(2, y, shortened(name, room - 8, look), "strong" if is_here else "")
            sheet.right(room - 2, y, str(len(self._members.get(name, ()))), "quiet")
        sheet.paste(self._family_sheet(self._names[self._here], width - room, height), room, 0)
        return sheet

    def _family_sheet(self, name: str, width: int, height: int) -> Sheet:
        look = self.inks.look
        sheet = Sheet(width, height, look)
        lines = self._lines(name, width)
        n_words = min(len(lines), max(2, height - 12))
        for y, (text, ink) in enumerate(lines[:n_words]):
            sheet.put(0, y, text, ink)
        band = self._band(name)
        current = self.desk.session.current
        if band is not None and current is not None and height - n_words >= 6:
            facts = self.desk.condition(current)
            rows = min(24, height - n_words - 1)
            picture = family_picture(band, facts.ti_s, facts.te_s, width, rows, look=look)
            sheet.paste(picture, 0, n_words + 1)
        return sheet

    def _lines(self, name: str, width: int) -> list[tuple[str, str]]:
        option = next(option for option in self.desk.type_options() if option.value == name)
        look = self.inks.look
        lines = [(name + (f"  (also {option.also})" if option.also else ""), "title")]
        lines += [(text, "") for text in wrapped(option.detail, width, look)]
        library = self.desk.library
        family = next((f for f in library.families if f.id == name), None) if library is not None else None
        if family is not None:
            lines += [(text, "quiet") for source in family.sources for text in wrapped(source, width, look)]
        members = self._members.get(name, [])
        who = ", ".join(entry.unit for entry in members[:30]) + (" ..." if len(members) > 30 else "")
        lines += [(text, "") for text in wrapped(f"{len(members)} here: {who}" if members else "none here", width,
                                                 look)]
        return [(shortened(text, width, look), ink) for text, ink in lines]

    def _band(self, name: str) -> Band | None:
        library, current = self.desk.library, self.desk.session.current
        if library is None or current is None or name not in {f.id for f in library.families}:
            return None
        from unitclass.classify.draws import USUAL, Timing, draw_profiles

        facts = self.desk.condition(current)
        known = facts.ti_s == facts.ti_s and facts.te_s == facts.te_s
        timing = Timing(facts.ti_s, facts.te_s) if known else USUAL
        return family_band(draw_profiles(library.family(name), timing, n_bins=N_BINS, n_draws=N_DRAWS))

    def step(self, steps: int) -> None:
        """Choose another type."""
        self._here = max(0, min(self._here + steps, len(self._names) - 1))
        self.repaint_soon()

    def on_picked(self, message: Picked) -> None:
        """Choose the type that was clicked."""
        message.stop()
        if message.index < len(self._names):
            self.step(message.index - self._here)
