"""How well spikes are found in a membrane potential, and how fast.

    python -m tests.benchmarks.membrane            the table of F1 and timing error, and the speed
    python -m tests.benchmarks.membrane --minutes 60 --only speed

The table: spike height by noise by sampling rate, unfiltered and filtered, on traces whose spike
times are known (`tests/simulators/membrane.py`; two widths of spike, a seed of its own for each). The
speed: a file of 20 kHz potential (16 bit, gzip) to spikes and mean potential, over the plain read of
the same data with h5py in pieces of ten seconds.
"""

from __future__ import annotations

import argparse
import multiprocessing
import os
import resource
import tempfile
import time
from pathlib import Path

import h5py
import numpy as np

from tests.simulators.membrane import Recipe, Shape, membrane_trace
from tests.simulators.membrane_checks import matched, membrane_of_trace, membrane_on
from unitclass.io.chunk_readers import Column, EvenChunks, Stretch
from unitclass.phase.vm_profile import vm_profile
from unitclass.records import Cycles
from unitclass.settings import MembraneSettings
from unitclass.signals.vm_spikes import find_vm_spikes

HEIGHTS_MV = (12.0, 25.0, 40.0, 70.0)
NOISES_MV = (0.5, 1.0, 2.0)
RATES = ((5000.0, 0.0), (10000.0, 0.0), (20000.0, 0.0), (20000.0, 2000.0), (50000.0, 0.0), (50000.0, 5000.0))
GAIN = 1 / 32
SPEED_HZ = 20000


def main() -> None:
    """Print the table and the speed."""
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("--minutes", type=int, default=60, help="length of the file for the speed")
    parser.add_argument("--seconds", type=float, default=40.0, help="length of each trace of the table")
    parser.add_argument("--only", choices=("table", "speed"), default="")
    given = parser.parse_args()
    print(f"{os.cpu_count()} cores")
    if given.only != "speed":
        print_table(given.seconds)
    if given.only != "table":
        print_speed(given.minutes)


def print_table(seconds: float) -> None:
    """Print F1, and median and 95th percentile of the timing error, as a table."""
    print("\n| height mV | noise mV | rate kHz | low-pass kHz | F1 | error ms, median | error ms, 95 % |")
    print("|---|---|---|---|---|---|---|")
    for height in HEIGHTS_MV:
        for noise in NOISES_MV:
            for rate_hz, low_pass_hz in RATES:
                f1, median, high = cell_of_table(height, noise, rate_hz, low_pass_hz, seconds)
                filtered = f"{low_pass_hz / 1e3:g}" if low_pass_hz else "none"
                print(f"| {height:g} | {noise:g} | {rate_hz / 1e3:g} | {filtered} | {f1:.4f} | {median:.3f} | {high:.3f} |")


def cell_of_table(height: float, noise: float, rate_hz: float, low_pass_hz: float,
                  seconds: float) -> tuple[float, float, float]:
    """Return the mean F1 of a narrow and a wide spike, and the errors of both together."""
    scores, errors = [], []
    for seed, (rise, fall) in enumerate(((0.15, 0.5), (0.3, 1.0))):
        shape = Shape(height, rise, fall, ahp_mv=0.1 * height)
        recipe = Recipe(seconds, rate_hz, noise, low_pass_hz, shape, rest_mv=(-65.0, -50.0))
        trace = membrane_trace(recipe, np.random.default_rng(100 + seed))
        spikes = find_vm_spikes(membrane_of_trace(trace), MembraneSettings())
        match = matched(spikes.time_s, trace.spike_s)
        scores.append(match.f1)
        errors.append(np.abs(match.errors_ms))
    every = np.concatenate(errors)
    return float(np.mean(scores)), float(np.median(every)), float(np.quantile(every, 0.95))


def print_speed(minutes: int) -> None:
    """Print the time to spikes and mean potential over that of the plain read, and the memory."""
    with tempfile.TemporaryDirectory() as folder:
        path = Path(folder) / "vm.h5"
        writer = multiprocessing.get_context("spawn").Process(target=write_recording, args=(path, minutes))
        writer.start()  # in a process of its own, or its memory would count
        writer.join()
        n = minutes * 60 * SPEED_HZ
        plain_s = min(plain_read_s(path) for _ in range(2))
        before_mb = peak_mb()
        reader = EvenChunks(Column(str(path), "vm", gain=GAIN), SPEED_HZ, (Stretch(0, n, 0.0),))
        membrane = membrane_on(reader, SPEED_HZ, 0.0, n / SPEED_HZ)
        started = time.perf_counter()
        spikes = find_vm_spikes(membrane, MembraneSettings())
        spikes_s = time.perf_counter() - started
        onset = np.arange(1.0, n / SPEED_HZ - 3.0, 2.0)
        vm_profile(membrane, spikes, Cycles.plain(onset, onset + 0.8, onset + 2.0), MembraneSettings())
        whole_s = time.perf_counter() - started
        print(f"\n{minutes} min at 20 kHz ({path.stat().st_size / 1e6:.0f} MB): plain read {plain_s:.2f} s; "
              f"spikes {spikes_s:.2f} s, with mean potential {whole_s:.2f} s, {whole_s / plain_s:.1f} x the plain read; "
              f"{spikes.time_s.size} spikes; peak memory {before_mb:.0f} MB before, {peak_mb():.0f} MB after")


def write_recording(path: Path, minutes: int) -> None:
    """Write `minutes` of potential, five different minutes repeated."""
    trace = membrane_trace(Recipe(300.0, SPEED_HZ, 0.5, synaptic_mv=1.0), np.random.default_rng(0))
    counts = np.round(trace.values_mv / GAIN).astype(np.int16)
    n = minutes * 60 * SPEED_HZ
    with h5py.File(path, "w") as file:
        data = file.create_dataset("vm", shape=(n,), dtype=np.int16, compression="gzip", chunks=True)
        for first in range(0, n, counts.size):
            data[first : first + counts.size] = counts[: n - first]


def plain_read_s(path: Path) -> float:
    """Return the seconds that reading every sample takes, ten seconds of recording at a time."""
    started = time.perf_counter()
    with h5py.File(path) as file:
        data = file["vm"]
        for first in range(0, data.shape[0], 10 * SPEED_HZ):
            data[first : first + 10 * SPEED_HZ]
    return time.perf_counter() - started


def peak_mb() -> float:
    """Return the largest resident memory so far."""
    return resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024


if __name__ == "__main__":
    main()
