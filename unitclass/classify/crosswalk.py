"""Results in another laboratory's words: type ids replaced in suggestions, reasons and labels."""

from __future__ import annotations

import re
from collections.abc import Mapping
from dataclasses import replace

from unitclass.records import Label, Labels, SessionResult, Suggestion

Words = Mapping[str, str]
"""Type id to the laboratory's own word."""


def in_other_words(result: SessionResult, words: Words) -> SessionResult:
    """Return the results with every type id that has another word replaced by it."""
    if not words:
        return result
    conditions = tuple(
        replace(c, units=tuple(replace(u, suggestion=_renamed(u.suggestion, words)) for u in c.units))
        for c in result.conditions)
    return replace(result, conditions=conditions)


def labels_in_other_words(labels: Labels, words: Words) -> dict[tuple[str, str], Label]:
    """Return the labels in the laboratory's words; opinions behind a disagreement, too."""
    return {key: replace(label, type=words.get(label.type, label.type)) for key, label in labels.items()}


def _renamed(suggestion: Suggestion, words: Words) -> Suggestion:
    probabilities: dict[str, float] = {}
    for name, p in suggestion.probabilities.items():  # two types may share a word: then it is both of them
        word = words.get(name, name)
        probabilities[word] = probabilities.get(word, 0.0) + p
    return replace(
        suggestion, type=words.get(suggestion.type, suggestion.type), probabilities=probabilities,
        rule_type=words.get(suggestion.rule_type, suggestion.rule_type),
        reasons=tuple(_said(reason, words) for reason in suggestion.reasons))


def _said(reason: str, words: Words) -> str:
    """Return a sentence with whole type ids replaced: "I-E" is not part of "pre-I-E"."""
    ids = sorted(words, key=len, reverse=True)
    pattern = r"(?<![\w-])(" + "|".join(re.escape(i) for i in ids) + r")(?![\w-])"
    return re.sub(pattern, lambda found: words[found.group(1)], reason)
