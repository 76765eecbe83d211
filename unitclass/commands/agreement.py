"""`unitclass agreement`: reviewers compared."""

from __future__ import annotations

import argparse
import math
import sys
from typing import TYPE_CHECKING, Any

from unitclass.commands.options import add_paths

if TYPE_CHECKING:
    from unitclass.review.agreement import AgreementReport, PairAgreement, RatedUnit


def add_arguments(parser: argparse.ArgumentParser) -> None:
    """Declare the options."""
    add_paths(parser)
    parser.add_argument("--store", default="", metavar="FILE", help="file of the reviewers' decisions")
    parser.add_argument("--json", action="store_true", help="JSON on stdout")


def run(args: argparse.Namespace) -> int:
    """Print Cohen's kappa per condition, confusion tables, and the units to discuss."""
    import json

    from unitclass.commands.progress import say
    from unitclass.errors import FileError, NoUsableFileError, UsageError
    from unitclass.io.decisions import DecisionStore
    from unitclass.io.nwb_read import read_identity
    from unitclass.io.paths import find_files
    from unitclass.io.store_place import existing_store
    from unitclass.review.agreement import StoredSession, agreement, rated_units

    file = existing_store(args.paths, args.store)
    if file is None:
        raise UsageError("nobody has labelled these sessions yet", remedy="label them with `unitclass review`")
    sessions, failed = [], 0
    for path in find_files(args.paths):
        try:
            sessions.append(StoredSession(path, *read_identity(path)))
        except FileError as error:
            failed += 1
            say(f"unitclass: {error}")
    if not sessions:
        raise NoUsableFileError("no file was usable", remedy="the lines above say why")
    with DecisionStore(file, is_read_only=True) as store:
        report = agreement(rated_units(store, sessions))
    if args.json:
        print(json.dumps(_as_json(report), ensure_ascii=False, indent=1))
    else:
        _print(report)
    return 1 if failed else 0


def _print(report: AgreementReport) -> None:
    print(f"reviewers: {', '.join(report.reviewers) or 'nobody yet'}")
    if not report.pairs:
        print("no unit was judged by two of them")
    for pair in report.pairs:
        _print_pair(pair)
    for group in report.groups:
        print(f"{group.condition or 'whole session'}: all {len(group.reviewers)} reviewers, Fleiss' kappa "
              f"{_shown(group.kappa.value)} over {group.kappa.n_units} units")
    if report.discuss:
        _print_discuss(report.discuss)


def _print_pair(pair: PairAgreement) -> None:
    from unitclass.commands.views import print_table

    table = pair.confusion
    print(f"{pair.condition or 'whole session'}: {table.first} and {table.second}, Cohen's kappa "
          f"{_shown(pair.kappa.value)} (SE {_shown(pair.kappa.se)}) over {pair.kappa.n_units} units; "
          f"{pair.n_blind} judged blind by both, {pair.n_unseen} accepted in a batch")
    print_table((f"{table.first} \\ {table.second}", *table.types),
                [(name, *(str(int(n)) for n in row)) for name, row in zip(table.types, table.counts, strict=True)],
                sys.stdout)


def _print_discuss(units: tuple[RatedUnit, ...]) -> None:
    from unitclass.commands.views import print_table

    print("to discuss:")
    print_table(("file", "unit", "condition", "opinions", "stands"),
                [(u.path, u.unit, u.condition, ", ".join(f"{o.reviewer}: {o.type}" for o in u.opinions),
                  u.label.type if u.is_settled and u.label else "-") for u in units], sys.stdout)


def _shown(value: float) -> str:
    return f"{value:.3f}" if math.isfinite(value) else "not defined"


def _as_json(report: AgreementReport) -> dict[str, Any]:
    return {
        "reviewers": list(report.reviewers),
        "pairs": [{"condition": p.condition, "first": p.confusion.first, "second": p.confusion.second,
                   "kappa": _number(p.kappa.value), "se": _number(p.kappa.se), "n_units": p.kappa.n_units,
                   "n_blind": p.n_blind, "n_batch": p.n_unseen, "types": list(p.confusion.types),
                   "confusion": p.confusion.counts.tolist()} for p in report.pairs],
        "groups": [{"condition": g.condition, "reviewers": list(g.reviewers), "kappa": _number(g.kappa.value),
                    "n_units": g.kappa.n_units} for g in report.groups],
        "discuss": [{"file": u.path, "unit": u.unit, "condition": u.condition, "is_settled": u.is_settled,
                     "opinions": {o.reviewer: o.type for o in u.opinions}} for u in report.discuss]}


def _number(value: float) -> float | None:
    return float(f"{value:.6g}") if math.isfinite(value) else None
