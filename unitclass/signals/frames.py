"""A nerve's samples in pieces of one fixed length, whatever chunks its reader yields.

Everything downstream works frame by frame, so results cannot depend on the size of the chunks,
and memory does not grow with the length of the recording.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np

from unitclass.records import Chunk, FloatArray, Signal

FRAME_S = 8.0


@dataclass(frozen=True)
class Frame:
    """Consecutive samples; `values` shape (n_samples,), NaN where the recording has a gap.

    `first` counts samples since `origin_s`, the time of the stretch's first sample.
    """

    first: int
    origin_s: float
    values: FloatArray


def frames(signal: Signal, *, start_s: float, stop_s: float, multiple: int = 1) -> Iterator[Frame]:
    """Yield the samples between two moments in frames of about two seconds.

    Parameters
    ----------
    signal : Signal
        Any continuous signal.
    start_s, stop_s : float
        Session time; the stretch is half open.
    multiple : int
        Every frame but the last holds a whole multiple of so many samples.

    Yields
    ------
    Frame
        In order, without overlap; gaps between chunks arrive as NaN. Frames that would lie
        wholly in a gap are yielded too, so that indices stay even.
    """
    length = multiple * max(1, round(FRAME_S * signal.rate_hz / multiple))
    frame, filled, first, origin_s = np.full(length, np.nan), 0, 0, np.nan
    for chunk in signal.reader.chunks(start_s, stop_s):
        if not chunk.values.size:
            continue
        if np.isnan(origin_s):
            origin_s = chunk.start_s
        at, used = _index(chunk, origin_s, signal.rate_hz), 0
        while used < chunk.values.size:
            while at >= first + length:
                yield Frame(first, origin_s, frame)
                frame, filled, first = np.full(length, np.nan), 0, first + length
            n = min(chunk.values.size - used, first + length - at)
            frame[at - first : at - first + n] = chunk.values[used : used + n]
            filled, at, used = at - first + n, at + n, used + n
    if filled:
        yield Frame(first, origin_s, frame[:filled])


def _index(chunk: Chunk, origin_s: float, rate_hz: float) -> int:
    return max(0, round((chunk.start_s - origin_s) * rate_hz))
