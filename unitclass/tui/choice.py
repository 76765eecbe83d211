"""Choosing from a list by typing a few letters: which options match, best first. No drawing."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass


@dataclass(frozen=True)
class Option:
    """One thing that can be chosen; `also` are further words that find it."""

    value: str
    label: str
    detail: str = ""
    also: str = ""


def matching(options: Sequence[Option], typed: str) -> list[Option]:
    """Return the options that the typed letters find, best first; all of them for no letters.

    Hyphens, blanks and case do not count: "po" finds post-I, "rai" ramp-I (its letters in order).
    """
    wanted = _letters(typed)
    if not wanted:
        return list(options)
    ranked = [(rank, place, option) for place, option in enumerate(options)
              if (rank := _rank(option, wanted)) is not None]
    return [option for _, _, option in sorted(ranked, key=lambda found: found[:2])]


def _rank(option: Option, wanted: str) -> int | None:
    label, words = _letters(option.label), _letters(f"{option.also} {option.detail}")
    if label == wanted:
        return 0
    if label.startswith(wanted):
        return 1
    if wanted in label:
        return 2
    if any(_letters(word).startswith(wanted) for word in f"{option.also} {option.detail}".split()):
        return 3
    if _in_order(wanted, label):
        return 4 if label.endswith(wanted[-1]) else 5
    return 6 if wanted in words else None


def _letters(text: str) -> str:
    return "".join(c for c in text.casefold() if c.isalnum())


def _in_order(wanted: str, text: str) -> bool:
    letters = iter(text)
    return all(letter in letters for letter in wanted)
