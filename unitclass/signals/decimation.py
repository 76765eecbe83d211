"""Fewer samples at once: everything after the first pass over a raw trace works on a third or less of it."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, replace
from math import inf

import numpy as np

from unitclass.records import Chunk, ChunkReader, Signal

KEPT = 2.2  # samples kept per period of the highest frequency wanted


@dataclass(frozen=True)
class AveragedChunks:
    """Reads another reader's samples as means of `step` consecutive ones; a gap starts the count anew."""

    reader: ChunkReader
    step: int
    rate_hz: float

    def chunks(self, start_s: float = -inf, stop_s: float = inf) -> Iterator[Chunk]:
        """Yield the means, each at the middle of its samples."""
        left, next_s = np.empty(0, np.float32), -inf
        for chunk in self.reader.chunks(start_s, stop_s):
            if not abs(chunk.start_s - next_s) < 0.5 / self.rate_hz:
                left, first_s = np.empty(0, np.float32), chunk.start_s
            else:
                first_s = chunk.start_s - left.size / self.rate_hz
            next_s = chunk.start_s + chunk.values.size / self.rate_hz
            values = np.concatenate([left, chunk.values]) if left.size else chunk.values
            whole = values.size - values.size % self.step
            left = values[whole:]
            if whole:
                mean = values[0 : whole : self.step].copy()
                for i in range(1, self.step):
                    mean += values[i : whole : self.step]
                mean *= 1.0 / self.step
                yield Chunk(first_s + (self.step - 1) / 2 / self.rate_hz, mean)


def decimated(signal: Signal, high_hz: float) -> Signal:
    """Return a raw signal at the lowest rate that still holds `high_hz`, by means of consecutive samples."""
    step = max(1, int(signal.rate_hz / (KEPT * high_hz)))
    if step == 1:
        return signal
    return replace(signal, reader=AveragedChunks(signal.reader, step, signal.rate_hz), rate_hz=signal.rate_hz / step,
                   start_s=signal.start_s + (step - 1) / 2 / signal.rate_hz)
