"""`report`: seconds for a session of 200 units, and what a page of 1,000 units weighs.

`python -m tests.benchmarks.report FOLDER` simulates both sessions into FOLDER (kept for the next run).
"""

from __future__ import annotations

import argparse
import os
import shutil
import subprocess
import sys
import time
from pathlib import Path


def made(folder: Path, n_units: int) -> Path:
    """Return a session, simulated when it is not there yet."""
    from unitclass.simulate import simulate_session, write_session

    path = folder / f"units-{n_units}.nwb"
    if not path.exists():
        write_session(simulate_session("three-phase", seed=3, n_units=n_units, stem=path.stem), path)
    return path


def timed(*words: str) -> float:
    """Return the seconds that the program takes."""
    start = time.perf_counter()
    subprocess.run([sys.executable, "-m", "unitclass", *words, "--quiet", "--force"], check=True, stdout=subprocess.DEVNULL)
    return time.perf_counter() - start


def main() -> None:
    """Print the table."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("folder", type=Path)
    folder = parser.parse_args().folder
    folder.mkdir(parents=True, exist_ok=True)
    print(f"{os.cpu_count()} cores")
    print("units  classify s  report s  page MB")
    for n_units in (200, 1000):
        path, out = made(folder, n_units), folder / "report"
        shutil.rmtree(out, ignore_errors=True)
        judged = timed("classify", str(path), "--fresh", "--table", str(folder / "t.csv"))
        whole = timed("report", str(path), "--out", str(out), "--fresh")
        size = (out / f"{path.stem}.html").stat().st_size / 1e6
        print(f"{n_units:5d}  {judged:10.1f}  {whole:8.1f}  {size:7.2f}")


if __name__ == "__main__":
    main()
