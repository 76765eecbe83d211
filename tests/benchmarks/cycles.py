"""The cycle detector against nerves whose marks are known: edges, tags, other nerves, rhythm.

`python -m tests.benchmarks.cycles [--cycles N]` prints, for the grid signal-to-noise x shape x trouble x
form, F1 of cycles, bias and median absolute error of onsets and offsets; then hit and false rates of
every tag, of post-inspiration, of n:1 coupling and of the rhythm regime. `--speed FILE` prints instead how long
the reference nerve of a file takes to cycles, against a plain h5py read of it (a file of an hour is made by
`python -m tests.benchmarks.main_job FOLDER`).
"""

from __future__ import annotations

import argparse
import os
from collections.abc import Iterator, Sequence
from dataclasses import dataclass, replace

import numpy as np

from tests.simulators import nerves
from tests.simulators.common import preparation
from tests.simulators.sessions import BURST, drawn_nerve, true_cycles, vagal_envelope
from unitclass.classify.regime import judge_regime
from unitclass.errors import SignalError
from unitclass.io.template_files import read_library
from unitclass.records import FloatArray, NerveCycles, Signal
from unitclass.settings import Settings
from unitclass.signals.cycles import find_cycles
from unitclass.signals.nerves import coupling

SETTINGS = Settings()
SHAPES, TROUBLES, SNRS, FORMS = ("ramp", "square", "decrementing"), ("", "hum", "heart", "drift"), (6, 4, 3, 2), (
    "raw", "integrated")
NEAR = 0.25  # of a cycle: a mark found within this is the mark meant


@dataclass(frozen=True)
class Errors:
    """How cycles found compare with those drawn; errors in ms."""

    f1: float
    onset_ms: FloatArray
    offset_ms: FloatArray


def nerve(form: str, truth: nerves.Truth, rig: nerves.Rig, rng: np.random.Generator) -> Signal:
    """Return the nerve as it would be recorded."""
    return nerves.raw(truth, rig, rng) if form == "raw" else nerves.integrated(truth, rig, rng)


def cycles_of(signal: Signal, others: Sequence[Signal] = ()) -> NerveCycles | None:
    """Return what is found, None when the program says that it cannot."""
    try:
        return find_cycles(signal, others, start_s=0.0, stop_s=signal.stop_s, settings=SETTINGS)
    except SignalError:
        return None


def errors(truth: nerves.Truth, found: NerveCycles | None, ttot_s: float) -> Errors:
    """Match the onsets drawn, but those at the edges, with those found."""
    if found is None:
        return Errors(0.0, np.zeros(0), np.zeros(0))
    c = found.cycles
    onset, offset = truth.onset_s[1:-1], truth.offset_s[1:-1]
    inside = (c.onset_s > truth.onset_s[0] + NEAR * ttot_s) & (c.onset_s < truth.onset_s[-1] - NEAR * ttot_s)
    mine, mine_offset = c.onset_s[inside], c.offset_s[inside]
    if not mine.size:
        return Errors(0.0, np.zeros(0), np.zeros(0))
    nearest = np.abs(mine[:, None] - onset).argmin(axis=0)
    hit = np.abs(mine[nearest] - onset) < NEAR * ttot_s
    n_hit = np.unique(nearest[hit]).size
    ends = 1000 * (mine_offset[nearest[hit]] - offset[hit])
    return Errors(2 * n_hit / (mine.size + onset.size), 1000 * (mine[nearest[hit]] - onset[hit]), ends[np.isfinite(ends)])


def grid(n_cycles: int, seed: int = 1) -> Iterator[tuple[tuple[object, ...], Errors]]:
    """Yield every cell of the grid with its errors."""
    for form in FORMS:
        for snr in SNRS:
            for shape in SHAPES:
                for trouble in TROUBLES:
                    rng = np.random.default_rng(seed)
                    plan = nerves.Plan(shape=shape, n_cycles=n_cycles)
                    rig = nerves.Rig(rate_hz=10000.0, snr=float(snr), trouble=(trouble,) if trouble else ())
                    truth = nerves.draw(plan, rng)
                    found = cycles_of(nerve(form, truth, rig, rng))
                    yield (form, snr, shape, trouble or "clean"), errors(truth, found, plan.ttot_s)


# ----------------------------------------------------------------------------------- tags

EVENTS = {"sigh": "sigh", "apnoea": "apnoea", "doublet": "doublet", "swallow": "swallow"}


