"""`unitclass settings`: every tunable number in force."""

from __future__ import annotations

import argparse
import math
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from unitclass.settings import Tunable


def add_arguments(parser: argparse.ArgumentParser) -> None:
    """Declare the options."""
    parser.add_argument("--settings", default="", metavar="FILE", help="settings file (TOML) to check and show")
    parser.add_argument("--json", action="store_true", help="JSON on stdout")


def run(args: argparse.Namespace) -> int:
    """Print the settings in force as a commented settings file, or as JSON."""
    import json

    from unitclass.commands.options import settings_from
    from unitclass.io.settings_file import settings_path

    tunables = list(settings_from(args).tunables())
    if args.json:
        print(json.dumps([_as_json(t) for t in tunables], ensure_ascii=False, indent=1))
        return 0
    print(f"# The settings in force. Keep the lines you change in {settings_path()}")
    group = ""
    for tunable in tunables:
        if tunable.name.split(".")[0] != group:
            group = tunable.name.split(".")[0]
            print(f"\n[{group}]")
        print(f"{_as_toml(tunable)}  # {_comment(tunable)}")
    return 0


def _comment(t: Tunable) -> str:
    span = f"{t.low:g} to {t.high:g} {t.unit}" if math.isfinite(t.low) else ""
    return "; ".join(part for part in (t.meaning, span, t.source) if part)


def _as_toml(t: Tunable) -> str:
    value: Any = t.value
    if isinstance(value, bool):
        shown = str(value).lower()
    elif isinstance(value, str):
        shown = f'"{value}"'
    elif isinstance(value, tuple):
        shown = "[" + ", ".join(f'"{item}"' for item in value) + "]"
    elif isinstance(value, dict):
        shown = "{" + ", ".join(f'"{k}" = "{v}"' for k, v in value.items()) + "}"
    else:
        shown = str(value)
    return f"{t.name.split('.')[1]} = {shown}"


def _as_json(t: Tunable) -> dict[str, Any]:
    return {"name": t.name, "value": t.value, "unit": t.unit, "low": t.low if math.isfinite(t.low) else None,
            "high": t.high if math.isfinite(t.high) else None, "meaning": t.meaning, "source": t.source}
