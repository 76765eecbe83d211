"""Breaths of an invented preparation: their times, sizes and mishaps."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from unitclass.records import FloatArray, IntArray

Row = tuple[float, float, float, float, str]


@dataclass(frozen=True)
class Pattern:
    """How a preparation breathes in one condition.

    `drift` is the relative change of TE from start to end; `sigh_every` the mean number of breaths
    from sigh to sigh (0: none); `doublet_share` the share of bursts that come in pairs.
    """

    ti_s: float
    te_s: float
    ti_cv: float = 0.05
    te_cv: float = 0.07
    drift: float = 0.08
    sigh_every: int = 30
    doublet_share: float = 0.015


@dataclass(frozen=True)
class Breaths:
    """Breaths in time order; arrays of shape (n_breaths,), times in seconds.

    `amplitude` is relative to the usual burst; `kind` is "breath", "sigh" or "doublet" (the second
    burst of a pair); `condition` is the index of the condition that the breath belongs to.
    """

    onset_s: FloatArray
    offset_s: FloatArray
    end_s: FloatArray
    amplitude: FloatArray
    kind: tuple[str, ...]
    condition: IntArray

    @property
    def n_breaths(self) -> int:
        """Return the number of breaths."""
        return int(self.onset_s.size)


def breathe(pattern: Pattern, start_s: float, stop_s: float, rng: np.random.Generator,
            condition: int = 0) -> Breaths:
    """Return whole breaths that follow each other from `start_s` and end before `stop_s`.

    A sigh is 1.5 to 2.5 times as large, a little longer, and followed by an apnoea.
    """
    rows: list[Row] = []
    now, size, pace = start_s, 0.0, 0.0
    while True:
        size, pace = _wandered(size, rng), _wandered(pace, rng)
        for row in _event(pattern, now, (now - start_s) / (stop_s - start_s), size, pace, rng):
            if row[2] > stop_s:
                return _columns(rows, condition)
            rows.append(row)
            now = row[2]


def join(parts: list[Breaths]) -> Breaths:
    """Return the breaths of several conditions as one, in time order."""
    return Breaths(onset_s=np.concatenate([p.onset_s for p in parts]),
                   offset_s=np.concatenate([p.offset_s for p in parts]),
                   end_s=np.concatenate([p.end_s for p in parts]),
                   amplitude=np.concatenate([p.amplitude for p in parts]),
                   kind=tuple(k for p in parts for k in p.kind),
                   condition=np.concatenate([p.condition for p in parts]))


def phase_at(breaths: Breaths, times_s: FloatArray) -> tuple[FloatArray, IntArray]:
    """Return canonical phase, [0, 2), and the breath's index at each time, shape (n_times,).

    Outside every breath the phase is NaN and the index -1.
    """
    k = np.searchsorted(breaths.onset_s, times_s, side="right") - 1
    inside = (k >= 0) & (times_s < breaths.end_s[k])
    on, off, end = breaths.onset_s[k], breaths.offset_s[k], breaths.end_s[k]
    phase = np.where(times_s < off, (times_s - on) / (off - on), 1 + (times_s - off) / (end - off))
    return np.where(inside, np.minimum(phase, 2 - 1e-9), np.nan), np.where(inside, k, -1)


def _wandered(x: float, rng: np.random.Generator) -> float:
    """Return the next step of a first-order autoregressive walk of variance one."""
    return 0.4 * x + float(np.sqrt(1 - 0.4**2) * rng.standard_normal())


def _event(p: Pattern, now: float, done: float, size: float, pace: float,
           rng: np.random.Generator) -> list[Row]:
    ti = p.ti_s * np.exp(p.ti_cv * rng.standard_normal())
    te = p.te_s * np.exp(p.te_cv * pace) * (1 + p.drift * (done - 0.5))
    amplitude = float(np.exp(0.07 * size))
    chance = rng.uniform()
    if p.sigh_every and chance < 1 / p.sigh_every:
        apnoea = rng.uniform(2.8, 3.3) * p.te_s
        return [_row(now, 1.25 * ti, apnoea, amplitude * rng.uniform(1.7, 2.3), "sigh")]
    if chance > 1 - p.doublet_share:
        first = _row(now, ti, rng.uniform(0.18, 0.28) * te, amplitude, "breath")
        return [first, _row(first[2], 0.6 * ti, 1.1 * te, 0.75 * amplitude, "doublet")]
    return [_row(now, ti, te, amplitude, "breath")]


def _row(onset: float, ti: float, te: float, amplitude: float, kind: str) -> Row:
    return onset, float(onset + ti), float(onset + ti + te), float(amplitude), kind


def _columns(rows: list[Row], condition: int) -> Breaths:
    onset, offset, end, amplitude = (np.array([r[i] for r in rows], dtype=float) for i in range(4))
    return Breaths(onset, offset, end, amplitude, tuple(r[4] for r in rows),
                   np.full(len(rows), condition, dtype=np.int64))