def tag_rates(n_cycles: int, n_runs: int = 4) -> list[tuple[str, float, float]]:
    """Return tag, share of events that got it, and share of plain cycles that did."""
    counts = {name: [0, 0, 0, 0] for name in EVENTS}
    for run in range(n_runs):
        rng = np.random.default_rng(run)
        kinds = list(EVENTS)
        events = {int(k): kinds[i % len(kinds)] for i, k in enumerate(range(6, n_cycles - 6, 7))}
        truth = nerves.draw(nerves.Plan(n_cycles=n_cycles, events=events), rng)
        found = cycles_of(nerves.raw(truth, nerves.Rig(rate_hz=10000.0, snr=5.0), rng))
        if found is None:
            continue
        told = [f"{kind}: {reason}" for kind, reason in zip(found.cycles.kind, found.cycles.reason, strict=True)]
        for name, words in EVENTS.items():
            for i, onset in enumerate(truth.onset_s[1:-1], start=1):
                # A tag stands on the event's cycle, or on the extra burst that it holds.
                within = (found.cycles.onset_s > onset - 0.3) & (found.cycles.onset_s < truth.onset_s[i + 1] - 0.3)
                has = any(words in told[j] and "after a" not in told[j] for j in np.flatnonzero(within))
                is_event = events.get(i) == name
                counts[name][0 if is_event else 2] += has
                counts[name][1 if is_event else 3] += 1 if is_event or i not in events else 0
                if not is_event and i in events:
                    counts[name][2] -= has
    return [(name, c[0] / max(c[1], 1), c[2] / max(c[3], 1)) for name, c in counts.items()]


def edge_and_gap_rates(n_runs: int = 6) -> list[tuple[str, float, float]]:
    """Return the same for cycles cut by the recording's edge and by a gap of NaN."""
    hits = {"truncated": [0, 0, 0, 0], "gap": [0, 0, 0, 0]}
    for run in range(n_runs):
        rng = np.random.default_rng(50 + run)
        truth = nerves.draw(nerves.Plan(n_cycles=40, lead_in_s=0.0), rng)
        rig = nerves.Rig(rate_hz=10000.0, snr=5.0, trouble=("nan",))
        signal = nerves.raw(truth, rig, rng)
        gap_s = 2 * truth.duration_s / 3, 2 * truth.duration_s / 3 + 0.7
        stop_s = float(truth.offset_s[-2]) - 0.3  # cuts the last burst but one
        found = find_cycles(signal, (), start_s=0.4, stop_s=stop_s, settings=SETTINGS)
        c = found.cycles
        for i in range(c.n_cycles):
            in_gap = c.onset_s[i] < gap_s[1] and c.end_s[i] > gap_s[0]
            is_cut = i in (0, c.n_cycles - 1)
            for name, is_one, words in (("truncated", is_cut, ("truncated", "edge")), ("gap", in_gap, ("gap",))):
                has = any(w in f"{c.kind[i]} {c.reason[i]}" for w in words)
                hits[name][0 if is_one else 2] += has
                hits[name][1 if is_one else 3] += 1
    return [(name, h[0] / max(h[1], 1), h[2] / max(h[3], 1)) for name, h in hits.items()]


# ------------------------------------------------------------------------------ other nerves

def post_i(n_cycles: int, n_runs: int = 4) -> tuple[float, float, float, float]:
    """Return hit and false rate of post-inspiration, and bias and spread of its end, ms."""
    n_hit = n_post = n_false = n_none = 0
    off: list[float] = []
    for run in range(n_runs):
        for regime in ("three-phase", "two-phase"):
            rng = np.random.default_rng(run)
            truth = drawn_nerve(regime, n_cycles, rng)
            cycles = true_cycles(truth)
            vagus = replace(truth, envelope=vagal_envelope(truth, cycles, regime, rng))
            rig = nerves.Rig(rate_hz=10000.0, snr=5.0)
            found = cycles_of(nerves.raw(truth, rig, rng), [nerves.raw(vagus, rig, rng, name="VNA", role="vagus")])
            assert found is not None
            told = np.isfinite(found.cycles.post_i_end_s)
            if regime == "two-phase":
                n_false, n_none = n_false + int(told.sum()), n_none + told.size
                continue
            n_hit, n_post = n_hit + int(told.sum()), n_post + told.size
            off += list(1000 * (found.cycles.post_i_end_s[told] - _true_ends(vagus, found.cycles.offset_s[told],
                                                                             found.cycles.end_s[told])))
    errors_ms = np.array(off)
    return n_hit / n_post, n_false / n_none, float(np.median(errors_ms)), float(np.median(np.abs(errors_ms)))


