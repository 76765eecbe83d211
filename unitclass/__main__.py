"""The program's entry: parse, run one subcommand, turn errors into one line and an exit code."""

from __future__ import annotations

import os
import sys
from collections.abc import Sequence

from unitclass.errors import UnitclassError

INTERRUPTED = 130
# Our matrices are small: a second thread of the linear algebra library spins longer than it helps
# (measured: half the CPU time, and worker processes no longer in each other's way). A user's own value stays.
ONE_THREAD = ("OPENBLAS_NUM_THREADS", "OMP_NUM_THREADS", "MKL_NUM_THREADS")


def main(argv: Sequence[str] | None = None) -> int:
    """Run the program and return its exit code.

    Parameters
    ----------
    argv : sequence of str, optional
        Arguments without the program's name; the process's own by default.
    """
    for name in ONE_THREAD:
        os.environ.setdefault(name, "1")
    from unitclass.commands.parser import build_parser

    parser = build_parser()
    if "_ARGCOMPLETE" in os.environ:  # a shell asks what could stand here; see commands.completion
        import argcomplete

        argcomplete.autocomplete(parser)
    args = parser.parse_args(argv)
    try:
        code: int = args.run(args)
        sys.stdout.flush()
        return code
    except UnitclassError as error:
        if args.debug:
            raise
        print(f"unitclass: {error}", file=sys.stderr)
        return error.exit_code
    except KeyboardInterrupt:
        print("unitclass: interrupted; what was finished is whole, and the same command goes on from there",
              file=sys.stderr)
        return INTERRUPTED
    except BrokenPipeError:
        # The reader of a pipe went away (`| head`): not an error. Python would complain at exit.
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
        return 0


if __name__ == "__main__":
    sys.exit(main())
