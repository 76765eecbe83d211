"""The command line: one parser, a subcommand a file. Imports nothing heavy, so help is instant."""

from __future__ import annotations

import argparse
import importlib
import sys
from collections.abc import Sequence
from typing import NoReturn

from unitclass import __version__

COMMANDS: tuple[tuple[str, str], ...] = (
    ("demo", "the main job on a sample session, start to end"),
    ("inventory", "what each file offers, and why each part was recognised"),
    ("cycles", "respiratory cycles: table and summary"),
    ("classify", "suggested firing type of every unit in every condition"),
    ("review", "label the units in the terminal"),
    ("export", "labelled NWB copies and tables"),
    ("report", "a page per session and over all, with figures, to read, print and cite"),
    ("agreement", "reviewers compared"),
    ("types", "the firing types and the template families behind them"),
    ("simulate", "demo sessions with known answers"),
    ("completion", "a script that completes commands in bash, zsh or fish"),
    ("settings", "every tunable number in force, with unit, range, meaning and source"),
)


class Parser(argparse.ArgumentParser):
    """An argument parser whose errors are one line."""

    def error(self, message: str) -> NoReturn:
        """Print one line and stop with exit code 2."""
        print(f"{self.prog}: {message}; see `{self.prog} --help`", file=sys.stderr)
        sys.exit(2)


def build_parser() -> argparse.ArgumentParser:
    """Return the whole command line."""
    parser = Parser(prog="unitclass", description="Name the firing types of respiratory neurons in NWB sessions: "
                    "cycles from the nerve, phase histograms, types with probabilities, review, labelled NWB.",
                    epilog="Start with `unitclass demo`. Each command has its own --help.")
    parser.add_argument("--version", action="version", version=f"unitclass {__version__}")
    subparsers = parser.add_subparsers(metavar="COMMAND", required=True, parser_class=Parser)
    for name, summary in COMMANDS:
        command = subparsers.add_parser(name, help=summary, description=summary[0].upper() + summary[1:] + ".")
        command.add_argument("--debug", action="store_true", help="show the traceback of an error")
        module = importlib.import_module(f"unitclass.commands.{name}")
        module.add_arguments(command)
        command.set_defaults(run=module.run)
    return parser


def parse(argv: Sequence[str]) -> argparse.Namespace:
    """Return the parsed arguments."""
    return build_parser().parse_args(argv)
