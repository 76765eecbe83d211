"""What all screens share: a foot, typing into it, choosing from lists, and repainting late."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, field, replace
from typing import ClassVar, Protocol

from textual import events
from textual.screen import Screen

from unitclass.tui.choice import Option, matching
from unitclass.tui.keys import KeyMap
from unitclass.tui.renderables.choice_rows import choice_rows
from unitclass.tui.renderables.sheet import Sheet
from unitclass.tui.theme import Theme
from unitclass.tui.widgets.foot import Foot
from unitclass.tui.widgets.line_entry import LineEntry

CHOOSING = (("Enter", "take"), ("Up Down", "choose"), ("Esc", "leave"))
TYPING = (("Enter", "keep"), ("Esc", "leave"))


class Coverable(Protocol):
    """A part of the screen over which a list can be shown."""

    def cover(self, draw: Callable[[int, int], Sheet] | None) -> None:
        """Show something else, until None."""
        ...


@dataclass(frozen=True)
class Question:
    """Something that is being typed: what for, with which options, and who takes the answer.

    `done` gets the chosen option's value, or the text itself where there are no options;
    `live` gets the text while it is typed.
    """

    lead: str
    done: Callable[[str], None]
    options: tuple[Option, ...] = ()
    entry: LineEntry = field(default_factory=LineEntry)
    here: int = 0
    live: Callable[[str], None] | None = None

    @property
    def found(self) -> list[Option]:
        """Return the options that the typed letters find."""
        return matching(self.options, self.entry.text)


class BaseScreen(Screen[str]):
    """A screen with a foot. Subclasses name themselves and fill the rest."""

    KEYS: ClassVar[str] = ""
    AUTO_FOCUS = None
    DEFAULT_CSS = "BaseScreen { overflow: hidden; layout: horizontal; }"

    def __init__(self, theme: Theme, keys: KeyMap) -> None:
        super().__init__()
        self.inks, self.keys = theme, keys
        self.foot = Foot(theme, keys.footer(self.KEYS))
        self._question: Question | None = None
        self._is_repaint_due = False

    def list_area(self) -> Coverable:
        """Return the part of the screen where a list to choose from is shown."""
        raise NotImplementedError

    def repaint(self) -> None:
        """Show the present state in every part; subclasses say how."""

    def repaint_soon(self) -> None:
        """Repaint once, after all keys that wait have been dealt with."""
        if not self._is_repaint_due:
            self._is_repaint_due = True
            self.call_later(self._repaint_now)

    def _repaint_now(self) -> None:
        self._is_repaint_due = False
        if self.is_mounted:
            self.repaint()

    def say(self, message: str, ink: str = "") -> None:
        """Show a message at the foot."""
        self.foot.say(message, ink)

    # ------------------------------------------------------------------ typing and choosing

    def ask(self, lead: str, done: Callable[[str], None], *, options: Sequence[Option] = (), text: str = "",
            live: Callable[[str], None] | None = None) -> None:
        """Let the user type, or choose one of `options` by typing; `done` gets the answer."""
        self._question = Question(lead, done, tuple(options), LineEntry.holding(text), live=live)
        self._show_question()

    def on_key(self, event: events.Key) -> None:
        """Act on a key at once, before the next one is looked at.

        While something is being asked, keys go to the entry. The toolkit's own way, by bindings,
        acts a few messages later: of "t" and "p" in one packet, the "p" would be a key of its own.
        """
        event.stop()
        event.prevent_default()
        if self.app.screen is not self:  # a key before this one has opened another screen
            self.app.screen.post_message(events.Key(event.key, event.character))
        elif self._question is not None:
            self._answer(event.key, event.character)
        elif action := self.keys.action(self.KEYS, event.key):
            name, argument = action
            getattr(self, f"action_{name}")(*argument)

    def on_paste(self, event: events.Paste) -> None:
        """Paste into the entry; anywhere else a paste is not a row of keys."""
        event.stop()
        if self._question is not None:
            self._typed(self._question.entry.typed(event.text))

    def _answer(self, key: str, character: str | None) -> None:
        question = self._question
        assert question is not None
        if key == "escape" or key == "ctrl+c":
            self._end_question()
        elif key == "enter":
            self._take(question)
        elif key in ("up", "down") and question.options:
            step = 1 if key == "down" else -1
            here = min(max(question.here + step, 0), max(len(question.found) - 1, 0))
            self._question = replace(question, here=here)
            self._show_question()
        elif character is not None and character.isprintable() and not key.startswith("ctrl+"):
            self._typed(question.entry.typed(character))
        else:
            self._typed(question.entry.pressed(key))

    def _typed(self, entry: LineEntry) -> None:
        question = self._question
        assert question is not None
        if entry == question.entry:
            return
        here = question.here if entry.text == question.entry.text else 0
        self._question = replace(question, entry=entry, here=here)
        if question.live is not None:
            question.live(entry.text)
        self._show_question()

    def _take(self, question: Question) -> None:
        if not question.options:
            self._end_question()
            question.done(question.entry.text.strip())
        elif question.found:
            self._end_question()
            question.done(question.found[question.here].value)

    def _end_question(self) -> None:
        has_list = self._question is not None and bool(self._question.options)
        self._question = None
        self.foot.end_typing()
        if has_list:
            self.list_area().cover(None)

    def _show_question(self) -> None:
        question = self._question
        assert question is not None
        self.foot.type_into(question.lead, question.entry, CHOOSING if question.options else TYPING)
        if question.options:
            self.list_area().cover(self._draw_options)

    def _draw_options(self, width: int, height: int) -> Sheet:
        question = self._question
        assert question is not None
        shown = [(option.label, option.detail) for option in question.found]
        return choice_rows(question.lead, shown, question.here, width, height, look=self.inks.look)
