"""Stretches recorded through a changed electrode: level, noise and spike size jump together."""

from __future__ import annotations

from dataclasses import dataclass
from itertools import pairwise

import numpy as np
from numpy.lib.stride_tricks import sliding_window_view

from unitclass.records import Exclusion, FloatArray
from unitclass.signals.vm_looks import Seconds
from unitclass.signals.vm_stream import runs_of

LEAST_S = 20
SIDE = 8
"""A moment is judged by so many pieces (of a second) before it against as many after it."""

LEVEL_MV, NOISE_RATIO, SIZE_RATIO = 10.0, 2.0, 1.6
"""Two such differences at once are a changed access; one alone is a bias current, a state, a rhythm."""

ALONE_NOISE_RATIO, ALONE_SIZE_RATIO = 4.0, 2.5
LEAST_NOISE_MV = 0.05


@dataclass(frozen=True)
class _Look:
    """Level, noise and spike size, any one shape; NaN where not told."""

    level_mv: FloatArray
    noise_mv: FloatArray
    size_mv: FloatArray


def access_changes(seconds: Seconds, spike_s: FloatArray, size_mv: FloatArray,
                   known: list[Exclusion]) -> list[Exclusion]:
    """Find stretches recorded through a changed electrode: two of level, noise and spike size jump at once.

    The longest stretch between jumps is taken for the good one, weighed by its spikes' size and its noise.

    Parameters
    ----------
    seconds : Seconds
        In time order.
    spike_s, size_mv : ndarray, shape (n_spikes,)
        Spikes, ascending, and their size.
    known : list of Exclusion
        Time that is left out already.
    """
    rows = np.flatnonzero(seconds.free_of(known))
    if rows.size < LEAST_S:
        return []
    pieces = _Look(seconds.level_mv[rows], np.maximum(seconds.noise_mv[rows], LEAST_NOISE_MV),
                   _sizes(seconds, spike_s, size_mv)[rows])
    edges = [0, *_jumps(pieces), rows.size]
    parts = [_median_look(pieces, a, b) for a, b in pairwise(edges)]
    length = [b - a for a, b in pairwise(edges)]
    usual = parts[int(np.argmax([n * _worth(part, parts) for n, part in zip(length, parts, strict=True)]))]
    return [Exclusion(float(seconds.start_s[rows[a]]), float(seconds.stop_s[rows[b - 1]]),
                      f"access changed: {_words(usual, part)}")
            for (a, b), part in zip(pairwise(edges), parts, strict=True) if _strength(usual, part) > 0.0]


def _sizes(seconds: Seconds, spike_s: FloatArray, size_mv: FloatArray) -> FloatArray:
    """Return the largest spike of each piece, NaN without spikes."""
    out = np.full(seconds.start_s.size, np.nan)
    at = np.clip(np.searchsorted(seconds.start_s, spike_s, side="right") - 1, 0, out.size - 1)
    np.fmax.at(out, at, size_mv)
    return out


def _jumps(pieces: _Look) -> list[int]:
    """Return the positions at which the pieces before and after differ most."""
    sides = [_sliding_medians(of) for of in (pieces.level_mv, pieces.noise_mv, pieces.size_mv)]
    strength = _strength(_Look(*(before for before, _ in sides)), _Look(*(after for _, after in sides)))
    strength[:4] = strength[-4:] = 0.0
    found: list[int] = []
    for a, b in runs_of(strength > 0.0):
        found.append(a + int(np.median(np.flatnonzero(strength[a:b] >= 0.9 * strength[a:b].max()))))
    return found


def _sliding_medians(values: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Return the medians of the SIDE values before each position, and of those from it on."""
    windows = sliding_window_view(np.pad(values, SIDE, mode="edge"), SIDE)
    middle = _median(windows)
    return middle[: values.size], middle[SIDE : SIDE + values.size]


def _median(values: FloatArray) -> FloatArray:
    """Return the median of what is told along the last axis; NaN where fewer than two are."""
    n_told = np.isfinite(values).sum(axis=-1)
    ordered = np.sort(values, axis=-1)  # NaN comes last
    low = np.take_along_axis(ordered, (np.maximum(n_told - 1, 0) // 2)[..., None], axis=-1)[..., 0]
    high = np.take_along_axis(ordered, np.minimum(n_told // 2, values.shape[-1] - 1)[..., None], axis=-1)[..., 0]
    return np.where(n_told >= 2, 0.5 * (low + np.where(n_told % 2, low, high)), np.nan)


def _median_look(pieces: _Look, first: int, stop: int) -> _Look:
    return _Look(*(_median(of[first:stop]) for of in (pieces.level_mv, pieces.noise_mv, pieces.size_mv)))


def _worth(one: _Look, others: list[_Look]) -> float:
    """Return how good a stretch looks, at most 1: large spikes and little noise."""
    largest = np.fmax.reduce([o.size_mv for o in others])
    size = float(one.size_mv / largest) if one.size_mv > 0 else 0.5
    return size * float(min(o.noise_mv for o in others) / one.noise_mv)


def _ratios(one: _Look, other: _Look) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Return |level difference|, noise ratio and size ratio, both at least 1 (1 where not told)."""
    noise = np.abs(np.log2(other.noise_mv / one.noise_mv))
    size = np.abs(np.log2(other.size_mv / one.size_mv))
    return np.abs(other.level_mv - one.level_mv), 2.0 ** np.nan_to_num(noise), 2.0 ** np.nan_to_num(size)


def _strength(one: _Look, other: _Look) -> FloatArray:
    """Return 0 where access is unchanged, else how clearly it changed."""
    level, noise, size = _ratios(one, other)
    votes = (level >= LEVEL_MV).astype(int) + (noise >= NOISE_RATIO) + (size >= SIZE_RATIO)
    changed = (votes >= 2) | (noise >= ALONE_NOISE_RATIO) | (size >= ALONE_SIZE_RATIO)
    return np.where(changed, level / LEVEL_MV + np.log2(noise) + np.log2(size) / np.log2(SIZE_RATIO), 0.0)


def _words(usual: _Look, part: _Look) -> str:
    level, noise, size = _ratios(usual, part)
    words = []
    if level >= 0.5 * LEVEL_MV:
        words.append(f"level {float(part.level_mv - usual.level_mv):+.0f} mV")
    if noise >= 1.5:
        words.append(f"noise x {float(part.noise_mv / usual.noise_mv):.1f}")
    if size >= 1.3:
        words.append(f"spikes x {float(part.size_mv / usual.size_mv):.1f}")
    return ", ".join(words)
