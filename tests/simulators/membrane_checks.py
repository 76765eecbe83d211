"""What the tests of membrane potentials share."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from tests.simulators.membrane import Trace
from unitclass.records import ArrayChunks, ChunkReader, Electrode, FloatArray, Membrane, Signal


def membrane_of(values: FloatArray, rate_hz: float, *, start_s: float = 0.0, chunk_s: float = 10.0,
                electrode: Electrode | None = None) -> Membrane:
    return membrane_on(ArrayChunks(values, rate_hz, start_s, chunk_s), rate_hz, start_s,
                       start_s + values.size / rate_hz, electrode)


def membrane_on(reader: ChunkReader, rate_hz: float, start_s: float, stop_s: float,
                electrode: Electrode | None = None) -> Membrane:
    signal = Signal("Vm", "membrane", "mV", rate_hz, start_s, stop_s, reader)
    return Membrane(signal, electrode or Electrode("impaled"))


def membrane_of_trace(trace: Trace, **options: float) -> Membrane:
    return membrane_of(trace.values_mv, trace.rate_hz, **options)


@dataclass(frozen=True)
class Match:
    """Found against true times, matched one to one within a tolerance; errors in ms."""

    f1: float
    errors_ms: FloatArray
    n_missed: int
    n_false: int


def matched(found_s: FloatArray, true_s: FloatArray, tolerance_s: float = 0.001) -> Match:
    errors, used, i = [], 0, 0
    for t in true_s:
        while i < found_s.size and found_s[i] < t - tolerance_s:
            i += 1
        if i < found_s.size and found_s[i] <= t + tolerance_s:
            errors.append(1e3 * (found_s[i] - t))
            used += 1
            i += 1
    total = found_s.size + true_s.size
    return Match(2 * used / total if total else 1.0, np.array(errors), true_s.size - used, found_s.size - used)
