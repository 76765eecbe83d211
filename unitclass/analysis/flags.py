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
MUCH_FOREIGN = 0.25  # sorting always leaves some foreign spikes: common practice
LEAST_VIOLATIONS = 3


def unit_flags(profile: UnitProfile, suggestion: Suggestion, cell: Cell, settings: Settings) -> tuple[str, ...]:
    """Return the flags of one unit in one condition, in words."""
    f, m, floor = profile.features, profile.modulation, settings.modulation
    flags = []
    if profile.histogram.n_cycles < floor.few_cycles:
        flags.append(f"few cycles ({profile.histogram.n_cycles})")
    foreign = foreign_share(profile, floor.refractory_ms)
    if f.refractory_violations > floor.max_violations or foreign > MUCH_FOREIGN:
        flags.append(f"{100 * f.refractory_violations:.1f} % of intervals under {floor.refractory_ms:g} ms: "
                     f"perhaps not one cell{_foreign_words(foreign)}")
    if suggestion.probabilities:
        flags += _suggestion_flags(profile, suggestion, settings)
    if np.isfinite(f.drift) and abs(f.drift) > MUCH_DRIFT:
        flags.append(f"rate drifts by {100 * f.drift:+.0f} %")
    if cell.is_held:
        flags.append("held by bias current")
    if suggestion.type == NOT_MODULATED and not m.depth_high <= settings.classify.nrm_depth:
        flags.append("depth of modulation not bounded")
    return tuple(flags)


def foreign_share(profile: UnitProfile, refractory_ms: float) -> float:
    """Return the share of spikes that another cell would have to fire to make the refractory violations seen.

    Two trains that know nothing of each other, f of the spikes from the lesser, break the refractory
    period in 2 f (1 - f) rate x period of the intervals [1]_; the rate is that at the time of a spike, since
    cells fire in bursts. Fewer than three violations tell nothing: 0.

    References
    ----------
    .. [1] D. N. Hill, S. B. Mehta, D. Kleinfeld, "Quality metrics to accompany spike sorting of
       extracellular signals", J Neurosci 31:8699, 2011.
    """
    h, violations = profile.histogram, profile.features.refractory_violations
    if not np.isfinite(violations) or violations * h.n_spikes < LEAST_VIOLATIONS:
        return 0.0
    seen = h.exposure_s > 0
    rate_hz = float(np.sum(h.counts[seen] ** 2 / h.exposure_s[seen]) / max(h.counts.sum(), 1))
    mixed = 2 * violations / max(rate_hz * refractory_ms / 1e3, 1e-12)
    return 0.5 if mixed >= 1 else 0.5 * (1 - float(np.sqrt(1 - mixed)))


def _foreign_words(share: float) -> str:
    if share <= MUCH_FOREIGN:
        return ""
    if share >= 0.5:
        return ", as if it were two mixed half and half"
    return f", as if {100 * share:.0f} % of the spikes were another's"


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
