"""`classify` on a long session: wall time against a plain read of the same data, and peak memory.

`python -m tests.benchmarks.main_job FOLDER [--hours 1 4]` writes the sessions into FOLDER (kept for
the next run) and prints a table: wall seconds of the whole program in a process of its own, of a plain
h5py read of the reference nerve and all spike times, their ratio, and the peak memory.
"""

from __future__ import annotations

import argparse
import os
import subprocess
import sys
import time
from pathlib import Path

RATE_HZ, N_UNITS = 20_000.0, 200
MAKE = f"""
import sys
from pathlib import Path
from unitclass.simulate import simulate_session, write_session
path, hours = Path(sys.argv[1]), float(sys.argv[2])
write_session(simulate_session("hypercapnia", seed=2, seconds=1800 * hours, n_units={N_UNITS}, raw_rate_hz={RATE_HZ},
                               stem=path.stem), path)
"""
READ = """
import sys, time, h5py
start = time.perf_counter()
with h5py.File(sys.argv[1], "r") as file:
    data = file["acquisition"][sys.argv[2]]["data"]
    for first in range(0, data.shape[0], 2_000_000):
        data[first : first + 2_000_000]
    n = file["units/spike_times"][:].size
print(time.perf_counter() - start, n)
"""


def made(folder: Path, hours: float) -> Path:
    """Return the session, simulated when it is not there yet."""
    path = folder / f"hours-{hours:g}.nwb"
    if not path.exists():
        # In a process of its own: what a child is said to have used at most includes what its parent held.
        subprocess.run([sys.executable, "-c", MAKE, str(path), str(hours)], check=True)
    return path


def plain_read(path: Path, nerve: str) -> tuple[float, int]:
    """Return the seconds of a plain read, and the number of spikes."""
    out = subprocess.run([sys.executable, "-c", READ, str(path), nerve], check=True, capture_output=True, text=True)
    seconds, n_spikes = out.stdout.split()
    return float(seconds), int(n_spikes)


def classify(path: Path, table: Path) -> tuple[float, float]:
    """Return wall seconds and peak memory in MB of the whole program."""
    command = [sys.executable, "-m", "unitclass", "classify", str(path), "--table", str(table), "--force", "--quiet",
               "--fresh"]
    start = time.perf_counter()
    with subprocess.Popen(command, stdout=subprocess.DEVNULL) as process:
        _, status, used = os.wait4(process.pid, 0)
        process.returncode = os.waitstatus_to_exitcode(status)
    if process.returncode:
        raise SystemExit(f"classify ended with exit code {process.returncode}")
    return time.perf_counter() - start, used.ru_maxrss / 1024


def main() -> None:
    """Print the table."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("folder", type=Path)
    parser.add_argument("--hours", type=float, nargs="+", default=[1.0])
    args = parser.parse_args()
    args.folder.mkdir(parents=True, exist_ok=True)
    print(f"{os.cpu_count()} cores; two nerves at {RATE_HZ:g} Hz, int16, gzip; {N_UNITS} units")
    print("hours  spikes    plain read s  classify s  ratio  peak MB")
    for hours in args.hours:
        path = made(args.folder, hours)
        plain, n_spikes = min(plain_read(path, "Phr") for _ in range(3))
        wall, peak = min(classify(path, args.folder / "table.csv") for _ in range(2))
        print(f"{hours:5g}  {n_spikes:8d}  {plain:12.2f}  {wall:10.2f}  {wall / plain:5.1f}  {peak:7.0f}")


if __name__ == "__main__":
    main()
