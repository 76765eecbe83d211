"""Every key of the review, declared once: footer, help and bindings are made from this list.

None of the keys is taken by tmux, screen or an SSH client (no control or function keys, no chords).
A user changes them in the settings file by the ids used here, e.g. [review.keys] later = "z".
"""

from __future__ import annotations

import difflib
from collections.abc import Iterator, Mapping
from dataclasses import dataclass, field

from unitclass.errors import UsageError

REVIEW, POPULATION, CONDITIONS, CYCLES, TYPES, HELP = (
    "review", "population", "conditions", "cycles", "types", "help")
BATCH, DISCUSS, FINISH, ACCOUNT = "batch", "discuss", "finish", "account"
LISTS = (POPULATION, BATCH, DISCUSS)
OTHERS = (POPULATION, CONDITIONS, CYCLES, TYPES, HELP, BATCH, DISCUSS, FINISH, ACCOUNT)


Action = tuple[str, tuple[int, ...]]
"""A screen's method and its arguments."""


@dataclass(frozen=True)
class Key:
    """One action on one key.

    `footer` is the word beside the key in the footer ("" keeps it to the help screen); lower
    `rank` comes first and survives longest on a narrow terminal. `pair` is the id of the action
    in the other direction, shown with it.
    """

    id: str
    key: str
    help: str
    screens: tuple[str, ...]
    footer: str = ""
    rank: int = 50
    pair: str = ""

    @property
    def action(self) -> Action:
        """Return the name of the screen's method, without "action_", and its arguments."""
        stem, _, number = self.id.partition("-")
        return stem, (int(number),) if number else ()


DECLARED: tuple[Key, ...] = (
    Key("accept", "enter", "accept the suggestion and go to the next unit", (REVIEW,), "accept", 1),
    *(Key(f"take-{n}", str(n), f"take the type listed as {n}", (REVIEW,)) for n in range(1, 10)),
    Key("name", "t", "name any type: type two or three letters, Enter", (REVIEW,), "type", 3),
    Key("later", "l", "leave this unit for later and go on", (REVIEW,), "later", 7),
    Key("mixed", "x", "not one cell: two cells in one train, or an artefact", (REVIEW,), "not one cell", 8),
    Key("note", "n", "write a note on this unit", (REVIEW,), "note", 9),
    Key("undo", "u", "take back the last decision", (REVIEW, BATCH, DISCUSS), "undo", 5),
    Key("redo", "r", "give the decision again that was taken back", (REVIEW,), "redo", 18),
    Key("batch", "a", "accept all sure suggestions: shows exactly which first", (REVIEW,), "all sure", 4),
    Key("next", "down", "next unit", (REVIEW, *LISTS, TYPES, CONDITIONS, HELP, ACCOUNT, FINISH), "unit", 4,
        "previous"),
    Key("previous", "up", "previous unit", (REVIEW, *LISTS, TYPES, CONDITIONS, HELP, ACCOUNT, FINISH)),
    Key("forward", "pagedown", "a page of units on", (REVIEW, *LISTS, CYCLES, HELP, ACCOUNT, FINISH)),
    Key("back", "pageup", "a page of units back", (REVIEW, *LISTS, CYCLES, HELP, ACCOUNT, FINISH)),
    Key("first", "home", "first unit", (REVIEW, *LISTS, CYCLES)),
    Key("last", "end", "last unit", (REVIEW, *LISTS, CYCLES)),
    Key("open", "j", "jump to the next unit without a label", (REVIEW,), "next open", 12),
    Key("changed", "g", "jump to the next suggestion that has changed", (REVIEW,), "", 30),
    Key("find", "slash", "find a unit by name", (REVIEW, POPULATION), "find", 13),
    Key("only", "w", "which units: by type, file, condition, region, flag, label", (REVIEW,), "which", 14),
    Key("order", "o", "order of the queue", (REVIEW,), "order", 15),
    Key("blind", "b", "blind: hide suggestions until a label is given", (REVIEW,), "blind", 16),
    Key("account", "i", "this unit in full: reasons, features, history", (REVIEW,), "in full", 10),
    Key("population", "p", "population: every unit as a row, by type and phase", (REVIEW,), "population", 11),
    Key("conditions", "s", "conditions of this unit side by side", (REVIEW,), "side by side", 17),
    Key("cycles", "c", "cycles: nerve, bursts, threshold, cycles left out", (REVIEW,), "cycles", 6),
    Key("types", "k", "kinds of unit: the families behind the suggestions", (REVIEW,), "kinds", 20),
    Key("discuss", "d", "units on which reviewers differ", (REVIEW,), "discuss", 21),
    Key("finish", "e", "end: what is left, and export of labelled files", (REVIEW,), "end/export", 2),
    Key("move", "m", "keep decisions in another file, e.g. on a full disk", (REVIEW,), "", 40),
    Key("help", "question_mark", "all keys", (REVIEW, *OTHERS), "help", 0),
    Key("quit", "q,ctrl+c", "leave (every decision is already stored)", (REVIEW,), "leave", 19),
    # on the other screens
    Key("close", "escape,ctrl+c", "back to the unit", OTHERS, "back", 1),
    Key("goto", "enter", "go to this unit", (POPULATION, CONDITIONS, DISCUSS), "go to unit", 2),
    Key("confirm", "enter", "accept all that is listed", (BATCH,), "accept these", 0),
    Key("leave_out", "x", "leave this one out of the batch, or take it in again", (BATCH,), "leave out", 2),
    Key("settle-1", "1", "let the first reviewer's label stand", (DISCUSS,), "first stands", 2),
    Key("settle-2", "2", "let the second reviewer's label stand", (DISCUSS,), "second stands", 3),
    Key("agree_on", "t", "settle on any type", (DISCUSS,), "other type", 4),
    Key("export", "enter", "write the labelled files", (FINISH,), "export", 2),
    Key("replace", "w", "write them, replacing earlier labelled files", (FINISH,), "replace earlier ones", 3),
    Key("earlier", "left", "one cycle back", (CYCLES,), "", 5),
    Key("after", "right", "one cycle on", (CYCLES,), "cycle", 5, "earlier"),
    Key("raise", "up", "raise the threshold", (CYCLES,), "", 4),
    Key("lower", "down", "lower the threshold", (CYCLES,), "threshold", 4, "raise"),
    Key("drop", "x", "leave this cycle out, or take it in again", (CYCLES,), "drop/restore", 3),
    Key("apply", "enter", "apply the changes: analyses this session again", (CYCLES,), "apply", 2),
    Key("undo_edit", "u", "take back the last change that is not applied yet", (CYCLES,), "undo", 6),
)

