"""Seconds to phase and back: piecewise linear within each cycle."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from unitclass.records import Cycles, FloatArray, IntArray


@dataclass(frozen=True)
class PhasedSpikes:
    """Phase and cycle of each spike, shape (n_spikes,).

    `phase` is NaN and `cycle` is -1 for a spike that lies in no cycle; otherwise `cycle` is the
    row in the cycles it was warped with.
    """

    phase: FloatArray
    cycle: IntArray


def to_phase(times_s: ArrayLike, cycles: Cycles) -> PhasedSpikes:
    """Return the canonical phase, [0, 2), of every time: inspiration 0 to 1, expiration 1 to 2.

    A cycle holds its onset and not its end, so a spike on a common mark belongs to what begins
    there. Cycles whose `offset_s` is NaN hold no phase.

    Parameters
    ----------
    times_s : array_like, shape (n_spikes,)
        Seconds on the session clock, any order.
    cycles : Cycles
        Shape (n_cycles,), in time order, not overlapping; gaps between them are allowed.

    Raises
    ------
    ValueError
        If `times_s` is not 1-D and finite, or the cycles' marks do not ascend.
    """
    return _warped(checked_times(times_s), _marks(cycles.onset_s, cycles.offset_s, cycles.end_s))


def from_phase(phase: ArrayLike, cycle_index: ArrayLike, cycles: Cycles) -> FloatArray:
    """Return the seconds of canonical phases, NaN where `cycle_index` is -1; undoes `to_phase`.

    Raises
    ------
    ValueError
        If a phase of a cycle is outside [0, 2), or `cycle_index` points beyond the cycles.
    """
    return _unwarped(phase, cycle_index, _marks(cycles.onset_s, cycles.offset_s, cycles.end_s))


def to_three_part_phase(times_s: ArrayLike, cycles: Cycles) -> PhasedSpikes:
    """Return phases on [0, 3): inspiration 0 to 1, post-inspiration (E1) 1 to 2, the rest (E2) 2 to 3.

    Only cycles with a finite `post_i_end_s` hold such a phase. It does not replace the canonical
    phase. Parameters and errors are those of `to_phase`.
    """
    return _warped(checked_times(times_s), _three_part_marks(cycles))


def from_three_part_phase(phase: ArrayLike, cycle_index: ArrayLike, cycles: Cycles) -> FloatArray:
    """Return the seconds of phases on [0, 3); undoes `to_three_part_phase`, with its errors."""
    return _unwarped(phase, cycle_index, _three_part_marks(cycles))


def checked_times(times_s: ArrayLike) -> FloatArray:
    """Return `times_s` as a float array; raises ValueError unless it is 1-D and finite."""
    times = np.asarray(times_s, dtype=float)
    if times.ndim != 1 or not np.isfinite(times).all():
        raise ValueError(f"times_s must be one row of finite seconds, not shape {times.shape} with "
                         f"{np.count_nonzero(~np.isfinite(times))} values that are not; drop those")
    return times


def _three_part_marks(cycles: Cycles) -> FloatArray:
    return _marks(cycles.onset_s, cycles.offset_s, cycles.post_i_end_s, cycles.end_s)


def _marks(*columns: FloatArray) -> FloatArray:
    """Return the marks as shape (n_cycles, n_marks), checked; a row with a NaN is left alone."""
    marks = np.stack([np.asarray(c, dtype=float) for c in columns], axis=1)
    known = marks[np.isfinite(marks).all(axis=1)]
    if np.any(np.diff(known, axis=1) <= 0) or np.any(known[1:, 0] < known[:-1, -1]):
        raise ValueError("cycles must ascend without overlap, each mark after the one before; sort them first")
    return marks


def _warped(times_s: FloatArray, marks: FloatArray) -> PhasedSpikes:
    n_marks = marks.shape[1]
    rows = np.flatnonzero(np.isfinite(marks).all(axis=1))
    if not rows.size:
        return PhasedSpikes(np.full(times_s.size, np.nan), np.full(times_s.size, -1))
    ladder = np.append(marks[rows].ravel(), np.inf)
    rung = np.searchsorted(ladder, times_s, side="right") - 1
    cycle, piece = np.divmod(rung, n_marks)
    is_outside = (rung < 0) | (piece == n_marks - 1)
    # A last rung opens the gap before the next cycle; its width is never used.
    width = np.where(np.arange(ladder.size - 1) % n_marks == n_marks - 1, 1.0, np.diff(ladder))
    share = (times_s - ladder[rung]) / width[rung]
    phase = piece + np.minimum(share, 1 - 2**-50)
    phase[is_outside] = np.nan
    return PhasedSpikes(phase, np.where(is_outside, -1, rows[cycle]))


def _unwarped(phase: ArrayLike, cycle_index: ArrayLike, marks: FloatArray) -> FloatArray:
    given = np.asarray(phase, dtype=float)
    cycle = np.asarray(cycle_index, dtype=np.int64)
    inside = cycle >= 0
    n_pieces = marks.shape[1] - 1
    if np.any(cycle >= len(marks)) or not np.all((given[inside] >= 0) & (given[inside] < n_pieces)):
        raise ValueError(f"phases must lie in [0, {n_pieces}) and cycle_index below {len(marks)}")
    times = np.full(given.shape, np.nan)
    piece = given[inside].astype(np.int64)
    low, high = marks[cycle[inside], piece], marks[cycle[inside], piece + 1]
    times[inside] = low + (given[inside] - piece) * (high - low)
    return times
