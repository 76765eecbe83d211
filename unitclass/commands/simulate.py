"""`unitclass simulate`: demo sessions with known answers."""

from __future__ import annotations

import argparse

KINDS = ("three-phase", "pons-removed", "slice", "hypercapnia", "intracellular")


def add_arguments(parser: argparse.ArgumentParser) -> None:
    """Declare the options."""
    parser.add_argument("kind", choices=(*KINDS, "samples"), metavar="KIND",
                        help="one of " + ", ".join(KINDS) + "; or samples, which writes the sample sessions again")
    parser.add_argument("--out", required=True, metavar="DIR", help="folder to write to")
    parser.add_argument("--seed", type=int, default=1, help="same seed, same session")
    parser.add_argument("--seconds", type=float, default=0.0, help="length of each condition")
    parser.add_argument("--n-units", type=int, default=0, metavar="N", help="number of units")
    parser.add_argument("--raw-rate-hz", type=float, default=0.0, metavar="HZ", help="sampling rate of raw nerves")
    parser.add_argument("--cell", default="", metavar="TYPE", help="type of the impaled cell (intracellular only)")
    parser.add_argument("--json", action="store_true", help="JSON on stdout")
    parser.add_argument("--quiet", action="store_true", help="no messages")
    parser.add_argument("--force", action="store_true", help="replace files that exist")


def run(args: argparse.Namespace) -> int:
    """Simulate, write, and name what was written."""
    from pathlib import Path

    from unitclass.commands.progress import say
    from unitclass.commands.runs import Written
    from unitclass.simulate.samples import write_samples
    from unitclass.simulate.session import simulate_session
    from unitclass.simulate.write import write_session

    folder = Path(args.out)
    if args.kind == "samples":
        written = write_samples(folder, force=args.force)
    else:
        session = simulate_session(args.kind, seed=args.seed, seconds=args.seconds, n_units=args.n_units,
                                   raw_rate_hz=args.raw_rate_hz, cell=args.cell)
        written = [write_session(session, folder / f"{session.scenario.stem}.nwb", force=args.force)]
    told = Written(args)
    for path in written:
        told.add(path)
    told.end()
    say("the true types stand beside each session in STEM.truth.csv", quiet=args.quiet)
    return 0
