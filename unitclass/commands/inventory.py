"""`unitclass inventory`: what each file offers, and why each part was recognised."""

from __future__ import annotations

import argparse
from typing import TYPE_CHECKING, Any

from unitclass.commands.options import add_paths, add_run_options, add_session_options

if TYPE_CHECKING:
    from unitclass.records import Recording, Signal


def add_arguments(parser: argparse.ArgumentParser) -> None:
    """Declare the options."""
    add_paths(parser)
    add_session_options(parser)
    add_run_options(parser)


def run(args: argparse.Namespace) -> int:
    """Read every file's structure and print it."""
    import json

    from unitclass.batch import read_planned
    from unitclass.commands.options import plan_from
    from unitclass.commands.progress import say
    from unitclass.commands.runs import exit_code
    from unitclass.commands.views import print_inventory
    from unitclass.errors import UnitclassError
    from unitclass.io.paths import find_files

    plan, recordings, failed = plan_from(args), [], 0
    for path in find_files(args.paths):
        try:
            recordings.append(read_planned(path, plan))
        except UnitclassError as error:
            failed += 1
            say(f"unitclass: {error}")
            continue
        if not args.json:
            print_inventory(recordings[-1])
    if args.json and recordings:
        print(json.dumps([_as_json(recording) for recording in recordings], ensure_ascii=False, indent=1))
    return exit_code(failed, len(recordings))


def _as_json(recording: Recording) -> dict[str, Any]:
    return {
        "file": recording.path, "session": recording.session, "animal": recording.animal,
        "start_s": recording.start_s, "stop_s": recording.stop_s, "reference": recording.reference,
        "reference_reason": recording.reference_reason,
        "nerves": [_signal_as_json(signal) for signal in recording.nerves],
        "units": [{"unit": unit.id, **unit.columns, "notes": list(unit.notes)} for unit in recording.units],
        "membranes": [{"cell": m.electrode.cell, **_signal_as_json(m.signal)} for m in recording.membranes],
        "conditions": [{"condition": c.name, "start_s": c.start_s, "stop_s": c.stop_s}
                       for c in recording.conditions],
        "exclusions": [{"start_s": e.start_s, "stop_s": e.stop_s, "reason": e.reason}
                       for e in recording.exclusions],
        "findings": [{"kind": f.kind, "name": f.name, "location": f.location, "reason": f.reason}
                     for f in recording.findings],
        "missing": list(recording.missing)}


def _signal_as_json(signal: Signal) -> dict[str, Any]:
    return {"name": signal.name, "role": signal.role, "reason": signal.reason, "unit": signal.unit,
            "rate_hz": signal.rate_hz, "form": "integrated" if signal.is_integrated else "raw",
            "form_reason": signal.form_reason, "location": signal.location}
