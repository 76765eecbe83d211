"""What the screens say of a unit, a decision or a file, in words."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass, replace
from typing import TYPE_CHECKING

from unitclass.records import NerveProfile, UnitResult
from unitclass.review.entry import STATES, QueueEntry
from unitclass.review.family_check import conflicts
from unitclass.review.misfit import contradictions, misfit
from unitclass.review.shelf import FileState
from unitclass.tui.renderables.verdict import Verdict

if TYPE_CHECKING:
    from unitclass.classify.templates import Family

OWN_WORDS = {"viewed": "looking at it", "blind": "blind", "batch": "in a batch", "settled": "settled"}

LABEL_FLAGS: Mapping[str, str] = {
    "disagreement": "reviewers differ", "stale": "label is older than a change of the cycles: look again",
    "asks again": "the spike train is not the one that was labelled: label it again"}


@dataclass(frozen=True)
class ConditionFacts:
    """What the unit page needs of a condition, kept while results stay the same."""

    nerves: tuple[NerveProfile, ...]
    ti_s: float
    te_s: float
    regime: str


def told(file: FileState) -> str:
    """Return why a file failed, its name once."""
    return file.reason if file.path in file.reason else f"{file.path}: {file.reason}"


def family_shown(entry: QueueEntry, unit: UnitResult) -> str:
    """Return the type whose fitted family is drawn: none while hidden, and none for a state."""
    return "" if entry.is_hidden or not unit.suggestion.fitted_rate_hz.size else unit.suggestion.type


def verdict_of(entry: QueueEntry, unit: UnitResult, condition: ConditionFacts,
               family: Family | None = None) -> Verdict:
    """Return the verdict on a unit in words; `family` is that of the suggested type, where it is known."""
    suggestion = unit.suggestion
    verdict = Verdict(entry.suggested_type, entry.probability, entry.ranked, flags=flags_of(entry),
                      decided=standing_words(entry), change=entry.change, note=entry.note,
                      facts=tuple(_short_facts(entry, unit, condition)), is_blind=entry.is_hidden)
    if entry.is_hidden:
        return verdict
    worst = misfit(unit)
    fit = "" if worst is None or worst.is_contradiction else worst.words(suggestion.type)
    against = contradictions(unit) + (conflicts(unit, family) if family is not None else ())
    return replace(verdict, against=against, fit=fit, rule=rule_words(unit), reasons=suggestion.reasons)


def rule_words(unit: UnitResult) -> str:
    """Return the rule of thumb as a cross-check, when it agrees (if not, it speaks against)."""
    rule = unit.suggestion.rule_type
    if not rule or unit.suggestion.type in STATES:
        return ""
    return f"rule of thumb: {rule}" + (", the same" if rule == unit.suggestion.type else "")


def flags_of(entry: QueueEntry) -> tuple[str, ...]:
    """Return the flags of the data; those of the label are in `standing_words`."""
    return tuple(entry.flags)


def standing_words(entry: QueueEntry) -> str:
    """Return what has been decided on a unit, by whom and how."""
    words = []
    if entry.own_type:
        words.append(f"you: {entry.own_type} ({OWN_WORDS.get(entry.own_how, entry.own_how)})")
    if entry.label is not None and entry.label.type and (not entry.own_type or entry.label.type != entry.own_type
                                                        or ";" in entry.label.reviewer):
        words.append(f"stands: {entry.label.type}, {entry.label.reviewer}")
    words += [LABEL_FLAGS.get(flag, flag) for flag in entry.label_flags]
    if entry.is_later and not entry.own_type:
        words.append("left for later")
    return "; ".join(words)


def _short_facts(entry: QueueEntry, unit: UnitResult, condition: ConditionFacts) -> Iterable[tuple[str, str]]:
    yield "spikes", f"{unit.n_spikes} in {unit.n_cycles} cycles"
    yield "rhythm", condition.regime
    if entry.shape_group:
        yield "shape group", entry.shape_group
    for name, value in entry.columns.items():
        yield str(name), str(value)


def decided_words(entry: QueueEntry) -> str:
    """Return what was just decided."""
    return f"{entry.unit}: {entry.own_type}"
