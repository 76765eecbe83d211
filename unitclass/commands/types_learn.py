"""`unitclass types learn`: a new family file from units that belong together."""

from __future__ import annotations

import argparse
from typing import TYPE_CHECKING

from unitclass.commands.options import add_paths, add_run_options, add_session_options

if TYPE_CHECKING:
    from collections.abc import Sequence

    from unitclass.analysis.groups import ShapedRow
    from unitclass.records import Labels, SessionResult, UnitResult


def add_arguments(parser: argparse.ArgumentParser) -> None:
    """Declare the options."""
    parser.add_argument("type", metavar="TYPE", help="id of the new type, or of the one to be drawn anew")
    add_paths(parser)
    chosen = parser.add_mutually_exclusive_group()
    chosen.add_argument("--labelled", default="", metavar="TYPE",
                        help="units that a person gave this label (default: the new type's id)")
    chosen.add_argument("--group", default="", metavar="NAME", help="units of this shape group, e.g. G3")
    chosen.add_argument("--units", default="", metavar="ID,ID", help="these units")
    parser.add_argument("--words", default="", help="how the type fires, in words, for tables")
    parser.add_argument("--out", default="", metavar="FILE.toml", help="where to write (default: TYPE.toml)")
    add_session_options(parser)
    add_run_options(parser)


def run(args: argparse.Namespace) -> int:
    """Analyse the files, choose the units, write the family."""
    import numpy as np

    from unitclass.classify.family_making import LEAST_UNITS, family_from_units
    from unitclass.commands.labels import labels_of
    from unitclass.commands.options import plan_from
    from unitclass.commands.runs import exit_code, run_files
    from unitclass.errors import UsageError
    from unitclass.io.atomic import check_target
    from unitclass.io.template_files import write_family

    target = args.out or f"{args.type}.toml"
    check_target(target, force=args.force)
    plan = plan_from(args)
    outcomes = list(run_files(args, plan))
    results = [outcome.result for outcome in outcomes if outcome.result is not None]
    code = exit_code(len(outcomes) - len(results), len(results))
    units, regimes = _chosen(results, [labels_of(result, plan) for result in results], args)
    if len(units) < LEAST_UNITS:
        raise UsageError(f"{len(units)} units are too few for a family", where=_said(args),
                         remedy=f"choose {LEAST_UNITS} or more with --labelled, --group or --units")
    family = family_from_units(
        args.type, np.stack([unit.histogram.counts for unit in units]),
        np.stack([unit.histogram.exposure_s for unit in units]), regimes,
        words=args.words or f"like the {len(units)} units it was learned from",
        source=f"{len(units)} units of {len(results)} files, {_said(args)}")
    write_family(family, target, force=args.force)
    if args.json:
        import json

        print(json.dumps({"file": target, "type": args.type, "n_units": len(units)}, ensure_ascii=False))
        return code
    print(f"{target}: {args.type} from {len(units)} units; read it, then use it with --templates {target}")
    return code


def _chosen(results: Sequence[SessionResult], labels: Sequence[Labels],
            args: argparse.Namespace) -> tuple[list[UnitResult], list[str]]:
    """Return the units to learn from, and the rhythm in which each was recorded."""
    wanted = _in_group(results, args.group) if args.group else None
    ids, label = set(args.units.split(",")) - {""}, args.labelled or args.type
    units, regimes, row = [], [], 0
    for result, named in zip(results, labels, strict=True):
        for condition, unit in result.units():
            given = named.get(unit.key)
            is_chosen = (row in wanted if wanted is not None else unit.unit in ids if ids
                         else given is not None and given.type == label)
            row += 1
            if is_chosen and unit.n_spikes:
                units.append(unit)
                regimes.append(condition.regime)
    return units, regimes


def _in_group(results: Sequence[SessionResult], name: str) -> set[int]:
    """Return which rows of all results together are in a shape group."""
    from unitclass.analysis.groups import groups_of, shaped_rows

    shapes: list[ShapedRow] = []
    first = 0
    for result in results:
        shapes += shaped_rows(result, first=first)
        first += sum(1 for _ in result.units())
    return {shape.row for shape, group in zip(shapes, groups_of(shapes).names, strict=True) if group == name}


def _said(args: argparse.Namespace) -> str:
    """Return in words how the units were chosen."""
    if args.group:
        return f"shape group {args.group}"
    return f"units {args.units}" if args.units else f"labelled {args.labelled or args.type}"
