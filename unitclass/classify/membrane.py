"""What the membrane potential adds: where in the cycle the cell is held hyperpolarised.

Spikes and the depolarisation under them are one fact, so only phases in which the cell does not
fire vote; a cell without spikes is judged by its trajectory alone.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np

from unitclass.classify.draws import DrawnFamilies
from unitclass.classify.templates import MEMBRANE_PHASES, TypeLibrary
from unitclass.records import FloatArray

SPANS: Mapping[str, tuple[float, float]] = {"early I": (0.0, 0.5), "late I": (0.5, 1.0), "post-I": (1.0, 1.3),
                                            "E2": (1.3, 2.0)}
UNEXPECTED = 0.08  # share of cells whose membrane potential goes against the rule; memory of the literature
SMALL_MV = 1.0  # a level this far from the mean is no clear sign
QUIET_SHARE = 0.1  # of the peak rate: below this the cell does not fire in a phase


@dataclass(frozen=True)
class MembraneLevels:
    """Mean level against the cell's own mean, mV, with its standard error, by MEMBRANE_PHASES.

    `may_vote` is False where fill or bias current take its say away; `reason` says why.
    """

    level_mv: Mapping[str, float]
    error_mv: Mapping[str, float]
    may_vote: bool = True
    reason: str = ""


def quiet_phases(rate_hz: FloatArray) -> tuple[str, ...]:
    """Return the phases in which a unit does not fire; `rate_hz` has shape (n_bins,)."""
    centres = (np.arange(rate_hz.size) + 0.5) * (2.0 / rate_hz.size)
    peak = np.nanmax(rate_hz) if np.isfinite(rate_hz).any() else 0.0
    quiet = []
    for phase, (low, high) in SPANS.items():
        mine = rate_hz[(centres >= low) & (centres < high)]
        if peak == 0 or np.nanmean(mine) <= QUIET_SHARE * peak:
            quiet.append(phase)
    return tuple(quiet)


def membrane_evidence(levels: MembraneLevels, quiet: tuple[str, ...], library: TypeLibrary,
                      drawn: DrawnFamilies, *, is_alone: bool) -> FloatArray:
    """Return the log evidence of the membrane potential for every family and other, (n_types + 1,).

    Parameters
    ----------
    quiet : tuple of str
        Phases in which the cell does not fire: the only ones that vote.
    is_alone : bool
        True for a cell without spikes: families without a stated sign are then expected to be
        depolarised where they would fire.
    """
    total = np.zeros(len(library.families) + 1)
    for phase in quiet:
        level, error = levels.level_mv.get(phase, np.nan), levels.error_mv.get(phase, np.nan)
        if not np.isfinite(level):
            continue
        agrees = _agreement(level, error)
        for i, family in enumerate(library.families):
            sign = family.membrane.get(phase, _profile_sign(drawn, family.id, phase) if is_alone else 0)
            total[i] += np.log({1: agrees, -1: 1 - agrees, 0: 0.5}[sign])
        total[-1] += np.log(0.5)
    return total


def _agreement(level_mv: float, error_mv: float) -> float:
    """Return the probability of seeing a level this positive where a positive one is expected."""
    from scipy.special import ndtr

    spread = np.hypot(SMALL_MV, error_mv if np.isfinite(error_mv) else 0.0)
    return float(UNEXPECTED + (1 - 2 * UNEXPECTED) * ndtr(level_mv / spread))


def _profile_sign(drawn: DrawnFamilies, type_id: str, phase: str) -> int:
    mean = drawn.rate[drawn.rows(type_id)].mean(axis=0)
    centres = (np.arange(mean.size) + 0.5) * (2.0 / mean.size)
    low, high = SPANS[phase]
    level = float(mean[(centres >= low) & (centres < high)].mean())
    return 1 if level > 1.25 else -1 if level < 0.8 else 0


def level_words(levels: MembraneLevels) -> tuple[str, ...]:
    """Return a sentence for each phase whose level stands out from its error."""
    words = []
    for phase in MEMBRANE_PHASES:
        level, error = levels.level_mv.get(phase, np.nan), levels.error_mv.get(phase, np.nan)
        if np.isfinite(level) and abs(level) > max(SMALL_MV, 2 * error):
            side = "hyperpolarised" if level < 0 else "depolarised"
            words.append(f"{side} by {abs(level):.1f} mV in {phase}")
    return tuple(words)
