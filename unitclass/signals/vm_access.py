"""Stretches recorded through a changed electrode: level, noise and spike size jump together."""

from __future__ import annotations

from dataclasses import dataclass
from itertools import pairwise

import numpy as np

from unitclass.records import Exclusion, FloatArray
from unitclass.signals.vm_looks import Seconds
from unitclass.signals.vm_stream import runs_of


@dataclass(frozen=True)
class _Look:
    """Level, noise and spike size of one side of a moment; NaN where not told."""

    level_mv: float
    noise_mv: float
    size_mv: float


def access_changes(seconds: Seconds, spike_s: FloatArray, size_mv: FloatArray,
                   known: list[Exclusion]) -> list[Exclusion]:
    """Find stretches recorded through a changed electrode: two of level, noise and spike size jump at once.

    The longest stretch between jumps is taken for the good one.
    """
    free = ~np.any([(seconds.start_s < p.stop_s) & (seconds.stop_s > p.start_s) for p in known], axis=0) \
        if known else np.ones(seconds.start_s.size, bool)
    rows = np.flatnonzero(free)
    if rows.size < 20:
        return []
    sizes = _sizes(seconds, spike_s, size_mv)
    edges = [0, *_jumps(seconds, sizes, rows), rows.size]
    parts = [rows[a:b] for a, b in pairwise(edges)]
    good = max(parts, key=len)
    usual = _look(seconds, sizes, good)
    problems = []
    for part in parts:
        words = _difference(usual, _look(seconds, sizes, part))
        if part is not good and words:
            problems.append(Exclusion(float(seconds.start_s[part[0]]), float(seconds.stop_s[part[-1]]),
                                      f"access changed: {words}"))
    return problems


def _sizes(seconds: Seconds, spike_s: FloatArray, size_mv: FloatArray) -> FloatArray:
    """Return the largest spike of each piece, NaN without spikes."""
    out = np.full(seconds.start_s.size, np.nan)
    at = np.clip(np.searchsorted(seconds.start_s, spike_s, side="right") - 1, 0, out.size - 1)
    np.fmax.at(out, at, size_mv)
    return out


def _look(seconds: Seconds, sizes: FloatArray, rows: np.ndarray) -> _Look:
    told = sizes[rows][np.isfinite(sizes[rows])]
    return _Look(float(np.median(seconds.level_mv[rows])), float(np.median(seconds.noise_mv[rows])),
                 float(np.median(told)) if told.size >= 2 else float("nan"))


def _jumps(seconds: Seconds, sizes: FloatArray, rows: np.ndarray, *, side: int = 8) -> list[int]:
    """Return the positions in `rows` at which the looks before and after differ most."""
    found: list[int] = []
    strength = np.zeros(rows.size)
    for i in range(4, rows.size - 4):
        before = _look(seconds, sizes, rows[max(0, i - side) : i])
        after = _look(seconds, sizes, rows[i : i + side])
        strength[i] = _strength(before, after)
    for a, b in runs_of(strength > 0.0):
        found.append(a + int(np.argmax(strength[a:b])))
    return found


def _ratios(one: _Look, other: _Look) -> tuple[float, float, float]:
    """Return |level difference|, noise ratio and size ratio, both at least 1."""
    noise = max(other.noise_mv, 0.02) / max(one.noise_mv, 0.02)
    size = other.size_mv / one.size_mv if one.size_mv > 0 and other.size_mv > 0 else 1.0
    return abs(other.level_mv - one.level_mv), max(noise, 1 / noise), max(size, 1 / size)


def _strength(one: _Look, other: _Look) -> float:
    """Return 0 where access is unchanged, else how clearly it changed."""
    level, noise, size = _ratios(one, other)
    votes = (level >= 10.0) + (noise >= 2.0) + (size >= 1.6)
    if votes < 2 and noise < 4.0 and size < 2.5:
        return 0.0
    return float(level / 10.0 + np.log2(noise) + np.log2(size) / np.log2(1.6))


def _difference(usual: _Look, part: _Look) -> str:
    if _strength(usual, part) == 0.0:
        return ""
    level, noise, size = _ratios(usual, part)
    words = []
    if level >= 5.0:
        words.append(f"level {part.level_mv - usual.level_mv:+.0f} mV")
    if noise >= 1.5:
        words.append(f"noise x {max(part.noise_mv, 0.02) / max(usual.noise_mv, 0.02):.1f}")
    if size >= 1.3:
        words.append(f"spikes x {part.size_mv / usual.size_mv:.1f}")
    return ", ".join(words)
