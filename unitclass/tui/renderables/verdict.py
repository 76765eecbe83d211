"""The verdict in words: what is suggested and how surely, what speaks against it, and why."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

from unitclass.tui.renderables.bars import in_words, probability_rows
from unitclass.tui.renderables.glyphs import COLOUR, Look
from unitclass.tui.renderables.sheet import Sheet
from unitclass.tui.renderables.words import shortened, wrapped

Lines = list[tuple[str, str]]
"""(text, ink), top to bottom."""


@dataclass(frozen=True)
class Verdict:
    """All that stands beside a unit's picture.

    `against` are sentences that contradict the suggestion; `fit` says where data and family differ
    most; `decided` is the standing label in words; `change` says what the suggestion was before;
    `facts` are (name, value) pairs. With `is_blind` nothing of the suggestion is shown.
    """

    suggested: str
    probability: float
    ranked: tuple[tuple[str, float], ...] = ()
    against: tuple[str, ...] = ()
    fit: str = ""
    rule: str = ""
    reasons: tuple[str, ...] = ()
    flags: tuple[str, ...] = ()
    decided: str = ""
    change: str = ""
    note: str = ""
    facts: tuple[tuple[str, str], ...] = ()
    is_blind: bool = False


def verdict_rows(verdict: Verdict, width: int, height: int, *, more: str = "", look: Look = COLOUR) -> Sheet:
    """Draw the verdict; `more` tells how to see the rest when not all of it fits."""
    sheet = Sheet(width, height, look)
    y = _put_lines(sheet, 0, _heading(verdict, width, look))
    if not verdict.is_blind:
        room = 6 if height >= 30 else 4
        y = _put_ranking(sheet, y, verdict, min(room, height - y))
    rest = [line for part in _parts(verdict) for line in _wrapped(part, width, look)]
    fits = len(rest) <= height - y
    _put_lines(sheet, y, rest if fits or not more else rest[: max(0, height - y - 1)])
    if not fits and more:
        sheet.put(0, height - 1, shortened(f"{look.glyphs.ellipsis} {more}", width, look), "key")
    return sheet


def verdict_lines(verdict: Verdict, width: int, look: Look = COLOUR) -> Lines:
    """Return the whole verdict as lines without a limit of height: for the full account."""
    lines = _heading(verdict, width, look)
    if not verdict.is_blind:
        lines += [(f"{n + 1:>2} {name:<14} {in_words(p)}", "") for n, (name, p) in enumerate(verdict.ranked)]
    return lines + [line for part in _parts(verdict) for line in _wrapped(part, width, look)]


def verdict_in_brief(verdict: Verdict, width: int, *, look: Look = COLOUR) -> Lines:
    """Return the verdict in two lines: for the smallest terminals."""
    if verdict.is_blind:
        head = "blind: name a type"
    else:
        others = "  ".join(f"{n}{look.glyphs.upright}{name} {in_words(p)}"
                           for n, (name, p) in enumerate(verdict.ranked[1:3], start=2))
        head = f"{verdict.suggested} {in_words(verdict.probability)}  {others}"
    doubts = verdict.flags if verdict.is_blind else verdict.against + verdict.flags
    second = "! " + "; ".join(doubts) if doubts else verdict.decided or verdict.rule
    if verdict.decided and doubts:
        head = f"{verdict.decided} | {head}"
    ink = "warn" if doubts else ""
    return [(shortened(head, width, look), "strong"), (shortened(second, width, look), ink)]


def _heading(verdict: Verdict, width: int, look: Look) -> Lines:
    lines: Lines = []
    if verdict.decided:
        lines += [(text, "good") for text in wrapped(f"{look.glyphs.done} {verdict.decided}", width, look,
                                                     indent="  ")]
    if verdict.is_blind:
        words = "blind: the suggestion is hidden until you name a type"
        return lines + [(text, "strong") for text in wrapped(words, width, look)]
    probability = in_words(verdict.probability).strip()
    lines.append((shortened(f"suggested: {verdict.suggested} {probability}", width, look), "title"))
    lines += [(text, "warn") for words in verdict.against
              for text in wrapped(f"! {words}", width, look, indent="  ")]
    return lines + [(text, "quiet") for text in wrapped(verdict.change, width, look)]


def _put_ranking(sheet: Sheet, y: int, verdict: Verdict, height: int) -> int:
    if not verdict.ranked or height <= 0:
        return y
    ranking = probability_rows(verdict.ranked, sheet.width, height, look=sheet.look)
    sheet.paste(ranking, 0, y)
    return y + ranking.height


def _parts(verdict: Verdict) -> Iterator[tuple[str, str, str]]:
    """Yield (lead, text, ink) of what follows the ranking, most important first."""
    for flag in verdict.flags:
        yield "! ", flag, "warn"
    if not verdict.is_blind:
        if verdict.fit:
            yield "", verdict.fit, ""
        if verdict.rule:
            yield "", verdict.rule, "quiet"
        for reason in verdict.reasons:
            yield "- ", reason, ""
    if verdict.note:
        yield "note: ", verdict.note, "strong"
    for name, value in verdict.facts:
        yield f"{name}: ", value, "quiet"


def _wrapped(part: tuple[str, str, str], width: int, look: Look) -> Lines:
    lead, text, ink = part
    return [(line, ink) for line in wrapped(lead + text, width, look, indent="  ")]


def _put_lines(sheet: Sheet, y: int, lines: Lines) -> int:
    for text, ink in lines:
        if y >= sheet.height:
            break
        sheet.put(0, y, text, ink)
        y += 1
    return y
