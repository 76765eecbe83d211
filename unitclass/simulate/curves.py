"""Activity over the cycle as a few points each: of nerves and of firing types.

A curve is (canonical phase, level) pairs, written phase:level, joined by straight lines; two
points 0.001 apart make a step. Levels are relative to the peak. The numbers are invented for the
demo; they follow the trade's plain words for each type and are not read by the classifier.
"""

from __future__ import annotations

import numpy as np

from unitclass.records import FloatArray

Curve = tuple[tuple[float, float], ...]


def points(text: str) -> Curve:
    """Read a curve written as "phase:level phase:level ..."."""
    pairs = (pair.split(":") for pair in text.split())
    return tuple((float(phase), float(level)) for phase, level in pairs)


NERVES: dict[str, Curve] = {name: points(text) for name, text in {
    "augmenting burst": "0:0.25 0.15:0.45 0.9:1 0.97:0.95 1:0.35 1.03:0.04 1.1:0 1.999:0 2:0.25",
    "square burst": "0:0.6 0.08:1 0.6:0.92 0.95:0.8 1:0.35 1.03:0.03 1.1:0 1.999:0 2:0.6",
    "decrementing burst": "0:0.3 0.1:1 0.3:0.85 0.6:0.6 0.93:0.4 1:0.2 1.03:0.02 1.06:0 1.995:0 2:0.3",
    "vagal": "0:0.2 0.1:0.35 0.95:0.6 1:0.75 1.04:1 1.15:0.65 1.3:0.3 1.5:0.08 1.7:0 1.99:0 2:0.2",
    "hypoglossal": "0:0.5 0.2:0.8 0.6:1 0.9:0.7 1:0.15 1.05:0 1.93:0 2:0.5",
    "late-expiratory burst": "0:0.1 0.03:0 1.78:0 1.82:0.4 1.95:1 1.985:0.8 2:0.1",
    "quiet": "0:0 2:0",
}.items()}

TYPES: dict[str, Curve] = {name: points(text) for name, text in {
    "pre-I": "0:0.55 0.1:0.85 0.5:1 0.92:0.8 1:0.1 1.04:0 1.74:0 1.9:0.25 2:0.55",
    "early-I": "0:0.8 0.06:1 0.3:0.65 0.6:0.32 0.9:0.1 1:0.03 1.001:0 1.999:0 2:0.8",
    "ramp-I": "0:0 0.06:0.12 0.5:0.55 0.96:1 0.985:0.9 1:0 2:0",
    "late-I": "0:0 0.62:0 0.75:0.6 0.93:1 0.985:0.8 1:0 2:0",
    "con-I": "0:0.3 0.05:0.95 0.5:1 0.95:0.95 1:0.1 1.001:0 1.999:0 2:0.3",
    "I-E": "0:0 0.68:0 0.85:0.7 1:1 1.06:0.85 1.2:0.2 1.28:0 2:0",
    "post-I": "0:0 0.999:0 1:0.85 1.03:1 1.12:0.62 1.25:0.28 1.42:0.07 1.55:0 2:0",
    "aug-E": "0:0 1.25:0 1.35:0.15 1.7:0.65 1.96:1 1.99:0.8 2:0",
    "con-E": "0:0 1:0 1.05:0.9 1.5:1 1.95:0.9 1.99:0.6 2:0",
    "late-E": "0:0 1.79:0 1.85:0.6 1.95:1 1.985:0.8 2:0",
    "dec-E": "0:0 0.999:0 1:0.8 1.04:1 1.5:0.62 1.97:0.28 1.995:0.2 2:0",
    "bi-E": "0:0 0.999:0 1:0.7 1.04:0.9 1.15:0.4 1.25:0.03 1.35:0 1.68:0 1.8:0.35 1.97:1 1.995:0.7 2:0",
    "tonic": "0:0.95 0.4:1 1:0.7 1.4:0.45 1.8:0.6 2:0.95",
    "NRM": "0:1 2:1",
    "silent": "0:0 2:0",
}.items()}


def level_at(curve: Curve, phase: FloatArray) -> FloatArray:
    """Return the curve's level at each canonical phase, same shape; 0 where the phase is NaN."""
    x, y = np.array(curve, dtype=float).T
    return np.asarray(np.nan_to_num(np.interp(phase, x, y), nan=0.0))


def varied(curve: Curve, rng: np.random.Generator, *, spread: float = 0.1) -> Curve:
    """Return the curve of one cell: levels scattered by `spread`, times by a tenth of that phase.

    Zeros stay zero and the points at the transitions stay where they are.
    """
    moved = [(_nudged(phase, 0.15 * spread, rng), level * float(np.exp(spread * rng.standard_normal())))
             for phase, level in curve]
    moved[-1] = (2.0, moved[0][1])
    return tuple(sorted(moved))


def turned(curve: Curve, by: float) -> Curve:
    """Return the curve `by` later in canonical phase, going round; for swells without a step."""
    x, y = np.array(curve, dtype=float).T
    grid = np.linspace(0, 2, 41)
    return tuple(zip(grid.tolist(), np.interp((grid - by) % 2, x, y).tolist(), strict=True))


def hurried(curve: Curve, share: float) -> Curve:
    """Return the curve with what happens around inspiration drawn closer to it in expiration.

    Where expiration lasts many seconds, firing before and after the burst keeps its milliseconds.
    """
    return tuple((_nearer(phase, share), level) for phase, level in curve)


def _nearer(phase: float, share: float) -> float:
    if phase <= 1:
        return phase
    return 1 + (phase - 1) * share if phase < 1.5 else 2 - (2 - phase) * share


def _nudged(phase: float, spread: float, rng: np.random.Generator) -> float:
    near = min(abs(phase - mark) for mark in (0.0, 1.0, 2.0))
    return phase + float(np.clip(spread * rng.standard_normal(), -0.45 * near, 0.45 * near))
