"""The cycles of the current condition: trace, bursts, threshold; drop, restore, and what follows."""

from __future__ import annotations

from unitclass.errors import UnitclassError
from unitclass.records import ConditionResult
from unitclass.review.cycle_draft import CycleDraft
from unitclass.review.entry import QueueEntry
from unitclass.review.unit_facts import picture_top
from unitclass.tui.desk import Desk
from unitclass.tui.keys import CYCLES, KeyMap
from unitclass.tui.renderables.bars import in_words
from unitclass.tui.renderables.cycle_rows import GUTTER, CyclesView, cycle_rows, window_around
from unitclass.tui.renderables.sheet import Sheet
from unitclass.tui.renderables.trace import Burst, TraceWindow
from unitclass.tui.renderables.unit_picture import unit_picture
from unitclass.tui.screens.page import PageScreen
from unitclass.tui.theme import Theme

BESIDE_FROM = 110


class CyclesScreen(PageScreen):
    """The nerve of the current unit's condition, and changes to its cycles."""

    KEYS = CYCLES

    def __init__(self, desk: Desk, theme: Theme, keys: KeyMap) -> None:
        super().__init__(desk, theme, keys)
        self._here = 0
        self._before = ""
        self._load()

    def _load(self) -> None:
        entry = self.desk.session.current
        assert entry is not None
        self._entry: QueueEntry = entry
        result = self.desk.session.condition_result(entry, with_envelopes=True)
        found = result.nerve_cycles
        self._result: ConditionResult = result
        self._draft = CycleDraft.of(entry.condition, found.cycles, found.threshold,
                                    self.desk.session.cycle_edits(entry.path))
        self._tops = tuple(picture_top(e, found.threshold if i == 0 else float("nan"))
                           for i, e in enumerate(found.envelopes))
        self._here = min(self._here, max(0, found.cycles.n_cycles - 1))

    def title_words(self) -> tuple[str, str, str]:
        """Return which nerve and condition."""
        cycles = self._draft.cycles
        words = f"{int(self._draft.accepted.sum())} of {cycles.n_cycles} cycles used"
        return f"cycles of {cycles.nerve}  {self._entry.condition}", self._entry.path, words

    def draw_body(self, width: int, height: int) -> Sheet:
        """Draw the trace around the chosen cycle; beside it the unit, where there is room."""
        look = self.inks.look
        if not self._draft.cycles.n_cycles:
            sheet = Sheet(width, height, look)
            sheet.put(1, 1, "No cycles were found here.", "warn")
            for y, words in enumerate(self._result.nerve_cycles.detection, start=3):
                sheet.put(1, y, words)
            return sheet
        beside = max(44, width // 4) if width >= BESIDE_FROM else 0
        view = CyclesView(self._result.nerve_cycles.envelopes, self._bursts(), self._draft.level, self._tops,
                          tuple(self._lines()))
        window = self._window(width - beside - GUTTER)
        sheet = Sheet(width, height, look)
        sheet.paste(cycle_rows(view, window, height, look=look), 0, 0)
        if beside:
            sheet.paste(self._unit_sheet(beside - 2, height), width - beside + 2, 0)
        return sheet

    def _unit_sheet(self, width: int, height: int) -> Sheet:
        view = self.desk.view()
        if view is None:
            return Sheet(width, height, self.inks.look)
        return unit_picture(view.unit, view.nerves, view.ti_s, view.te_s, width, min(height, 24),
                            family=view.family, look=self.inks.look)

    def _window(self, n_columns: int) -> TraceWindow:
        return window_around(self._bursts(), self._here, n_columns)

    def _bursts(self) -> tuple[Burst, ...]:
        c, accepted = self._draft.cycles, self._draft.accepted
        return tuple(Burst(float(c.onset_s[i]), float(c.offset_s[i]), float(c.end_s[i]), bool(accepted[i]),
                           c.kind[i], i == self._here) for i in range(c.n_cycles))

    def _lines(self) -> list[tuple[str, str]]:
        c, i = self._draft.cycles, self._here
        state = "used" if self._draft.accepted[i] else "left out"
        reason = f": {c.reason[i]}" if c.reason[i] else ""
        lines = [(f"cycle {i + 1} of {c.n_cycles} at {c.onset_s[i]:.2f} s, TI {c.ti_s[i]:.2f} s, "
                  f"TE {c.te_s[i]:.2f} s: {c.kind[i]}, {state}{reason}", "strong")]
        if self._draft.is_changed:
            scale = self._draft.scale / self._draft.scale_in_force
            n_turned = len(self._draft.turned)
            lines.append((f"not applied yet: threshold x {scale:.2f}, {n_turned} cycles turned; "
                          f"{self.keys.shown('apply')} analyses the file again", "warn"))
        elif self._before:
            lines.append((f"unit {self._entry.unit}: {self._before}; now {self._state()}", "good"))
        else:
            lines.append((f"unit {self._entry.unit}: {self._state()}", ""))
        return lines + [(words, "quiet") for words in self._result.nerve_cycles.detection]

    def _state(self) -> str:
        entry = self.desk.session.entry(self._entry.key)
        suggested = "" if entry.is_hidden else f"{entry.suggested_type} {in_words(entry.probability).strip()}, "
        return f"{suggested}{entry.n_spikes} spikes in {entry.n_cycles} cycles"

    # ---------------------------------------------------------------------------- keys

    def step(self, steps: int) -> None:
        """Choose another cycle."""
        self._here = max(0, min(self._here + steps, self._draft.cycles.n_cycles - 1))
        self.repaint_soon()

    def page_length(self) -> int:
        """Return how many cycles are in sight."""
        return max(2, (self.body.size.width - GUTTER) // 9)

    def action_earlier(self) -> None:
        """Go one cycle back."""
        self.step(-1)

    def action_after(self) -> None:
        """Go one cycle on."""
        self.step(1)

    def action_raise(self) -> None:
        """Raise the threshold."""
        self._change(self._draft.moved(1))

    def action_lower(self) -> None:
        """Lower the threshold."""
        self._change(self._draft.moved(-1))

    def action_drop(self) -> None:
        """Leave the chosen cycle out, or take it in again."""
        if self._draft.cycles.n_cycles:
            self._change(self._draft.toggled(self._here))

    def action_undo_edit(self) -> None:
        """Take back the last change that is not applied yet."""
        self._change(self._draft.undone())

    def _change(self, draft: CycleDraft) -> None:
        self._draft = draft
        self.say("")
        self.repaint_soon()

    def action_apply(self) -> None:
        """Store the changes and have the file analysed again."""
        if not self._draft.is_changed:
            self.say("Nothing is changed.")
            return
        self._before = self._state()
        try:
            for edit in self._draft.edits():
                self.desk.session.edit_cycles(self._entry.path, edit)
        except UnitclassError as error:
            self.say(str(error), "warn")
            return
        started = self.app.analyse_again((self._entry.path,))  # type: ignore[attr-defined]
        self.say("Kept. Analysing this file again; go on meanwhile." if started else
                 "Kept; it takes effect when the file is analysed again.")
        self._load()
        self.repaint_soon()

    def results_changed(self, path: str) -> None:
        """Show the new cycles after an analysis."""
        if path == self._entry.path:
            self._load()
            self.say("Analysed again.")
            self.repaint_soon()
