"""The grounds of a suggestion in words that a reviewer can check against the picture."""

from __future__ import annotations

import numpy as np

from unitclass.records import NOT_MODULATED, OTHER, Features, Modulation, PhaseHistogram

SILENT_SHARE = 0.05  # of the peak rate: below this a phase is called silent


def phase_words(phase: float) -> str:
    """Return a canonical phase as the trade says it: "30 % into expiration"."""
    if phase < 1.0:
        return f"{100 * phase:.0f} % into inspiration"
    return f"{100 * (phase - 1.0):.0f} % into expiration"


def firing_reasons(histogram: PhaseHistogram, modulation: Modulation, features: Features) -> tuple[str, ...]:
    """Return what the histogram shows, most telling first, independent of any suggestion."""
    words = [_where(features), _peak(features), _course(features), _participation(features),
             _modulation(modulation)]
    return tuple(word for word in words if word)


def type_reasons(type_id: str, modulation: Modulation, nrm_depth: float) -> tuple[str, ...]:
    """Return what only this suggestion needs to say."""
    if type_id == NOT_MODULATED:
        limit = modulation.depth_high
        if not np.isfinite(limit):
            return ("the depth of modulation has no upper limit yet",)
        bounded = "at most" if limit <= nrm_depth else "not bounded: it may be as much as"
        return (f"depth of modulation {modulation.depth:.2f}, {bounded} {limit:.2f} (95 %)",)
    if type_id == OTHER:
        return ("modulated, but no family comes near its histogram",)
    return ()


def odds_words(first: str, second: str, probability: float, second_probability: float) -> str:
    """Return how the runner-up compares."""
    if second_probability < 0.005 * probability:
        return f"no other type comes near (next is {second})"
    return f"{first} over {second} by odds of {_odds(probability / second_probability)}"


def _odds(ratio: float) -> str:
    return f"{ratio:.0f} to 1" if ratio >= 9.5 else f"{ratio:.1f} to 1"


def _where(f: Features) -> str:
    if not np.isfinite(f.peak_rate_hz) or f.peak_rate_hz <= 0:
        return ""
    if f.rate_i_hz < SILENT_SHARE * f.peak_rate_hz:
        return "silent in inspiration"
    if f.rate_e_hz < SILENT_SHARE * f.peak_rate_hz:
        return "silent in expiration"
    if np.isfinite(f.onset_phase) and np.isfinite(f.offset_phase):
        return f"fires from {phase_words(f.onset_phase)} to {phase_words(f.offset_phase)}"
    return "fires throughout the cycle"


def _peak(f: Features) -> str:
    if not (np.isfinite(f.peak_phase) and np.isfinite(f.peak_rate_hz)):
        return ""
    return f"peak {phase_words(f.peak_phase)}, {f.peak_rate_hz:.3g} spikes/s"


def _course(f: Features) -> str:
    if np.isfinite(f.decay_ms) and f.slope < -0.5:
        return f"falls to half within {f.decay_ms * np.log(2) / 1e3:.2g} s"
    if not np.isfinite(f.slope):
        return ""
    if f.slope > 0.5:
        return "rises through its active phase"
    return "falls through its active phase" if f.slope < -0.5 else "about steady through its active phase"


def _participation(f: Features) -> str:
    if not np.isfinite(f.participation) or f.participation > 0.8:
        return ""
    pattern = f" (one cycle in {f.n_to_1})" if f.n_to_1 > 1 else ""
    return f"takes part in {100 * f.participation:.0f} % of cycles{pattern}"


def _modulation(m: Modulation) -> str:
    if not (np.isfinite(m.eta_squared) and np.isfinite(m.eta_squared_p)):
        return ""
    sign = "≤" if m.eta_squared_p <= 1.5 / (m.n_shifts + 1) else "="
    return f"eta squared {m.eta_squared:.2f}, p {sign} {m.eta_squared_p:.2g} ({m.n_shifts} shifts)"
