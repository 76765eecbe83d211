"""The standing labels of a session, if its decisions are on disk."""

from __future__ import annotations

import argparse
from pathlib import Path
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from unitclass.records import Labels, SessionResult


def store_file(path: str, store: str) -> Path:
    """Return the file of decisions for a session: --store, else the one beside the data."""
    return Path(store) if store else Path(path).parent / "unitclass.sqlite"


def labels_of(result: SessionResult, args: argparse.Namespace) -> Labels:
    """Return what people decided of this session's units; empty when there is no store."""
    file = store_file(result.path, args.store)
    if not file.is_file():
        return {}
    from unitclass.io.decisions import DecisionStore

    digests = {unit.unit: unit.digest for _, unit in result.units()}
    with DecisionStore(file, is_read_only=True) as store:
        return store.labels_for(result.identifier, result.object_id, digests)
