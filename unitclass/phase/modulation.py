"""Is a unit modulated by the respiratory cycle at all, and how deeply?"""

from __future__ import annotations

from dataclasses import replace

import numpy as np
from numpy.typing import ArrayLike

from unitclass.phase.circular import (
    canonical_phase,
    equalised_turns,
    kuiper_of_sorted,
    rayleigh_p,
    resultant,
    watson_of_sorted,
)
from unitclass.phase.counts import CycleCounts, count_cycles
from unitclass.phase.depth import modulation_depth
from unitclass.phase.exposure import CycleResamples, cycle_resamples, exposure
from unitclass.phase.rank_tests import friedman_test, sign_test
from unitclass.phase.shift_null import ShiftNull, shift_null
from unitclass.records import Cycles, FloatArray, Modulation, PhaseHistogram
from unitclass.settings import ModulationSettings

N_BOOTSTRAP = 200
TEETH = 10


def modulation(spike_times_s: ArrayLike, cycles: Cycles, *, observed_s: ArrayLike | None,
               histogram: PhaseHistogram, settings: ModulationSettings, seed: int) -> Modulation:
    """Return whether, and how much, a unit follows the respiratory cycle.

    For many units `profiles.unit_profiles` gives the same faster, since shifts are shared.

    Parameters
    ----------
    spike_times_s : array_like, shape (n_spikes,)
        Seconds on the session clock, any order.
    cycles : Cycles
        The cycles in use, shape (n_cycles,).
    observed_s : array_like, shape (n_intervals, 2), or None
        Observation intervals; None means always.
    histogram : PhaseHistogram
        Of the same spikes, cycles and intervals.
    settings : ModulationSettings
    seed : int
        Of the shifts and of the resamples behind the limit of depth.

    Raises
    ------
    ValueError
        As `phase_histogram`.
    """
    given = exposure(cycles, observed_s=observed_s, n_bins=histogram.n_bins)
    counts = count_cycles(spike_times_s, given, n_fractions=settings.n_fractions)
    resamples = cycle_resamples(given, N_BOOTSTRAP, np.random.default_rng(seed))
    null = shift_null(counts.by_fraction[None], settings.n_shifts, seed, cycle_s=cycles.ttot_s,
                      used=given.is_whole[None])
    return with_eta_squared(described_modulation(counts, histogram, resamples), null, 0, histogram, settings)


def described_modulation(counts: CycleCounts, histogram: PhaseHistogram, resamples: CycleResamples) -> Modulation:
    """Return all but eta squared, whose null is shared by units; `with_eta_squared` adds it."""
    whole = counts.exposure.is_whole
    turns = np.sort(equalised_turns(counts.phase, histogram.exposure_s)) if counts.n_spikes else counts.phase
    mean = resultant(2 * np.pi * turns)
    depth = modulation_depth(histogram, resamples, counts.by_phase)
    return Modulation(
        eta_squared=np.nan,
        eta_squared_within=np.nan,
        eta_squared_p=np.nan,
        n_shifts=0,
        sign_test_p=sign_test(*equal_time_counts(counts)),
        friedman_p=friedman_test(counts.by_fraction[whole]).p,
        rayleigh_p=rayleigh_p(mean.n, mean.length),
        kuiper_p=kuiper_of_sorted(turns).p,
        watson_u2=watson_of_sorted(turns).u2,
        mean_phase=canonical_phase(mean.angle / (2 * np.pi), histogram.exposure_s) if mean.n else np.nan,
        resultant_length=mean.length,
        depth=depth.value,
        depth_high=depth.high,
    )


def with_eta_squared(described: Modulation, null: ShiftNull, row: int, histogram: PhaseHistogram,
                     settings: ModulationSettings) -> Modulation:
    """Return `described` with eta squared of the unit in `row` of the null.

    Its probability, which enters the correction for many units, is NaN below the floors of cycles
    and spikes: too little data is undetermined, not unmodulated.
    """
    is_enough = histogram.n_cycles >= settings.min_cycles and histogram.n_spikes >= settings.min_spikes
    return replace(described, eta_squared=float(null.eta_squared[row]),
                   eta_squared_within=float(null.eta_squared_within[row]),
                   eta_squared_p=float(null.p[row]) if is_enough else np.nan, n_shifts=null.null.shape[1])


def eta_squared(rates: ArrayLike) -> float:
    """Return the share of variance between the columns of (n_cycles, n_fractions), one-way.

    With no modulation it is about (k - 1)/(n k - 1) for n cycles and k fractions, so no fixed
    cut-off tells anything. NaN when nothing varies.
    """
    values = np.asarray(rates, dtype=float)
    # Centred first, or a large common value would drown the differences in rounding.
    return float(shift_null((values - values.mean())[None], 1, 0).eta_squared[0])


def equal_time_counts(counts: CycleCounts) -> tuple[FloatArray, FloatArray]:
    """Return spikes in inspiration and in expiration per whole cycle, over equally many seconds.

    Rates over unequal times differ in their medians even for a steady cell, so the longer phase
    counts only in ten evenly spread windows that together last as long as the shorter one.
    """
    cycles = counts.cycles
    with np.errstate(invalid="ignore", divide="ignore"):
        share = np.minimum(np.stack([cycles.te_s / cycles.ti_s, cycles.ti_s / cycles.te_s]), 1.0)
    half = (counts.phase >= 1).astype(np.int64)
    tooth = counts.phase * TEETH
    kept = tooth - np.floor(tooth) < share[half, counts.cycle]
    n = cycles.n_cycles
    both = np.bincount(half[kept] * n + counts.cycle[kept], minlength=2 * n).reshape(2, n).astype(float)
    return both[0, counts.exposure.is_whole], both[1, counts.exposure.is_whole]
