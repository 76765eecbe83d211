"""Whether an integrated trace is rectified noise, in which floor and burst add as powers."""

from __future__ import annotations

import numpy as np

from unitclass.records import FloatArray
from unitclass.signals.smoothing import filled, smooth

STEP_S, SMOOTH_S = 0.01, 0.1
QUIET, LOUD = 35.0, 90.0  # percentiles of the level
LEAST_CONTRAST = 1.3
HALFWAY = 0.5  # exponent of noise against level: 0 for noise that is added, 1 for rectified noise


def is_rectified(values: FloatArray, rate_hz: float) -> bool:
    """Return whether noise grows with the level, down to a true zero.

    Rectified and integrated activity of many fibres is noise whose spread is a fixed share of its
    level, on the floor as in the burst; an amplifier's noise, or a drawn envelope's, is the same
    everywhere. Only of the former is a burst of amplitude e over a floor f read as sqrt(f² + e²).

    Parameters
    ----------
    values : ndarray, shape (n_samples,)
        As recorded, bursts up; NaN in gaps.
    """
    if not float(np.nanmin(values)) >= 0.0:
        return False
    trace, k = filled(values), max(1, round(STEP_S * rate_hz))
    level = smooth(trace, SMOOTH_S * rate_hz)[k:-k]
    bend = np.abs(trace[2 * k :] - 2 * trace[k:-k] + trace[: -2 * k])
    low, high = np.percentile(level, [QUIET, LOUD])
    if not high > LEAST_CONTRAST * low > 0:
        return False
    quiet, loud = float(np.median(bend[level <= low])), float(np.median(bend[level >= high]))
    ratio = float(np.median(level[level >= high])) / float(np.median(level[level <= low]))
    return quiet > 0 and float(np.log(max(loud, 1e-300) / quiet)) > HALFWAY * float(np.log(ratio))