_DEFAULTS = {declared.id: declared.key for declared in DECLARED}
READABLE = {"enter": "Enter", "escape": "Esc", "slash": "/", "question_mark": "?", "down": "Down", "up": "Up",
            "left": "Left", "right": "Right", "pagedown": "PgDn", "pageup": "PgUp", "home": "Home",
            "end": "End",
            "space": "Space", "tab": "Tab", "comma": ",", "full_stop": ".", "minus": "-", "plus": "+"}
SWALLOWED = ("ctrl+", "alt+", "shift+", "meta+", "super+")
"""Beginnings of keys that terminals, multiplexers or SSH clients keep for themselves."""


@dataclass(frozen=True)
class KeyMap:
    """The keys in force: what is declared, with the user's own keys laid over."""

    changed: Mapping[str, str] = field(default_factory=dict)
    _by_screen: dict[str, Mapping[str, Action]] = field(default_factory=dict, repr=False, compare=False)

    @staticmethod
    def of(wanted: Mapping[str, str]) -> KeyMap:
        """Return the keys in force.

        Raises
        ------
        UsageError
            For an id that does not exist, a key that terminals swallow, or one key for two actions
            of one screen.
        """
        known = {declared.id for declared in DECLARED}
        for action, key in wanted.items():
            _checked(action, str(key), known)
        keys = KeyMap({action: _long_name(str(key)) for action, key in wanted.items()})
        for screen in (REVIEW, *OTHERS):
            keys._check_clash(screen)
        return keys

    def key(self, action: str) -> str:
        """Return the key of an action, by the toolkit's name."""
        return self.changed.get(action) or _DEFAULTS[action]

    def shown(self, action: str) -> str:
        """Return the key of an action as a person reads it."""
        return readable(self.key(action))

    def action(self, screen: str, key: str) -> Action | None:
        """Return what a key does on a screen; None for nothing."""
        return self._actions(screen).get(key)

    def _actions(self, screen: str) -> Mapping[str, Action]:
        if screen not in self._by_screen:
            self._by_screen[screen] = {key: d.action for d in self.on(screen) for key in self.key(d.id).split(",")}
        return self._by_screen[screen]

    def on(self, screen: str) -> Iterator[Key]:
        """Yield what is declared for a screen, in order."""
        return (declared for declared in DECLARED if screen in declared.screens)

    def footer(self, screen: str) -> list[tuple[str, str]]:
        """Return (key, word) for the footer, most needed first."""
        named = sorted((d for d in self.on(screen) if d.footer), key=lambda d: d.rank)
        return [(" ".join(self.shown(i) for i in (d.pair, d.id) if i), _word(d, screen)) for d in named]

    def help(self, screen: str) -> list[tuple[str, str]]:
        """Return (key, sentence) for the help screen; the digits make one line."""
        lines = [(self.shown(d.id), d.help) for d in self.on(screen) if not d.id.startswith("take-")]
        if any(d.id == "take-1" for d in self.on(screen)):
            digits = f"{self.shown('take-1')}{chr(0x2013)}{self.shown('take-9')}"
            lines.insert(1, (digits, "take the type listed with that number"))
        return lines

    def _check_clash(self, screen: str) -> None:
        taken: dict[str, str] = {}
        for declared in self.on(screen):
            key = self.key(declared.id)
            other = taken.setdefault(key, declared.id)
            if other != declared.id:
                raise UsageError(f"key {readable(key)!r} is asked for both {other!r} and {declared.id!r}",
                                 where="settings [review.keys]", remedy="give one of them another key")


SCROLLED = (HELP, ACCOUNT, FINISH)


def _word(declared: Key, screen: str) -> str:
    """Return the footer's word; stepping is named after what it does on the screen."""
    if declared.id == "next" and screen != REVIEW:
        return "scroll" if screen in SCROLLED else "choose"
    return declared.footer


def readable(key: str) -> str:
    """Return a toolkit key name (the first, of several for one action) as a person reads it."""
    first = key.partition(",")[0]
    return READABLE.get(first, first)


def _checked(action: str, key: str, known: set[str]) -> None:
    where = "settings [review.keys]"
    if action not in known:
        near = difflib.get_close_matches(action, sorted(known), n=1, cutoff=0.0)[0]
        raise UsageError(f"unknown action {action!r}", where=where, remedy=f"the nearest is {near!r}")
    if not key or key.lower().startswith(SWALLOWED):
        raise UsageError(f"key {key!r} for {action!r} may never reach the program", where=where,
                         remedy="use a letter, a digit, Enter, Space, Tab or an arrow")


def _long_name(key: str) -> str:
    names = {short: long for long, short in READABLE.items()}
    return names.get(key, names.get(key.capitalize(), key if len(key) == 1 else key.lower()))
