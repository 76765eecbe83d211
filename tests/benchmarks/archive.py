"""`classify` over an archive: 100 sessions of the sample's size with one and with two workers, then again.

`python -m tests.benchmarks.archive FOLDER` copies the sample 100 times into FOLDER.
"""

from __future__ import annotations

import argparse
import os
import shutil
import subprocess
import sys
import time
from pathlib import Path

from unitclass.io.resolver import samples_folder

N_SESSIONS = 100


def classify(folder: Path, *words: str) -> float:
    """Return the wall seconds of one run over the folder, start-up included."""
    table = folder.parent / "archive.csv"
    start = time.perf_counter()
    subprocess.run([sys.executable, "-m", "unitclass", "classify", str(folder), "--table", str(table), "--force",
                    "--quiet", *words], check=True, stdout=subprocess.DEVNULL)
    return time.perf_counter() - start


def main() -> None:
    """Print the table."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("folder", type=Path)
    folder = parser.parse_args().folder / "archive"
    folder.mkdir(parents=True, exist_ok=True)
    for i in range(N_SESSIONS):
        shutil.copyfile(samples_folder() / "quill-baseline.nwb", folder / f"session-{i:03d}.nwb")
    os.environ["XDG_CACHE_HOME"] = str(folder.parent / "cache")
    print(f"{os.cpu_count()} cores; {N_SESSIONS} sessions")
    one, two = classify(folder, "--fresh", "--workers", "1"), classify(folder, "--fresh", "--workers", "2")
    print(f"one worker {one:.1f} s, two workers {two:.1f} s: {one / two:.2f} times as fast")
    first, again = classify(folder, "--workers", "2"), classify(folder, "--workers", "2")
    print(f"keeping results {first:.1f} s, a second run with nothing new {again:.1f} s")


if __name__ == "__main__":
    main()
