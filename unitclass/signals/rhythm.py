"""What the nerves of one condition say of the rhythm regime, as log-likelihoods with reasons."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from unitclass.records import REGIMES, Cycles, FloatArray, RhythmEvidence
from unitclass.signals.levels import excess
from unitclass.signals.marks import Marks

N_BINS = 20
MAX_WITHOUT_VAGUS = 1.5
MAX_WITH_VAGUS = 4.0
# Slope of the phrenic burst (second half minus first half over the mean): mean, sd. Common practice.
SLOPE = {"three-phase": (0.7, 0.35), "two-phase": (-0.1, 0.4), "one-phase": (-0.6, 0.4)}
# Duty cycle TI / TTOT: mean, sd. Common practice.
DUTY = {"three-phase": (0.32, 0.1), "two-phase": (0.42, 0.13), "one-phase": (0.1, 0.07)}
# Share of cycles with vagal post-inspiration: probability of seeing it.
POST_I = {"three-phase": 0.92, "two-phase": 0.05, "one-phase": 0.05}


@dataclass(frozen=True)
class Shape:
    """Average inspiratory burst: excess in equal time fractions, peak one, and its slope."""

    profile: FloatArray
    slope: float

    @property
    def words(self) -> str:
        """Return the shape's name in the trade."""
        if self.slope > 0.35:
            return "augmenting"
        return "decrementing" if self.slope < -0.25 else "square"


def burst_shape(marks: Marks, cycles: Cycles) -> Shape:
    """Return the average shape of the accepted bursts of the reference nerve."""
    used = cycles.accepted & np.isfinite(cycles.offset_s)
    if not used.any():
        return Shape(np.full(N_BINS, np.nan), np.nan)
    on, off = cycles.onset_s[used], cycles.offset_s[used]
    at = on[:, None] + (off - on)[:, None] * (np.arange(N_BINS) + 0.5) / N_BINS
    over = excess(marks.bursts.trace, marks.bursts.floor, marks.fine.is_power)
    rows = np.interp(at.ravel(), marks.fine.times_s, over).reshape(at.shape)
    profile = np.nanmedian(rows / np.nanmax(rows, axis=1, keepdims=True), axis=0)
    first, second = profile[: N_BINS // 2].mean(), profile[N_BINS // 2 :].mean()
    return Shape(profile / profile.max(), float((second - first) / profile.mean()))


def rhythm_evidence(shape: Shape, cycles: Cycles, role: str, *, has_vagus: bool) -> RhythmEvidence:
    """Return the log-likelihood of each regime given burst shape, duty and vagal post-inspiration.

    Burst shape tells for the phrenic only; without a vagus the evidence is kept weak.
    """
    score = dict.fromkeys(REGIMES, 0.0)
    reasons = []
    used = cycles.used()
    if role in ("phrenic", "unknown") and np.isfinite(shape.slope):
        _add(score, SLOPE, shape.slope, weight=1.0 if role == "phrenic" else 0.5)
        reasons.append(f"{role} burst is {shape.words} (slope {shape.slope:+.2f})")
    if used.n_cycles:
        duty = float(np.median(used.ti_s / used.ttot_s))
        _add(score, DUTY, duty, weight=0.5)
        reasons.append(f"inspiration takes {100 * duty:.0f} % of the cycle")
    if has_vagus and used.n_cycles:
        share = float(np.mean(np.isfinite(used.post_i_end_s)))
        for regime, p in POST_I.items():
            score[regime] += 1.3 * (share * np.log(p) + (1 - share) * np.log(1 - p))
        reasons.append(f"vagal post-inspiration in {100 * share:.0f} % of cycles")
    else:
        reasons.append("no vagus: post-inspiration cannot be judged, the regime stays open")
    if (used.late_e == 1).any():
        score["three-phase"] += 0.5
        reasons.append("abdominal nerve bursts in late expiration")
    return RhythmEvidence(_limited(score, MAX_WITH_VAGUS if has_vagus else MAX_WITHOUT_VAGUS), tuple(reasons),
                          pattern_of(shape, used, role))


def pattern_of(shape: Shape, used: Cycles, role: str) -> str:
    """Return "apneustic" or "gasping" where the bursts are so, else ""."""
    if used.n_cycles < 3:
        return ""
    ti, te = float(np.median(used.ti_s)), float(np.median(used.te_s))
    duty = ti / (ti + te)
    if duty > 0.55 and ti > 1.5 and abs(shape.slope) < 0.35:
        return "apneustic"
    if role == "phrenic" and shape.slope < -0.25 and duty < 0.15 and ti + te > 4:
        return "gasping"
    return ""


def _add(score: dict[str, float], table: dict[str, tuple[float, float]], value: float, *, weight: float) -> None:
    for regime, (mean, sd) in table.items():
        score[regime] += weight * float(-0.5 * ((value - mean) / sd) ** 2 - np.log(sd))


def _limited(score: dict[str, float], most: float) -> dict[str, float]:
    """Return scores with the best at zero and the others no further below than `most`."""
    best = max(score.values())
    return {regime: float(-most * np.tanh((best - value) / most)) for regime, value in score.items()}
