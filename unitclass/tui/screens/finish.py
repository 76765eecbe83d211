"""The end: what is left, what was accepted without looking, and where labelled files go."""

from __future__ import annotations

from unitclass.tui.desk import Desk
from unitclass.tui.keys import FINISH, KeyMap
from unitclass.tui.renderables.listing import scrolled
from unitclass.tui.renderables.sheet import Sheet
from unitclass.tui.renderables.words import wrapped
from unitclass.tui.screens.page import PageScreen
from unitclass.tui.theme import Theme
from unitclass.tui.wording import told
from unitclass.tui.workers import Done

Lines = list[tuple[str, str]]


class FinishScreen(PageScreen):
    """Where a review ends."""

    KEYS = FINISH

    def __init__(self, desk: Desk, theme: Theme, keys: KeyMap) -> None:
        super().__init__(desk, theme, keys)
        self._first = 0
        self._written: Lines = []
        self._is_writing = False

    def title_words(self) -> tuple[str, str, str]:
        """Return how far the review is."""
        p = self.desk.session.progress()
        return "end of the review", "", f"{p.n_reviewed} of {p.n_entries} labelled by you"

    def draw_body(self, width: int, height: int) -> Sheet:
        """Draw what stands and what would be written."""
        look = self.inks.look
        lines = [(text, ink) for words, ink in self._lines() for text in (wrapped(words, width, look, indent="    ")
                                                                          or [""])]
        self._first = max(0, min(self._first, len(lines) - height))
        return scrolled(lines, self._first, width, height, look=look)

    def _lines(self) -> Lines:
        return [*self._written, *self._standing(), ("", ""), *self._plan(), ("", ""), *self._failures()]

    def _standing(self) -> Lines:
        p = self.desk.session.progress()
        lines: Lines = [(f"{p.n_left} units and conditions without your label" if p.n_left else
                         "every unit has your label", "strong")]
        told = [(p.n_later, "of them left for later"),
                (p.n_batch, "accepted in a batch, without looking"),
                (p.n_disagreements, "on which reviewers differ: exported without a label until settled"),
                (p.n_stale, "with a label older than a change of their cycles"),
                (p.n_asks_again, "whose spike train changed since it was labelled"),
                (p.n_waiting, "files still being analysed")]
        lines += [(f"- {number} {words}", "warn" if "differ" in words else "") for number, words in told if number]
        if p.types:
            lines.append(("your labels: " + ", ".join(f"{name} {n}" for name, n in p.types.items()), ""))
        return [*lines, (f"decisions are kept in {self.desk.session.store_path}", "quiet")]

    def _plan(self) -> Lines:
        lines: Lines = [(f"{self.keys.shown('export')} writes:", "strong")]
        failed = {file.path for file in self.desk.session.files if file.state == "failed"}
        for item in (item for item in self.desk.session.export_plan() if item.path not in failed):
            words = f"- {item.target}: {item.n_labelled} of {item.n_entries} labelled"
            lines.append((f"{words}; NOT WRITTEN: {item.problem}" if item.problem else words,
                          "warn" if item.problem else ""))
        return lines

    def _failures(self) -> Lines:
        return [(f"failed: {told(file)}", "warn") for file in self.desk.session.files if file.state == "failed"]

    def step(self, steps: int) -> None:
        """Scroll."""
        self._first = max(0, self._first + min(steps, 10**6))
        self.repaint_soon()

    def action_export(self) -> None:
        """Write the labelled files."""
        self._export(False)

    def action_replace(self) -> None:
        """Write the labelled files, replacing earlier ones."""
        self._export(True)

    def _export(self, is_replacing: bool) -> None:
        if self._is_writing:
            self.say("Still writing.")
            return
        self._written = []
        self._is_writing = self.app.start_export(is_replacing)  # type: ignore[attr-defined]
        self.say("Writing; this can take a while, and you may go on reviewing." if self._is_writing else
                 "There is nothing that can be written now.", "" if self._is_writing else "warn")
        self.repaint_soon()

    def show_written(self, done: Done | None) -> None:
        """Tell of one file that was written, or of the end of writing."""
        if done is None:
            self._is_writing = False
            self.say("Done: every file that could be written is written.")
        elif done.problem:
            self._written.append((f"NOT WRITTEN: {done.name}: {done.problem}", "warn"))
        else:
            self._written.append((f"{self.inks.look.glyphs.done} written: {done.result}", "good"))
        self.repaint_soon()
