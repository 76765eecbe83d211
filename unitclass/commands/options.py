"""Options that several subcommands share, and what they amount to."""

from __future__ import annotations

import argparse
import os
from dataclasses import replace
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from unitclass.batch import Plan
    from unitclass.io.condition_table import ConditionTable
    from unitclass.settings import Settings


def add_paths(parser: argparse.ArgumentParser) -> None:
    """Add the files to work on."""
    parser.add_argument("paths", nargs="+", metavar="PATH",
                        help="NWB file, folder (searched for .nwb; labelled copies are skipped) or glob")


def add_session_options(parser: argparse.ArgumentParser) -> None:
    """Add what tells the program how to read and judge sessions."""
    group = parser.add_argument_group("reading")
    group.add_argument("--nerve", default="", metavar="NAME", help="the nerve that defines inspiration")
    group.add_argument("--condition-column", default="", metavar="NAME",
                       help="column of the intervals table that names the condition")
    group.add_argument("--conditions", default="", metavar="FILE.csv",
                       help="plain table: file, start_s, stop_s, condition, animal, cell")
    group.add_argument("--only", default="", metavar="CONDITION", help="this condition alone")
    group.add_argument("--templates", default="", metavar="FILE|NAME", help="template families to use")
    group.add_argument("--regime", default="", choices=("auto", "three-phase", "two-phase", "one-phase"),
                       help="state the rhythm regime instead of judging it")
    group.add_argument("--settings", default="", metavar="FILE", help="settings file (TOML)")
    group.add_argument("--store", default="", metavar="FILE", help="file of the reviewers' decisions")


def add_run_options(parser: argparse.ArgumentParser) -> None:
    """Add how to run and report."""
    group = parser.add_argument_group("running")
    group.add_argument("--workers", type=int, default=1, metavar="N", help="files worked on at once")
    group.add_argument("--scheduler", default="", metavar="ADDRESS",
                       help="work on a Dask cluster, e.g. tcp://host:8786, whose workers see the same files")
    group.add_argument("--fresh", action="store_true", help="analyse again even what is known from an earlier run")
    group.add_argument("--json", action="store_true", help="JSON on stdout")
    group.add_argument("--quiet", action="store_true", help="no progress, no notes")
    group.add_argument("--force", action="store_true", help="replace files that exist")


def add_crosswalk(parser: argparse.ArgumentParser) -> None:
    """Add the other laboratory's words."""
    parser.add_argument("--crosswalk", default="", metavar="FILE.csv",
                        help="write types in another laboratory's words: columns type, word")


def settings_from(args: argparse.Namespace) -> Settings:
    """Return the settings in force, the command line's own words laid over the file's."""
    from unitclass.io.settings_file import find_settings

    settings = find_settings(getattr(args, "settings", ""))
    regime = getattr(args, "regime", "")
    return replace(settings, classify=replace(settings.classify, regime=regime)) if regime else settings


def plan_from(args: argparse.Namespace) -> Plan:
    """Return how every file of this run is read and judged."""
    from unitclass.batch import Plan
    from unitclass.io.store_place import existing_store
    from unitclass.io.template_files import read_library

    store = existing_store(args.paths, args.store)
    return Plan(settings=settings_from(args), library=read_library(args.templates), nerve=args.nerve,
                condition_column=args.condition_column, only=args.only, store=os.path.abspath(store) if store else "",
                condition_table=condition_table(args), is_debug=getattr(args, "debug", False))


def condition_table(args: argparse.Namespace) -> ConditionTable | None:
    """Return the plain table of conditions; None when none is named."""
    from unitclass.io.condition_table import read_condition_table

    return read_condition_table(args.conditions) if args.conditions else None
