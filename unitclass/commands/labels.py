"""The standing labels of a session, if its decisions are on disk."""

from __future__ import annotations

import argparse
from collections.abc import Mapping
from functools import lru_cache
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from unitclass.records import Labels, SessionResult


def labels_of(result: SessionResult, args: argparse.Namespace) -> Labels:
    """Return what people decided of this session's units; empty when there is no store."""
    from unitclass.io.store_place import existing_store

    file = existing_store(args.paths, args.store)
    if file is None:
        return {}
    from unitclass.io.decisions import DecisionStore

    digests = {unit.unit: unit.digest for _, unit in result.units()}
    with DecisionStore(file, is_read_only=True) as store:
        return store.labels_for(result.identifier, result.object_id, digests)


def in_words(result: SessionResult, args: argparse.Namespace) -> tuple[SessionResult, Labels]:
    """Return a session's results and labels in the words that outputs are to use."""
    labels, words = labels_of(result, args), _words(args.crosswalk, args.templates)
    if not words:
        return result, labels
    from unitclass.classify.crosswalk import in_other_words, labels_in_other_words

    return in_other_words(result, words), labels_in_other_words(labels, words)


@lru_cache(maxsize=1)
def _words(crosswalk: str, templates: str) -> Mapping[str, str]:
    if not crosswalk:
        return {}
    from unitclass.io.crosswalk_file import read_crosswalk
    from unitclass.io.template_files import read_library
    from unitclass.records import OTHER, SILENT, UNDETERMINED

    known = [family.id for family in read_library(templates).families]
    return read_crosswalk(crosswalk, (*known, OTHER, SILENT, UNDETERMINED))


def seen_rows(result: SessionResult, args: argparse.Namespace) -> list[dict[str, str]]:
    """Return the suggestions that people saw when they decided, the newest of each unit, as rows of an older table."""
    from unitclass.io.store_place import existing_store

    file = existing_store(args.paths, args.store)
    if file is None:
        return []
    from unitclass.io.decisions import DecisionStore

    with DecisionStore(file, is_read_only=True) as store:
        log = store.read(result.identifier, result.object_id)
    newest: dict[tuple[str, str], dict[str, str]] = {}
    for logged in sorted(log.decisions, key=lambda one: one.act):
        d = logged.decision
        p = d.suggested_probability
        if d.suggested_type:
            newest[d.unit, d.condition] = {
                "file": result.path, "unit": d.unit, "condition": d.condition, "suggested_type": d.suggested_type,
                "probability": f"{p:.6g}" if p == p else "", "settings_digest": d.settings_digest,
                "template_digest": d.template_digest}
    return list(newest.values())
