"""The edge of an active phase: a crossing of a smooth rate, or a step in the counts."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from unitclass.records import FloatArray

STEP_GAIN = 1.0
"""Log likelihood by which a step must beat a ramp; smoothing would blur the step to either side."""
STEP_HEIGHT = 0.4
"""Smallest step, as a share of the peak's height over background."""
PLACES_PER_BIN = 4


@dataclass(frozen=True)
class Rise:
    """A unit's histogram around the bin where it becomes active, quiet side first.

    `counts`, `seconds`, `rate_hz` (smoothed) have shape (n_window,); the bin `n_quiet` is the first
    active one by the smoothed rate.
    """

    counts: FloatArray
    seconds: FloatArray
    rate_hz: FloatArray
    n_quiet: int


@dataclass(frozen=True)
class Place:
    """Where firing begins, in bins from the window's start, and whether it does so by a step."""

    bins: float
    is_step: bool


def rise_place(rise: Rise, level_hz: float, background_hz: float, peak_hz: float, *,
               is_blurred: bool = False) -> Place:
    """Return where firing begins.

    Where a step of some height explains the counts clearly better than a ramp, the step. Else,
    when `is_blurred` says that it is a step all the same whose place differs from cycle to cycle,
    its mean place. Else the smoothed rate's passing of `level_hz`, interpolated between the
    bins' middles.
    """
    place, height, gain = _best_step(rise, background_hz)
    if gain >= STEP_GAIN and height >= STEP_HEIGHT * (peak_hz - background_hz):
        return Place(place, True)
    if is_blurred:
        return Place(_mean_place(rise, background_hz), True)
    below, above = rise.rate_hz[rise.n_quiet - 1], rise.rate_hz[rise.n_quiet]
    share = (level_hz - below) / (above - below) if above > below else 0.5
    return Place(float(rise.n_quiet - 0.5 + np.clip(share, 0.0, 1.0)), False)


def _best_step(rise: Rise, background_hz: float) -> tuple[float, float, float]:
    """Return the best step's place and height, and its log likelihood over that of the best ramp."""
    n = rise.counts.size
    floor = max(background_hz, 0.5 / max(float(rise.seconds.sum()), 1e-9))
    place = np.arange(PLACES_PER_BIN, (n - 1) * PLACES_PER_BIN + 1) / PLACES_PER_BIN
    ends = np.clip(np.arange(n + 1) - place[:, None], 0.0, None)
    # Each form is its mean over the bin: a step fills the bin it falls into partly.
    stepped, heights = _fits(rise, floor, np.diff(ends, axis=1))
    ramped, _ = _fits(rise, floor, np.diff(ends**2, axis=1) / 2)
    best = int(np.argmax(stepped))
    return float(place[best]), float(heights[best]), float(stepped[best] - ramped.max())


def _mean_place(rise: Rise, background_hz: float) -> float:
    """Return the place of the step with the same area under the same height, that of the last third."""
    n = rise.counts.size
    excess = rise.counts / np.maximum(rise.seconds, 1e-12) - background_hz
    height = excess[-max(1, n // 3):].mean()
    return float(np.clip(n - excess.sum() / height, 0, n)) if height > 0 else float(rise.n_quiet)


def _fits(rise: Rise, floor_hz: float, form: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Return the Poisson log likelihood of floor + height x form, and the height by moments, (n_forms,)."""
    excess = np.maximum((form > 0) @ (rise.counts - floor_hz * rise.seconds), 0.0)
    height = excess / np.maximum(form @ rise.seconds, 1e-12)
    rate = floor_hz + height[:, None] * form
    return np.log(rate) @ rise.counts - rate @ rise.seconds, height
