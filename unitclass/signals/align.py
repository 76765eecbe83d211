"""Bursts fitted to their own average: where each begins and ends, as sharply as the noise allows.

Every burst is the average burst with a gain of its own, stretched between an onset and an offset
of its own. Gain, onset and offset follow from weighted least squares on the whole burst (Gauss and
Newton's method, a few steps), which uses all of a slow ramp instead of the one moment at which it
crosses a level.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from unitclass.records import BoolArray, FloatArray
from unitclass.signals.smoothing import boxcar, filled

N_STEPS = 60
"""Points of the average burst from onset to offset."""
BEFORE, AFTER = 1.2, 1.2
"""How far the average reaches before onset and after offset, in burst lengths."""
MAX_MOVE = 0.08
N_ROUNDS = 4


@dataclass(frozen=True)
class Field:
    """What bursts are fitted on, shape (n_samples,): additive strength and the floor it stands on.

    `strength` is w² − f² where floor and burst add as powers, w − f elsewhere; its mean outside
    bursts, where `quiet`, is zero.
    """

    strength: FloatArray
    floor: FloatArray
    quiet: BoolArray
    is_power: bool

    def rows(self, at: FloatArray) -> FloatArray:
        """Return the strength at fractional samples of any shape; NaN outside."""
        grid = np.arange(self.strength.size)
        flat = np.interp(at.ravel(), grid, self.strength, left=np.nan, right=np.nan)
        return np.asarray(flat.reshape(at.shape))

    def mirrored(self) -> Field:
        """Return the field in reversed time: offsets become onsets."""
        return Field(self.strength[::-1], self.floor[::-1], self.quiet[::-1], self.is_power)

    def quiet_noise(self, width: int) -> float:
        """Return the standard deviation of the quiet strength under a box of `width` samples."""
        trace = boxcar(self.strength, width)[self.quiet]
        trace = trace[np.isfinite(trace)]
        return float(1.4826 * np.median(np.abs(trace - np.median(trace)))) if trace.size else 0.0


def field_of(values: FloatArray, floor: FloatArray, quiet: BoolArray, *, is_power: bool) -> Field:
    """Return the field of an activity, its floor and where it is quiet, shapes (n_samples,).

    The square of a noisy sample is on average more than the square of the floor, by a fixed share
    of it; that share is taken off.
    """
    strength = values**2 if is_power else np.array(values)
    base = floor**2 if is_power else floor
    quiet = quiet & np.isfinite(values)
    if quiet.any() and is_power:
        base = base * float(np.mean(strength[quiet]) / max(float(np.mean(base[quiet])), 1e-300))
    elif quiet.any():
        base = base + float(np.median(strength[quiet] - base[quiet]))
    return Field(strength - base, floor, quiet, is_power)


def aligned(field: Field, onset: FloatArray, offset: FloatArray, typical: BoolArray) -> tuple[FloatArray, FloatArray]:
    """Return onsets and offsets, in samples, that fit every burst to the average.

    Parameters
    ----------
    field : Field
        Additive strength.
    onset, offset : ndarray, shape (n_bursts,)
        First guesses on the flanks.
    typical : ndarray of bool, shape (n_bursts,)
        Bursts that make the average.
    """
    length = float(np.median((offset - onset)[typical]))
    smooth = replace(field, strength=boxcar(field.strength, max(1, round(length / N_STEPS))))
    u = np.arange(-round(BEFORE * N_STEPS), round((1 + AFTER) * N_STEPS) + 1) / N_STEPS
    for k in range(N_ROUNDS):
        onset, offset = _moved(smooth, u, onset, offset, typical, MAX_MOVE / (1 + k))
    return onset, offset


def _moved(field: Field, u: FloatArray, onset: FloatArray, offset: FloatArray, typical: BoolArray,
           most: float) -> tuple[FloatArray, FloatArray]:
    length = offset - onset
    rows = field.rows(onset[:, None] + length[:, None] * u)
    rows = np.where(_own(u, onset, offset), rows, np.nan)
    inside = np.isfinite(rows) & (u > 0) & (u < 1)
    gain = np.where(inside, rows, 0.0).sum(axis=1) / np.maximum(inside.sum(axis=1), 1)
    gain = np.where(np.isfinite(gain) & (gain > 0), gain, np.nan)
    template = average(rows / gain[:, None], typical)
    slope = np.gradient(template, u)
    floor_power = np.interp((onset + offset) / 2, np.arange(field.floor.size), field.floor) ** 2
    weight = _weights(field, template, gain, floor_power)
    solved = _solve(rows, weight, np.stack([template, (1 - u) * slope, u * slope]))
    with np.errstate(invalid="ignore", divide="ignore"):
        early, late = -solved[:, 1] / solved[:, 0], -solved[:, 2] / solved[:, 0]
    move_on, move_off = (np.clip(np.nan_to_num(m), -most, most) * length for m in (early, late))
    move_on, move_off = move_on - np.median(move_on[typical]), move_off - np.median(move_off[typical])
    return onset + move_on, np.maximum(offset + move_off, onset + 0.2 * length)


def average(rows: FloatArray, typical: BoolArray) -> FloatArray:
    """Return the mean of the typical rows without their two extreme tenths, shape (n_columns,).

    Columns with no value are bridged.
    """
    chosen = rows[typical]
    if len(chosen) < 8:
        with np.errstate(invalid="ignore"):
            count = np.isfinite(chosen).sum(axis=0)
            mean = np.where(count > 0, np.nansum(chosen, axis=0) / np.maximum(count, 1), np.nan)
        return filled(mean)
    ordered = np.sort(chosen, axis=0)
    count = np.isfinite(ordered).sum(axis=0)
    low, high = (0.1 * count).astype(int), np.maximum(np.ceil(0.9 * count).astype(int), 1)
    total = np.concatenate([np.zeros((1, rows.shape[1])), np.cumsum(np.nan_to_num(ordered), axis=0)])
    column = np.arange(rows.shape[1])
    mean = (total[high, column] - total[low, column]) / np.maximum(high - low, 1)
    return filled(np.where(count > 2, mean, np.nan))


def _own(u: FloatArray, onset: FloatArray, offset: FloatArray) -> BoolArray:
    """Return which points of each row belong to its burst and not to a neighbour's."""
    length = offset - onset
    before = np.concatenate([[-np.inf], (offset[:-1] - onset[1:]) / length[1:]]) * 0.6
    after = 1 + np.concatenate([(onset[1:] - offset[:-1]) / length[:-1], [np.inf]]) * 0.6
    return (u >= before[:, None]) & (u <= after[:, None])


def _weights(field: Field, template: FloatArray, gain: FloatArray, floor_power: FloatArray) -> FloatArray:
    if not field.is_power:
        return np.ones((gain.size, template.size))
    power = np.maximum(template, 0) * np.nan_to_num(gain)[:, None] + floor_power[:, None]
    return 1.0 / np.maximum(power, 1e-3 * np.max(power)) ** 2


def _solve(rows: FloatArray, weight: FloatArray, columns: FloatArray) -> FloatArray:
    """Return weighted least-squares coefficients of every row on the columns, shape (n_rows, 3)."""
    weight = np.where(np.isfinite(rows), weight, 0.0)
    rows = np.nan_to_num(rows)
    right = (weight * rows) @ columns.T
    products = columns[:, None, :] * columns[None, :, :]
    left = np.einsum("rc,ijc->rij", weight, products)
    scale = np.trace(left, axis1=1, axis2=2)[:, None, None] + 1e-300
    left = left / scale + 1e-6 * np.eye(3)
    return np.asarray(np.linalg.solve(left, right[:, :, None] / scale)[:, :, 0])
