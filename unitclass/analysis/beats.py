"""Confounds: cells that follow the heart or a pump, where a channel records it."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from unitclass.errors import SignalError
from unitclass.phase.beat_locking import beat_locking
from unitclass.records import Cycles, FloatArray, Recording
from unitclass.signals.beats import find_beats
from unitclass.signals.neurogram import as_recorded

SOURCES = {"ecg": "heart", "pump": "pump", "pressure": "pulse"}
SMALL_P, LEAST_RESULTANT = 0.005, 0.1
NEAR_BREATH = (0.67, 1.5)  # of the breathing rate: what beats so slowly cannot be told from breathing


@dataclass(frozen=True)
class Beats:
    """Times of one channel's beats, s, and what they are in words."""

    words: str
    channel: str
    times_s: FloatArray


def beats_of(recording: Recording) -> tuple[Beats, ...]:
    """Return the beats of every channel that records a heart, a pulse or a pump, but the reference."""
    used = {recording.reference, *recording.references.values()}
    found = []
    for signal in recording.nerves:
        if signal.role not in SOURCES or signal.name in used:
            continue
        try:
            trace = as_recorded(signal, start_s=signal.start_s, stop_s=signal.stop_s)
        except SignalError:  # a dead channel: there is nothing to be confounded by
            continue
        times_s = find_beats(trace.values, trace.rate_hz, trace.start_s)
        found.append(Beats(SOURCES[signal.role], signal.name, times_s))
    return tuple(found)


def beat_flags(spikes_s: FloatArray, beats: Sequence[Beats], cycles: Cycles) -> tuple[str, ...]:
    """Return a flag for every channel whose beats the train follows.

    Parameters
    ----------
    spikes_s : ndarray, shape (n_spikes,)
        Ascending.
    cycles : Cycles
        Of the condition: only spikes within it count.
    """
    if not beats or not cycles.n_cycles:
        return ()
    inside = spikes_s[(spikes_s >= cycles.onset_s[0]) & (spikes_s < cycles.end_s[-1])]
    breaths_hz = 1 / float(np.median(cycles.ttot_s))
    flags = []
    for one in beats:
        locking = beat_locking(inside, one.times_s)
        is_breath = NEAR_BREATH[0] <= locking.beats_hz / breaths_hz <= NEAR_BREATH[1]
        if locking.p <= SMALL_P and locking.resultant_length >= LEAST_RESULTANT and not is_breath:
            flags.append(f"follows the {one.words} ({one.channel}, {locking.beats_hz:.1f} a second): "
                         f"resultant {locking.resultant_length:.2f}")
    return tuple(flags)
