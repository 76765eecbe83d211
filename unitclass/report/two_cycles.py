"""Phase axes over two cycles: both transitions are seen whole."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from unitclass.records import FloatArray
from unitclass.report.style import GREY, INSPIRATION

if TYPE_CHECKING:
    from matplotlib.axes import Axes


def doubled(values: FloatArray) -> FloatArray:
    """Return profiles over one cycle (last axis) twice."""
    return np.concatenate([values, values], axis=-1)


def edges(n_bins: int) -> FloatArray:
    """Return the bin edges over two cycles, canonical phase, shape (2 n_bins + 1,)."""
    return np.linspace(0.0, 4.0, 2 * n_bins + 1)


def centres(n_bins: int) -> FloatArray:
    """Return the bin centres over two cycles, canonical phase, shape (2 n_bins,)."""
    return np.asarray((np.arange(2 * n_bins) + 0.5) * (2.0 / n_bins))


def phase_axis(axes: Axes, *, with_words: bool = True) -> None:
    """Mark inspiration, and name the phases under the axis."""
    axes.set_xlim(0, 4)
    for start in (0.0, 2.0):
        axes.axvspan(start, start + 1, color=INSPIRATION, linewidth=0, zorder=0)
    axes.set_xticks([0, 1, 2, 3, 4])
    axes.set_xticklabels([""] * 5)
    if not with_words:
        return
    for middle, word in zip((0.5, 1.5, 2.5, 3.5), ("I", "E", "I", "E"), strict=True):
        axes.annotate(word, (middle, 0), xycoords=("data", "axes fraction"), xytext=(0, -3), textcoords="offset points",
                      ha="center", va="top", color=GREY)


def steps(axes: Axes, rate: FloatArray, **how: object) -> None:
    """Draw a histogram's outline and body over two cycles; bins never observed stay empty."""
    twice = doubled(rate)
    axes.stairs(np.nan_to_num(twice), edges(rate.size), **how)  # type: ignore[arg-type]
