"""The respiratory cycle as the shared axis of every picture.

Inspiration and expiration take columns in proportion to their mean durations; within each, phase
is linear. The end of inspiration falls on a column's edge, so no column mixes the two.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache

import numpy as np
from numpy.typing import ArrayLike, NDArray

from unitclass.records import FloatArray
from unitclass.tui.renderables.glyphs import COLOUR, Look
from unitclass.tui.renderables.sheet import Sheet, width_of


@dataclass(frozen=True)
class CycleAxis:
    """`n_columns` columns over one cycle, of which the first `n_inspiration` are inspiration."""

    n_columns: int
    n_inspiration: int
    ti_s: float = float("nan")
    te_s: float = float("nan")

    @staticmethod
    def for_durations(n_columns: int, ti_s: float, te_s: float) -> CycleAxis:
        """Return the axis on which both phases keep their proportion (equal halves if unknown)."""
        n_columns = max(4, n_columns)
        known = np.isfinite(ti_s) and np.isfinite(te_s) and ti_s > 0 and te_s > 0
        share = ti_s / (ti_s + te_s) if known else 0.5
        return CycleAxis(n_columns, int(np.clip(round(n_columns * share), 2, n_columns - 2)), ti_s, te_s)

    @property
    def edges(self) -> FloatArray:
        """Return the canonical phase of the columns' edges, shape (n_columns + 1,)."""
        return _edges(self.n_columns, self.n_inspiration)

    def column_of(self, phase: ArrayLike) -> NDArray[np.int64]:
        """Return the column in which each canonical phase lies."""
        phase = np.asarray(phase, dtype=float)
        n_i, n_e = self.n_inspiration, self.n_columns - self.n_inspiration
        position = np.where(phase < 1, phase * n_i, n_i + (phase - 1) * n_e)
        return np.clip(np.floor(position + 1e-9), 0, self.n_columns - 1).astype(np.int64)

    def rate(self, counts: ArrayLike, exposure_s: ArrayLike) -> FloatArray:
        """Return the rate of each column: the counts of the bins under it over their exposure."""
        share = self._shares(np.size(counts))
        with np.errstate(invalid="ignore", divide="ignore"):
            return np.asarray((share @ np.asarray(counts, float)) / (share @ np.asarray(exposure_s, float)))

    def mean(self, values: ArrayLike, weights: ArrayLike | None = None) -> FloatArray:
        """Return the mean of the bins under each column, weighted; NaN bins are left out."""
        values = np.asarray(values, dtype=float)
        weights = np.ones(values.size) if weights is None else np.asarray(weights, dtype=float)
        known = np.isfinite(values) & (weights > 0)
        share = self._shares(values.size)
        weight = np.where(known, weights, 0.0)
        with np.errstate(invalid="ignore", divide="ignore"):
            return np.asarray((share @ (np.where(known, values, 0.0) * weight)) / (share @ weight))

    def _shares(self, n_bins: int) -> FloatArray:
        return _shares(self.n_columns, self.n_inspiration, n_bins)


@lru_cache(maxsize=64)
def _edges(n_columns: int, n_inspiration: int) -> FloatArray:
    return np.concatenate([np.linspace(0, 1, n_inspiration + 1),
                           np.linspace(1, 2, n_columns - n_inspiration + 1)[1:]])


@lru_cache(maxsize=64)
def _shares(n_columns: int, n_inspiration: int, n_bins: int) -> FloatArray:
    """Return how much of each bin lies under each column, shape (n_columns, n_bins)."""
    edges, bins = _edges(n_columns, n_inspiration), np.linspace(0, 2, n_bins + 1)
    low = np.maximum(edges[:-1, None], bins[None, :-1])
    high = np.minimum(edges[1:, None], bins[None, 1:])
    return np.asarray(np.clip(high - low, 0, None) * n_bins / 2)


def axis_rows(axis: CycleAxis, *, look: Look = COLOUR) -> Sheet:
    """Draw the axis: a ruler with ticks of phase and, below, what the two stretches are and last.

    Returns
    -------
    Sheet
        Three rows: ruler, phases, names with durations in seconds.
    """
    sheet = Sheet(axis.n_columns, 3, look)
    sheet.put(0, 0, look.glyphs.rule * axis.n_columns, "axis")
    _put_ticks(sheet, axis)
    _put_stretch(sheet, 0, axis.n_inspiration, "inspiration", "insp", "I", axis.ti_s)
    _put_stretch(sheet, axis.n_inspiration, axis.n_columns, "expiration", "exp", "E", axis.te_s)
    return sheet


def _put_ticks(sheet: Sheet, axis: CycleAxis) -> None:
    step = 0.5 if min(axis.n_inspiration, axis.n_columns - axis.n_inspiration) >= 10 else 1.0
    for phase in np.arange(0, 2 + step / 2, step):
        at = axis.n_columns - 1 if phase >= 2 else int(axis.column_of(phase))
        sheet.cell(at, 0, sheet.look.glyphs.tick, "axis")
        words = f"{phase:g}"
        if phase == 0:
            sheet.put(0, 1, words, "axis")
        elif phase >= 2:
            sheet.right(axis.n_columns, 1, words, "axis")
        else:
            sheet.put(at - len(words) // 2, 1, words, "axis")


def _put_stretch(sheet: Sheet, start: int, stop: int, name: str, short: str, letter: str,
                 seconds: float) -> None:
    lasting = f" {seconds:.2f} s" if np.isfinite(seconds) else ""
    for words in (name + lasting, short + lasting, letter + lasting, letter):
        if width_of(words) + 2 <= stop - start or words == letter:
            break
    dashes = stop - start - width_of(words) - 2
    left = max(0, dashes // 2)
    line = sheet.look.glyphs.rule
    full = f"{line * left} {words} {line * max(0, dashes - left)}" if dashes >= 2 else words
    sheet.put(start, 2, full[: stop - start], "inspiration" if start == 0 else "axis")
