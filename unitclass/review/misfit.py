"""Where a unit's data and its suggestion contradict each other, in words for a reviewer."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np

from unitclass.records import SILENT, UNDETERMINED, FloatArray, UnitResult

LARGE_SHARE = 0.12
"""Share of the spikes outside what the family allows, beyond both bands, that is a contradiction."""

CLOSE = 0.1
"""Greatest difference, as a share of the fitted peak, that is not worth a place."""


@dataclass(frozen=True)
class Misfit:
    """Where a histogram and the fitted family differ most.

    `observed_hz` is the unit's rate at canonical `phase`; `low_hz` to `high_hz` the family's band
    there. `share` is the share of all spikes that lie beyond both the histogram's confidence limits
    and the family's band; `is_contradiction` when it is large, `is_close` when no bin differs.
    """

    phase: float
    observed_hz: float
    expected_hz: float
    low_hz: float
    high_hz: float
    share: float
    is_contradiction: bool
    is_close: bool = False

    def words(self, family: str) -> str:
        """Return one sentence with phase and rates."""
        where = f"at phase {self.phase:.2f}: {self.observed_hz:.0f} spikes/s"
        if self.is_contradiction:
            return f"does not fit {family} {where}, {family} allows {self.low_hz:.0f} to {self.high_hz:.0f}"
        if self.is_close:
            return f"follows {family} within {CLOSE:.0%} of its peak rate"
        return f"differs most from {family} {where}, fitted {self.expected_hz:.0f}"


def misfit(unit: UnitResult) -> Misfit | None:
    """Return where data and fitted family differ most; None when no family was fitted."""
    histogram, fit = unit.histogram, unit.suggestion
    if fit.fitted_rate_hz.size != histogram.n_bins or histogram.n_spikes == 0:
        return None
    rate = histogram.rate_hz
    gap = _gap(histogram.low_hz, histogram.high_hz, fit.fitted_low_hz, fit.fitted_high_hz)
    beyond = float(np.nansum(gap * histogram.exposure_s)) / histogram.n_spikes
    is_contradiction = beyond > LARGE_SHARE
    worst = int(np.argmax(gap if is_contradiction else np.nan_to_num(np.abs(rate - fit.fitted_rate_hz))))
    return Misfit(float(histogram.centres[worst]), float(rate[worst]), float(fit.fitted_rate_hz[worst]),
                  float(fit.fitted_low_hz[worst]), float(fit.fitted_high_hz[worst]), beyond,
                  is_contradiction, _is_close(rate, fit.fitted_rate_hz))


def _is_close(rate: FloatArray, fitted: FloatArray) -> bool:
    return bool(np.nanmax(np.abs(rate - fitted)) <= CLOSE * np.nanmax(fitted))


def _gap(low: FloatArray, high: FloatArray, fit_low: FloatArray, fit_high: FloatArray) -> FloatArray:
    """Return how far two intervals are apart, 0 where they overlap or are unknown."""
    return np.nan_to_num(np.maximum(np.maximum(low - fit_high, fit_low - high), 0.0))


def contradictions(unit: UnitResult) -> tuple[str, ...]:
    """Return the sentences that speak against the suggestion, strongest first; none for a sound one."""
    return tuple(_contradictions(unit))


def _contradictions(unit: UnitResult) -> Iterator[str]:
    suggestion = unit.suggestion
    name = suggestion.type
    worst = misfit(unit)
    if worst is not None and worst.is_contradiction:
        yield worst.words(name)
    if suggestion.rule_type and suggestion.rule_type != name and name not in (SILENT, UNDETERMINED):
        yield f"by the rule of thumb this is {suggestion.rule_type}"
    if suggestion.ranked and suggestion.ranked[0][0] != name:
        top, probability = suggestion.ranked[0]
        yield f"{top} is more probable ({probability:.2f}) than {name}"
    if name == SILENT and unit.n_spikes > max(unit.n_cycles, 20):
        yield f"called silent, but {unit.n_spikes} spikes were counted"
