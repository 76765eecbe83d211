"""The standing labels of a session, if its decisions are on disk, and the words that outputs use."""

from __future__ import annotations

import argparse
from collections.abc import Mapping
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from unitclass.batch import Plan
    from unitclass.records import Labels, SessionResult


def labels_of(result: SessionResult, plan: Plan) -> Labels:
    """Return what people decided of this session's units; empty when there is no store."""
    if not plan.store:
        return {}
    from unitclass.io.decisions import DecisionStore

    digests = {unit.unit: unit.digest for _, unit in result.units()}
    with DecisionStore(plan.store, is_read_only=True) as store:
        return store.labels_for(result.identifier, result.object_id, digests)


def words_of(args: argparse.Namespace, plan: Plan) -> Mapping[str, str]:
    """Return what the laboratory calls each type; empty when no table says so."""
    if not args.crosswalk:
        return {}
    from unitclass.io.crosswalk_file import read_crosswalk
    from unitclass.records import OTHER, SILENT, UNDETERMINED

    known = [family.id for family in plan.library.families]
    return read_crosswalk(args.crosswalk, (*known, OTHER, SILENT, UNDETERMINED))


def in_words(result: SessionResult, plan: Plan, words: Mapping[str, str]) -> tuple[SessionResult, Labels]:
    """Return a session's results and labels in the words that outputs are to use."""
    labels = labels_of(result, plan)
    if not words:
        return result, labels
    from unitclass.classify.crosswalk import in_other_words, labels_in_other_words

    return in_other_words(result, words), labels_in_other_words(labels, words)


def seen_rows(result: SessionResult, plan: Plan, words: Mapping[str, str]) -> list[dict[str, str]]:
    """Return the suggestions that people saw when they decided, the newest of each unit, as rows of an older table."""
    if not plan.store:
        return []
    from unitclass.io.decisions import DecisionStore

    with DecisionStore(plan.store, is_read_only=True) as store:
        log = store.read(result.identifier, result.object_id)
    newest: dict[tuple[str, str], dict[str, str]] = {}
    for logged in sorted(log.decisions, key=lambda one: one.act):
        d = logged.decision
        p = d.suggested_probability
        if d.suggested_type:
            newest[d.unit, d.condition] = {
                "file": result.path, "unit": d.unit, "condition": d.condition,
                "suggested_type": words.get(d.suggested_type, d.suggested_type),
                "probability": f"{p:.6g}" if p == p else "", "settings_digest": d.settings_digest,
                "template_digest": d.template_digest}
    return list(newest.values())
