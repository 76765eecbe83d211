"""`unitclass completion`: the script that makes a shell complete commands, options and files."""

from __future__ import annotations

import argparse

SHELLS = ("bash", "zsh", "fish")


def add_arguments(parser: argparse.ArgumentParser) -> None:
    """Declare the options."""
    parser.add_argument("shell", choices=SHELLS, help="e.g. in bash: eval \"$(unitclass completion bash)\"")


def run(args: argparse.Namespace) -> int:
    """Print the script; the shell asks this program's own parser at every TAB."""
    from argcomplete.shell_integration import shellcode

    print(shellcode(["unitclass"], shell=args.shell))
    return 0
