"""The real program on invented results: `python -m tests.tui.fake_review FOLDER [option ...]`.

Options: `hostile` names and notes that hold escapes, markup and more; `vm` an intracellular cell;
`pending` two files that are analysed while the program runs, one of which fails; `empty` no result
at all; `blind`; `light` and `nomouse` settings; `as=NAME` the reviewer.
"""

from __future__ import annotations

import os
import sys
import time
from dataclasses import replace
from pathlib import Path

from unitclass.errors import FileError, UnitclassError
from unitclass.records import SessionResult

HOSTILE = ("\x1b[2J\x1b]0;owned\x07", "[bold red]unit[/]", "a\nb\tc", "\u202egnp.exe\u2066", "神経", "\x9b31m",
           "e\u0301" * 4, "\x00\x07\x08")
TYPES = ("early-I", "post-I", "aug-E", "ramp-I", "late-E", "pre-I")


def results(option: str = "", path: str = "rig/heron_04.nwb") -> SessionResult:
    """Return the session that the program shows."""
    from tests.results import session_result, vm_result

    names = HOSTILE if option == "hostile" else tuple(str(n) for n in range(1, 31))
    session = session_result(path, units={name: TYPES[i % len(TYPES)] for i, name in enumerate(names)})
    session = replace(session, conditions=tuple(replace(c, units=tuple(
        replace(u, digest=f"digest-{i}") for i, u in enumerate(c.units))) for c in session.conditions))
    if option == "vm":
        first = session.conditions[0]
        session = replace(session, conditions=(replace(first, units=(vm_result(),)),))
    return session


def analyse(path: str) -> SessionResult:
    """Stand in for the analysis."""
    time.sleep(0.2)
    print("a library that prints")
    os.write(2, b"and one that writes below Python\n")
    if "broken" in path:
        raise FileError("no units and no membrane potential", where=path, remedy="name another file")
    session = results(path=path)
    return replace(session, identifier=path, object_id=path)


def export(path: str, result: SessionResult, labels: object, target: str, is_replacing: bool) -> str:
    """Stand in for the export: say what would be written."""
    if is_replacing or not Path(target).exists():
        Path(target).write_text(f"{len(labels)} labels")  # type: ignore[arg-type]
    return target


def library():  # type: ignore[no-untyped-def]
    """Return the types that come with the program."""
    from unitclass.io.template_files import read_library

    return read_library()


def main(folder: Path, options: list[str]) -> int:
    """Run the review."""
    from unitclass.io.decisions import DecisionStore
    from unitclass.review.session import ReviewSession
    from unitclass.settings import Settings
    from unitclass.tui.app import ReviewApp, run_review

    told = dict(option.partition("=")[::2] for option in options)
    settings = Settings.from_mapping({"review": {"mouse": "nomouse" not in told,
                                                 "background": "light" if "light" in told else "auto"}})
    session = ReviewSession(DecisionStore(folder / "decisions.sqlite"), told.get("as", "Ada Fischer"),
                            is_blind="blind" in told)
    pending = [str(folder / "further.nwb"), str(folder / "broken.nwb")] if "pending" in told else []
    session.expect(pending)
    if "empty" not in told:
        session.add_result(results(next((o for o in told if o in ("hostile", "vm")), ""),
                                   str(folder / "heron_04.nwb")))
    app = ReviewApp(session, analyse=analyse, pending=pending, export=export, library=library,
                    settings=settings)
    try:
        return run_review(app, mouse=settings.review.mouse)
    except UnitclassError as error:
        print(f"unitclass: {error}", file=sys.stderr)
        return error.exit_code


if __name__ == "__main__":
    sys.exit(main(Path(sys.argv[1]), sys.argv[2:]))
