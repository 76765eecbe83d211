"""Where in the cycle a cell is held hyperpolarised or depolarised, in mV and in words.

The word is "hyperpolarised": what one sees may be inhibition, disfacilitation or after-
hyperpolarisation, and shunting inhibition may show nothing.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np

from unitclass.records import Cycles, FloatArray, VmProfile

PHASES: Mapping[str, tuple[float, float]] = {"early I": (0.0, 0.5), "late I": (0.5, 1.0), "post-I": (1.0, 1.3),
                                             "E2": (1.3, 1.8), "late E": (1.8, 2.0)}
"""Canonical phase of each part of the cycle; common practice, but for post-I where a vagus tells."""

WHOLE: Mapping[str, tuple[str, ...]] = {"inspiration": ("early I", "late I"),
                                        "expiration": ("post-I", "E2", "late E")}

CLEAR_MV = 1.0
CLEAR_ERRORS = 2.0


@dataclass(frozen=True)
class VmLevels:
    """Mean level of each part of the cycle, by its name in PHASES.

    Attributes
    ----------
    level_mv : Mapping
        Against the cell's own time-weighted mean over the cycle; negative is hyperpolarised.
    error_mv : Mapping
        Standard error over cycles; NaN with fewer than two.
    from_trough_mv : Mapping
        Above the most negative bin of the mean.
    spans : Mapping
        The canonical phases that were used.
    sentences : tuple of str
        What stands out, in words.
    """

    level_mv: Mapping[str, float]
    error_mv: Mapping[str, float]
    from_trough_mv: Mapping[str, float]
    spans: Mapping[str, tuple[float, float]]
    sentences: tuple[str, ...]


def vm_phase_levels(profile: VmProfile, cycles: Cycles | None = None) -> VmLevels:
    """Return the level of each part of the cycle with its standard error over cycles.

    Parameters
    ----------
    profile : VmProfile
        Levels are NaN when it has no cycles.
    cycles : Cycles, optional
        Where a vagus told the end of post-inspiration, its median phase parts post-I from E2.
    """
    spans = _spans(cycles)
    found = {name: _level(profile, span) for name, span in spans.items()}
    level = {name: value for name, (value, _) in found.items()}
    error = {name: value for name, (_, value) in found.items()}
    trough = float(profile.mean_mv.min()) if profile.mean_mv.size else float("nan")
    above = {name: profile.reference_mv + value - trough for name, value in level.items()}
    return VmLevels(level, error, above, spans, _sentences(profile, level, error, spans))


def _spans(cycles: Cycles | None) -> dict[str, tuple[float, float]]:
    spans = dict(PHASES)
    if cycles is None:
        return spans
    used = cycles.used()
    share = (used.post_i_end_s - used.offset_s) / used.te_s
    told = share[np.isfinite(share)]
    if told.size >= 3:
        parting = 1.0 + float(np.clip(np.median(told), 0.05, 0.75))
        spans["post-I"], spans["E2"] = (1.0, parting), (parting, 1.8)
    return spans


def _weights(n_bins: int, span: tuple[float, float]) -> FloatArray:
    """Return the share of each bin in a span of canonical phase; sums to one."""
    edges = np.linspace(0.0, 2.0, n_bins + 1)
    overlap = np.clip(np.minimum(edges[1:], span[1]) - np.maximum(edges[:-1], span[0]), 0.0, None)
    return np.asarray(overlap / overlap.sum())


def _level(profile: VmProfile, span: tuple[float, float]) -> tuple[float, float]:
    n_bins = profile.mean_mv.size
    if n_bins == 0:
        return float("nan"), float("nan")
    w = _weights(n_bins, span)
    level = float(w @ profile.mean_mv) - profile.reference_mv
    if profile.covariance_mv2.shape != (n_bins, n_bins) or profile.n_cycles < 2:
        return level, float("nan")
    variance = float(w @ profile.covariance_mv2 @ w)
    return level, float(np.sqrt(max(variance, 0.0) / profile.n_cycles))


def _is_clear(level: float, error: float) -> bool:
    return bool(abs(level) > max(CLEAR_MV, CLEAR_ERRORS * (error if np.isfinite(error) else 0.0)))


def _sentences(profile: VmProfile, level: Mapping[str, float], error: Mapping[str, float],
               spans: Mapping[str, tuple[float, float]]) -> tuple[str, ...]:
    words = []
    for whole, parts in WHOLE.items():
        clear = [p for p in parts if _is_clear(level[p], error[p])]
        if len(clear) == len(parts) and len({level[p] > 0 for p in parts}) == 1:
            span = (spans[parts[0]][0], spans[parts[-1]][1])
            words.append(_sentence(*_level(profile, span), whole))
        else:
            words += [_sentence(level[p], error[p], p) for p in clear]
    return tuple(words)


def _sentence(level: float, error: float, where: str) -> str:
    side = "hyperpolarised" if level < 0 else "depolarised"
    doubt = f" (± {error:.1f})" if np.isfinite(error) else ""
    return f"{side} by {abs(level):.1f} mV{doubt} in {where}"
