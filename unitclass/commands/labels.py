"""The standing labels of a session, if its decisions are on disk."""

from __future__ import annotations

import argparse
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
