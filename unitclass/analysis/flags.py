"""What a reviewer should look at before trusting a suggestion."""

from __future__ import annotations

import numpy as np

from unitclass.analysis.cells import Cell
from unitclass.phase.profiles import UnitProfile
from unitclass.phase.rules import contradicts
from unitclass.records import NOT_MODULATED, Suggestion
from unitclass.settings import Settings

HALVES_R = 0.5  # histograms of odd and even cycles that agree less than this are unsteady
MUCH_DRIFT = 0.5  # of the mean rate, from the first third to the last
UNSURE = 0.6


def unit_flags(profile: UnitProfile, suggestion: Suggestion, cell: Cell, settings: Settings) -> tuple[str, ...]:
    """Return the flags of one unit in one condition, in words."""
    f, m, floor = profile.features, profile.modulation, settings.modulation
    flags = []
    if profile.histogram.n_cycles < floor.few_cycles:
        flags.append(f"few cycles ({profile.histogram.n_cycles})")
    if f.refractory_violations > floor.max_violations:
        flags.append(f"{100 * f.refractory_violations:.1f} % of intervals under {floor.refractory_ms:g} ms: "
                     "perhaps not one cell")
    if suggestion.probabilities:
        flags += _suggestion_flags(profile, suggestion, settings)
    if np.isfinite(f.drift) and abs(f.drift) > MUCH_DRIFT:
        flags.append(f"rate drifts by {100 * f.drift:+.0f} %")
    if cell.is_held:
        flags.append("held by bias current")
    if suggestion.type == NOT_MODULATED and not m.depth_high <= settings.classify.nrm_depth:
        flags.append("depth of modulation not bounded")
    return tuple(flags)


def _suggestion_flags(profile: UnitProfile, suggestion: Suggestion, settings: Settings) -> list[str]:
    f, flags = profile.features, []
    if contradicts(suggestion.rule_type, suggestion.type):
        flags.append(f"rule of thumb says {suggestion.rule_type}")
    if suggestion.probability < UNSURE:
        flags.append("unsure")
    if suggestion.type != NOT_MODULATED and np.isfinite(f.split_half_r) and f.split_half_r < HALVES_R:
        flags.append(f"halves of the session disagree (r {f.split_half_r:.2f})")
    if profile.histogram.n_spikes < settings.modulation.min_spikes:
        flags.append("from the membrane potential alone")
    return flags