def _true_ends(vagus: nerves.Truth, offset_s: FloatArray, end_s: FloatArray) -> FloatArray:
    """Return where the vagus drawn falls below a tenth of its post-inspiratory peak."""
    ends = []
    for start, stop in zip(offset_s, end_s, strict=True):
        part = vagus.envelope[int(start * nerves.FINE_HZ):int(stop * nerves.FINE_HZ)]
        top = int(part[:part.size // 2].argmax())  # the next inspiration begins at the end
        low = np.flatnonzero(part[top:] < 0.1 * part[top])
        ends.append(start + (top + (low[0] if low.size else part.size)) / nerves.FINE_HZ)
    return np.array(ends)


def coupled(n_runs: int = 5) -> tuple[float, float]:
    """Return how often n of n:1 late-expiratory bursts is found right, and how often bursts are seen where none are."""
    right = wrong = 0
    for n in (1, 2, 3, 0):
        for run in range(n_runs):
            rng = np.random.default_rng(10 * n + run)
            truth = nerves.draw(nerves.Plan(n_cycles=50), rng)
            envelope = np.zeros_like(truth.envelope)
            for k in range(0, truth.onset_s.size - 1, n or 10**9):
                if n:
                    start = truth.onset_s[k + 1] - 0.5
                    part = slice(int(start * nerves.FINE_HZ), int((start + 0.45) * nerves.FINE_HZ))
                    envelope[part] += nerves.burst("ramp", part.stop - part.start, 40)
            rig = nerves.Rig(rate_hz=10000.0, snr=5.0)
            abdominal = replace(truth, envelope=envelope)
            found = cycles_of(nerves.raw(truth, rig, rng), [nerves.raw(abdominal, rig, rng, name="AbN", role="abdominal")])
            assert found is not None
            seen = coupling(found.cycles.late_e)
            if n:
                right += seen.n == n and seen.confidence > 0.5
            else:
                wrong += seen.n > 0
    return right / (3 * n_runs), wrong / n_runs


def regimes(n_runs: int = 6) -> list[tuple[str, float, float]]:
    """Return regime, how often the nerves alone name it, and the mean probability given to it."""
    library, rows = read_library(), []
    for regime in BURST:
        named, probability = 0, []
        for run in range(n_runs):
            rng = np.random.default_rng(run)
            preparation(regime, rng)
            truth = drawn_nerve(regime, 40, rng)
            rig = nerves.Rig(rate_hz=10000.0, snr=5.0)
            if regime == "one-phase":  # the phrenic alone: a slice's rootlet tells nothing by its shape
                signal, others = nerves.raw(truth, rig, rng), []
            else:
                vagus = replace(truth, envelope=vagal_envelope(truth, true_cycles(truth), regime, rng))
                signal = nerves.raw(truth, rig, rng)
                others = [nerves.raw(vagus, rig, rng, name="VNA", role="vagus")]
            found = cycles_of(signal, others)
            assert found is not None
            judged = judge_regime(found.rhythm, np.zeros((0, len(library.families) + 1)), library, given="auto",
                                  other_prior=0.05).probabilities
            named += max(judged, key=lambda name: judged[name]) == regime
            probability.append(judged[regime])
        rows.append((regime, named / n_runs, float(np.mean(probability))))
    return rows


def speed(path: str) -> str:
    """Return the seconds of a plain read of the reference nerve and of finding its cycles."""
    import time

    import h5py

    from unitclass.io.nwb_read import read_recording

    recording = read_recording(path, rig=SETTINGS.rig)
    signal = recording.nerve(recording.reference)
    times = []
    for _ in range(3):
        start = time.perf_counter()
        with h5py.File(path, "r") as file:
            data = file[f"{signal.location}/data"]
            for first in range(0, data.shape[0], 2_000_000):
                data[first : first + 2_000_000]
        read = time.perf_counter() - start
        start = time.perf_counter()
        find_cycles(signal, (), start_s=signal.start_s, stop_s=signal.stop_s, settings=SETTINGS)
        times.append((read, time.perf_counter() - start))
    read, found = (min(values) for values in zip(*times, strict=True))
    hours = (signal.stop_s - signal.start_s) / 3600
    return f"{hours:.2f} h at {signal.rate_hz:g} Hz: plain read {read:.2f} s, to cycles {found:.2f} s, {found / read:.1f} x"


def main() -> None:
    """Print the tables."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--cycles", type=int, default=40)
    parser.add_argument("--speed", default="", metavar="FILE")
    args = parser.parse_args()
    if args.speed:
        print(speed(args.speed))
        return
    n_cycles = args.cycles
    print(f"{os.cpu_count()} cores; {n_cycles} cycles of 3 s a cell; bias and median absolute error in ms")
    print("form        SNR  shape         trouble    F1   onset bias  error  offset bias  error")
    for (form, snr, shape, trouble), e in grid(n_cycles):
        told = [f"{np.median(v):6.1f}  {np.median(np.abs(v)):6.1f}" if v.size else "     -       -"
                for v in (e.onset_ms, e.offset_ms)]
        print(f"{form:10s}  {snr:3d}  {shape:12s}  {trouble:7s}  {e.f1:.3f}      {told[0]}      {told[1]}")
    print("\ntag         hit  false")
    for name, hit, false in (*tag_rates(90), *edge_and_gap_rates()):
        print(f"{name:10s}  {hit:.2f}  {false:.3f}")
    hit, false, bias, spread = post_i(40)
    print(f"\npost-inspiration: hit {hit:.2f}, false {false:.2f}; its end: bias {bias:.0f} ms, "
          f"median absolute error {spread:.0f} ms")
    right, wrong = coupled()
    print(f"n:1 coupling: right {right:.2f}, seen where there is none {wrong:.2f}")
    for regime, named, probability in regimes():
        print(f"rhythm {regime}: named by the nerves alone {named:.2f}, mean probability {probability:.2f}")


if __name__ == "__main__":
    main()
