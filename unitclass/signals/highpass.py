"""A high-pass out of moving averages: linear phase, a few additions a sample, no filter design.

Taking a moving average off, twice, leaves 1 - sinc(f W) squared: with W = 0.44 / f_c the response
is about a half at f_c and a hundredth at half of it, where the mains and the heart are.
"""

from __future__ import annotations

import numpy as np

from unitclass.records import FloatArray

WIDTH = 0.44  # of the moving average, in periods of the lower edge of the band


class HighPass:
    """Filters consecutive pieces of a trace; what comes out is `delay` samples late."""

    def __init__(self, low_hz: float, rate_hz: float) -> None:
        self._width = max(3, round(WIDTH * rate_hz / low_hz) | 1)
        self.delay = self._width - 1
        self._before = np.zeros(2 * self.delay)

    def filtered(self, values: FloatArray) -> FloatArray:
        """Return the filtered piece, shape (n_samples,), the trace as it was `delay` samples ago."""
        joined = np.concatenate([self._before, values])
        self._before = joined[-2 * self.delay :]
        return self._without_mean(self._without_mean(joined))

    def _without_mean(self, values: FloatArray) -> FloatArray:
        half = self.delay // 2
        total = np.concatenate([[0.0], np.cumsum(values, dtype=float)])
        mean = (total[self._width :] - total[: -self._width]) / self._width
        return values[half : half + mean.size] - mean
