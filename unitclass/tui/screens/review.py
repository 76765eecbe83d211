"""The review screen: queue, one unit on the cycle axis, the verdict beside it."""

from __future__ import annotations

from collections.abc import Callable

from textual import events
from textual.app import ComposeResult

from unitclass.errors import UnitclassError
from unitclass.tui.desk import Desk
from unitclass.tui.keys import REVIEW, KeyMap
from unitclass.tui.messages import Picked, Stepped
from unitclass.tui.screens.base import BaseScreen, Coverable
from unitclass.tui.theme import Theme
from unitclass.tui.widgets.head import Head
from unitclass.tui.widgets.panels import QueueColumn, UnitPage, UnitView, VerdictPanel

COLUMN_FROM = 100
BESIDE_FROM = 64
LEAST = (30, 9)
TOO_SMALL = "Too small to draw:\nmake it 40 x 12."


class ReviewScreen(BaseScreen):
    """Where nearly all the work is done."""

    KEYS = REVIEW
    DEFAULT_CSS = """
    ReviewScreen QueueColumn { width: 20; display: none; }
    ReviewScreen VerdictPanel { width: 26; }
    ReviewScreen.-brief VerdictPanel { dock: bottom; width: 1fr; height: 2; margin-bottom: 2; }
    """

    def __init__(self, desk: Desk, theme: Theme, keys: KeyMap) -> None:
        super().__init__(theme, keys)
        self.desk = desk
        self.head = Head(theme)
        self.queue = QueueColumn(theme)
        self.page = UnitPage(theme)
        self.verdict = VerdictPanel(theme)
        self._arranged_for = (0, 0)

    def compose(self) -> ComposeResult:
        """Lay the parts out, with the first unit in them, so that the first paint shows it."""
        self._arrange(*self.app.size)
        self.repaint()
        yield self.head
        yield self.foot
        yield self.queue
        yield self.page
        yield self.verdict

    def on_mount(self) -> None:
        """Tell the program when the first unit is on the screen."""
        self.call_after_refresh(self.app.begin)  # type: ignore[attr-defined]

    def on_screen_suspend(self) -> None:
        """Begin also where a quick hand opens another screen before the first refresh has ended."""
        self.app.begin()  # type: ignore[attr-defined]

    def on_resize(self, event: events.Resize) -> None:
        """Give every part the room it needs at this size."""
        if tuple(event.size) != self._arranged_for:
            self._arrange(*event.size)
            self.repaint_soon()

    def list_area(self) -> Coverable:
        """Return where lists are shown: the verdict's place, or the picture's on a narrow terminal."""
        return self.page if self.has_class("-brief") else self.verdict

    def repaint(self) -> None:
        """Show the unit the queue stands at."""
        desk = self.desk
        view, words = self._view()
        entries, here = desk.entries, desk.here
        title, where, right = desk.head()
        has_column = self.queue.display
        several = desk.has_conditions
        self.head.show(title, where, right, () if has_column else entries, here, several)
        if has_column:
            self.queue.show(entries, here, several)
        if view is None or self._is_too_small():
            self.page.show(None, words if view is None else TOO_SMALL)
            self.verdict.show(None, "")
            return
        self.page.show(view)
        self.verdict.show(view.verdict, f"{self.keys.shown('account')}: all of it")

    def _view(self) -> tuple[UnitView | None, str]:
        """Return the unit to show, or words why there is none."""
        try:
            view = self.desk.view()
        except UnitclassError as error:  # e.g. its results cannot be read any more
            return None, str(error)
        return view, "" if view is not None else self.desk.why_empty()

    def _is_too_small(self) -> bool:
        width, height = self._arranged_for
        return width < LEAST[0] or height < LEAST[1]

    def _arrange(self, width: int, height: int) -> None:
        self._arranged_for = (width, height)
        has_column = width >= COLUMN_FROM and height >= 16
        is_brief = width < BESIDE_FROM
        self.queue.display = has_column
        column = min(34, 22 + max(0, width - COLUMN_FROM) // 8) if has_column else 0
        self.queue.styles.width = column
        self.head.styles.height = 1 if has_column or height < 16 else 2
        self.set_class(is_brief, "-brief")
        self.verdict.display = not self._is_too_small()
        beside = 0 if is_brief else max(25, min(60, round(width * 0.3)))
        self.verdict.styles.width = beside or "1fr"
        self.page.give_width(width - beside - column)

    # --------------------------------------------------------------------------- moving

    def action_next(self) -> None:
        """Go to the next unit."""
        self._go(self.desk.here + 1)

    def action_previous(self) -> None:
        """Go to the unit before."""
        self._go(self.desk.here - 1)

    def action_forward(self) -> None:
        """Go a page on."""
        self._go(self.desk.here + self._page_length())

    def action_back(self) -> None:
        """Go a page back."""
        self._go(self.desk.here - self._page_length())

    def action_first(self) -> None:
        """Go to the first unit."""
        self._go(0)

    def action_last(self) -> None:
        """Go to the last unit."""
        self._go(len(self.desk.entries) - 1)

    def _page_length(self) -> int:
        return max(1, self.queue.size.height - 1) if self.queue.display else 10

    def _go(self, place: int) -> None:
        self.desk.go(place)
        self.say("")
        self.repaint_soon()

    def on_picked(self, message: Picked) -> None:
        """Go to the unit that was clicked."""
        message.stop()
        self._go(message.index)

    def on_stepped(self, message: Stepped) -> None:
        """Step with the wheel."""
        message.stop()
        self._go(self.desk.here + message.steps)

    # ------------------------------------------------------------------------- deciding

    def _do(self, act: Callable[[], str]) -> None:
        """Do something that is written to the store, and say what came of it."""
        try:
            message = act()
        except UnitclassError as error:
            self.say(f"{error}" + (f"; {self.keys.shown('move')}: keep decisions elsewhere"
                                   if self.desk.session.has_unsaved else ""), "warn")
        else:
            self.say(message)
            self.app.labels_changed()  # type: ignore[attr-defined]
        self.repaint_soon()

    def action_accept(self) -> None:
        """Accept the suggestion."""
        if self.desk.session.current is not None:
            self._do(self.desk.accept)

    def action_take(self, number: int) -> None:
        """Take the type listed with a number."""
        if self.desk.session.current is not None:
            self._do(lambda: self.desk.take(number))

    def action_name(self) -> None:
        """Name any type."""
        if self.desk.session.current is not None:
            self.ask("type", lambda name: self._do(lambda: self.desk.name(name)),
                     options=self.desk.type_options())

    def action_mixed(self) -> None:
        """Decide that this is not one cell."""
        if self.desk.session.current is not None:
            self._do(self.desk.mixed)

    def action_later(self) -> None:
        """Leave the unit for later."""
        if self.desk.session.current is not None:
            self._do(self.desk.later)

    def action_note(self) -> None:
        """Write a note."""
        entry = self.desk.session.current
        if entry is not None:
            self.ask("note", lambda text: self._do(lambda: self.desk.note(text)), text=entry.note)

    def action_undo(self) -> None:
        """Take back the last decision."""
        self._turn(True)

    def action_redo(self) -> None:
        """Give again what was taken back."""
        self._turn(False)

    def _turn(self, is_undo: bool) -> None:
        try:
            message, paths = self.desk.turn(is_undo)
        except UnitclassError as error:
            self.say(str(error), "warn")
            return
        self.say(message)
        if paths:
            self.app.analyse_again(paths)  # type: ignore[attr-defined]
        self.repaint_soon()

    def action_move(self) -> None:
        """Go on with the decisions in another place, e.g. when the disk is full."""
        self.ask("keep decisions in the file", self._move, text=str(self.desk.session.store_path))

    def _move(self, path: str) -> None:
        def move() -> str:
            self.desk.session.move_store(path)
            return f"decisions are kept in {self.desk.session.store_path}"
        self._do(move)

    def action_blind(self) -> None:
        """Hide suggestions until a label is given, or show them again."""
        self.desk.session.set_blind(not self.desk.session.is_blind)
        self.say("blind: suggestions are hidden until you name a type" if self.desk.session.is_blind else
                 "suggestions are shown")
        self.repaint_soon()

    # ------------------------------------------------------------------ finding and ordering

    def action_open(self) -> None:
        """Go to the next unit without a label."""
        if self.desk.session.next_open() is None:
            self.say(f"every unit in view has your label; {self.keys.shown('finish')}: end and export")
        self.repaint_soon()

    def action_changed(self) -> None:
        """Go to the next changed suggestion."""
        self.say("" if self.desk.go_to_changed() else "no suggestion in view has changed")
        self.repaint_soon()

    def action_find(self) -> None:
        """Find a unit by name."""
        self.ask("find unit", self._find)

    def _find(self, text: str) -> None:
        found = self.desk.session.find(text) if text else None
        self.say("" if found is not None or not text else f"no unit in view is called {text}")
        self.repaint_soon()

    def action_only(self) -> None:
        """Choose which units are in view."""
        self.ask("which units", self._show_only, options=self.desk.filter_options())

    def _show_only(self, value: str) -> None:
        self.say(self.desk.show_only(value))
        self.repaint_soon()

    def action_order(self) -> None:
        """Choose the order of the queue."""
        self.ask("order", self._sort, options=self.desk.order_options())

    def _sort(self, by: str) -> None:
        self.say(self.desk.sort(by))
        self.repaint_soon()

    # --------------------------------------------------------------------- other screens

    def _push(self, screen: str) -> None:
        if self.desk.session.current is None and screen not in ("help", "finish"):
            self.say("there is no unit to show")
            return
        try:
            other = self.app.other_screen(screen)  # type: ignore[attr-defined]
        except UnitclassError as error:
            self.say(str(error), "warn")
            return
        self.app.push_screen(other, self._returned)

    def _returned(self, message: str | None) -> None:
        self.say(message or "")
        self.repaint_soon()

    def action_account(self) -> None:
        """Show this unit in full."""
        self._push("account")

    def action_population(self) -> None:
        """Show the population."""
        self._push("population")

    def action_conditions(self) -> None:
        """Show the conditions side by side."""
        self._push("conditions")

    def action_cycles(self) -> None:
        """Show the cycles."""
        self._push("cycles")

    def action_types(self) -> None:
        """Show the kinds of unit."""
        self._push("types")

    def action_discuss(self) -> None:
        """Show the units on which reviewers differ."""
        self._push("discuss")

    def action_batch(self) -> None:
        """Show what a batch would accept."""
        self._push("batch")

    def action_finish(self) -> None:
        """Show what is left, and export."""
        self._push("finish")

    def action_help(self) -> None:
        """Show all keys."""
        self._push("help")

    def action_quit(self) -> None:
        """Leave."""
        self.app.exit(0)
