"""A process that decides on unit after unit and tells each one once the store has taken it.

Usage: python -m tests.io.deciding_child STORE REVIEWER FIRST COUNT
"""

from __future__ import annotations

import sys

from tests.io.stores import decision
from unitclass.io.decisions import DecisionStore


def main() -> None:
    path, reviewer, first, count = sys.argv[1], sys.argv[2], int(sys.argv[3]), int(sys.argv[4])
    with DecisionStore(path, busy_timeout_s=30) as store:
        print("ready", flush=True)
        for i in range(first, first + count):
            store.decide([decision(f"type {i}", unit=str(i), reviewer=reviewer)])
            print(i, flush=True)


if __name__ == "__main__":
    main()
