"""Which way up an integrated nerve was recorded."""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING

import numpy as np

from unitclass.records import FloatArray
from unitclass.signals.smoothing import filled, smooth

if TYPE_CHECKING:
    from unitclass.signals.neurogram import Activity

SMOOTH_S = 0.05
TAIL = 0.5  # percent of the samples that may be artefacts at either end
SKEW_BELOW_ZERO, SKEW_AROUND_ZERO, SKEW_ABOVE_ZERO = 0.0, -0.4, -0.9
"""A trace is turned over when its skewness is below this. A nerve rests longer than it fires, so bursts
make a tail; but a long inspiration rests less. What lies wholly below zero was turned over by its
amplifier, what lies above it was hardly."""


def upright(made: Activity) -> Activity:
    """Return the activity with its bursts pointing up."""
    trace = filled(smooth(made.values, SMOOTH_S * made.rate_hz))
    low, high = np.percentile(trace, [TAIL, 100 - TAIL])
    least = SKEW_BELOW_ZERO if high <= 0 else SKEW_ABOVE_ZERO if low >= 0 else SKEW_AROUND_ZERO
    if not high > low or _skewness(np.clip(trace, low, high)) >= least:
        return made
    return replace(made, values=-made.values, sign=-1, words=(*made.words, "turned over: its bursts point down"))


def _skewness(values: FloatArray) -> float:
    """Return the third standardised moment."""
    centred = values - values.mean()
    return float(np.mean(centred**3) / max(float(np.mean(centred**2)) ** 1.5, 1e-300))
