"""Whether a train follows the heart or a pump: its phase between one beat and the next."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from unitclass.records import FloatArray

MOST_SPIKES = 3000
N_SHIFTS = 199
LEAST_SPIKES, LEAST_BEATS = 30, 30
LONGEST = 1.8  # of the usual interval: beyond it a beat was missed


@dataclass(frozen=True)
class BeatLocking:
    """Resultant length of the phase between beats, its p by shifts in time, and the rate of the beats."""

    resultant_length: float
    p: float
    beats_hz: float


NOT_TOLD = BeatLocking(np.nan, np.nan, np.nan)


def beat_locking(spike_times_s: FloatArray, beats_s: FloatArray, *, seed: int = 0) -> BeatLocking:
    """Return how far spikes keep to one phase between beats.

    The spikes of a respiratory cell come in bursts and are not independent, so the resultant is
    compared with that of the same train moved against the beats by random times [1]_.

    Parameters
    ----------
    spike_times_s : ndarray, shape (n_spikes,)
        Ascending; long trains are thinned evenly.
    beats_s : ndarray, shape (n_beats,)
        Ascending.

    Returns
    -------
    BeatLocking
        NaN where there are too few spikes or beats.

    References
    ----------
    .. [1] K. V. Mardia, P. E. Jupp, *Directional Statistics*, Wiley, 2000, sect. 6.3 (Rayleigh's
       statistic); the null by shifts is common practice.
    """
    inside = spike_times_s[(spike_times_s >= beats_s[0]) & (spike_times_s < beats_s[-1])] if beats_s.size else beats_s
    if inside.size < LEAST_SPIKES or beats_s.size < LEAST_BEATS:
        return NOT_TOLD
    usual = float(np.median(np.diff(beats_s)))
    spikes = inside[:: max(1, inside.size // MOST_SPIKES)]
    found = _resultant(spikes, beats_s, usual)
    span = beats_s[-1] - beats_s[0]
    # Shifts of seconds keep a train's bursts and drift where they are and lose the beat.
    moves = np.random.default_rng(seed).uniform(min(5 * usual, span / 4), min(60 * usual, span / 2), N_SHIFTS)
    moved = [_resultant(beats_s[0] + (spikes - beats_s[0] + move) % span, beats_s, usual) for move in moves]
    reached = sum(other >= found for other in moved)
    return BeatLocking(found, (1 + reached) / (1 + N_SHIFTS), 1 / usual)


def _resultant(spikes_s: FloatArray, beats_s: FloatArray, usual_s: float) -> float:
    at = np.clip(np.searchsorted(beats_s, spikes_s, side="right") - 1, 0, beats_s.size - 2)
    length = beats_s[at + 1] - beats_s[at]
    is_sure = length < LONGEST * usual_s
    if not is_sure.any():
        return 0.0
    phase = (spikes_s[is_sure] - beats_s[at[is_sure]]) / length[is_sure]
    return float(np.abs(np.exp(2j * np.pi * phase).mean()))
