"""`unitclass types`: the firing types and the template families behind them."""

from __future__ import annotations

import argparse
from typing import TYPE_CHECKING

from unitclass.commands import types_learn

if TYPE_CHECKING:
    from unitclass.classify.templates import Family

BARS = " .:-=+*#%@"  # one character a phase bin: readable in any terminal


def add_arguments(parser: argparse.ArgumentParser) -> None:
    """Declare the options."""
    sub = parser.add_subparsers(dest="what", metavar="list|show|check|learn", required=True)
    for name, words in (("list", "all types, a line each"), ("show", "one type in full"),
                        ("check", "whether template files are right")):
        command = sub.add_parser(name, help=words, description=words[0].upper() + words[1:] + ".")
        command.add_argument("--templates", default="", metavar="FILE|NAME", help="template families to use")
        if name == "show":
            command.add_argument("type", metavar="TYPE", help="id of the type, e.g. early-I")
        if name == "check":
            command.add_argument("files", nargs="*", metavar="FILE", help="family files; none checks the set in force")
        command.add_argument("--json", action="store_true", help="JSON on stdout")
    learn = sub.add_parser("learn", help="a new family from units that belong together",
                           description="Write a template family made from labelled units, a shape group or units named.")
    types_learn.add_arguments(learn)


def run(args: argparse.Namespace) -> int:
    """List, show, check or learn."""
    return {"list": _list, "show": _show, "check": _check, "learn": types_learn.run}[args.what](args)


def _list(args: argparse.Namespace) -> int:
    import json
    import sys

    from unitclass.commands.views import print_table
    from unitclass.io.template_files import read_library

    families = read_library(args.templates).families
    if args.json:
        print(json.dumps([_as_json(f) for f in families], ensure_ascii=False, indent=1))
        return 0
    print_table(("type", "fires", "also called"), [(f.id, f.words, ", ".join(f.also)) for f in families], sys.stdout)
    return 0


def _as_json(family: Family) -> dict[str, object]:
    return {"type": family.id, "form": family.form, "words": family.words, "also": list(family.also),
            "prior": dict(family.prior), "membrane": dict(family.membrane),
            "ranges": {name: list(span) for name, span in family.ranges.items()},
            "points": [list(point) for point in family.points], "sources": list(family.sources)}


def _show(args: argparse.Namespace) -> int:
    from unitclass.errors import UsageError
    from unitclass.io.template_files import read_library

    library = read_library(args.templates)
    try:
        family = library.family(args.type)
    except KeyError:
        raise UsageError(f"no type called {args.type!r}",
                         remedy="the types are: " + ", ".join(f.id for f in library.families)) from None
    if args.json:
        import json

        print(json.dumps(_as_json(family), ensure_ascii=False, indent=1))
        return 0
    print(f"{family.id}: {family.words}")
    if family.also:
        print(f"also called {', '.join(family.also)}")
    print(f"form: {family.form}")
    for regime, weight in family.prior.items():
        print(f"prior weight in {regime} rhythm: {weight:g}")
    for phase, sign in family.membrane.items():
        side = {1: "depolarised", -1: "hyperpolarised", 0: "near its mean"}[sign]
        print(f"membrane potential in {phase}: {side}")
    for name, (low, high) in family.ranges.items():
        print(f"{name}: {low:g} to {high:g}{' ms' if name.endswith('_ms') else ''}")
    print(f"sources: {'; '.join(family.sources)}")
    _print_picture(family)
    return 0


def _print_picture(family: Family) -> None:
    """Print a few profiles of the family, drawn evenly from its draws, a line each."""
    import numpy as np

    from unitclass.classify.draws import USUAL, draw_profiles

    profiles = draw_profiles(family, USUAL, n_bins=40, n_draws=8)
    print("eight cells that it would hold (TI 1 s, TE 2 s):")
    print("  " + "inspiration".center(20, "_") + "|" + "expiration".center(20, "_"))
    for profile in profiles:
        level = np.minimum((profile / profile.max() * len(BARS)).astype(int), len(BARS) - 1)
        drawn = "".join(BARS[i] for i in level)
        print(f"  {drawn[:20]}|{drawn[20:]}")


def _check(args: argparse.Namespace) -> int:
    from pathlib import Path

    from unitclass.io.template_files import read_family, read_library

    right = [(file, read_family(Path(file)).id) for file in args.files]
    library = None if right else read_library(args.templates)
    if args.json:
        import json

        print(json.dumps([{"file": file, "type": name} for file, name in right] if library is None else {
            "templates": library.name, "n_families": len(library.families), "digest": library.digest()}))
        return 0
    for file, name in right:
        print(f"{file}: {name} is right")
    if library is not None:
        print(f"{library.name}: {len(library.families)} families are right, digest {library.digest()}")
    return 0
