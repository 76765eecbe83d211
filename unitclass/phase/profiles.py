"""Everything of the phase layer for many units of one condition, what they share computed once."""

from __future__ import annotations

from collections.abc import Iterable, Iterator
from dataclasses import dataclass, replace
from itertools import islice

import numpy as np
from numpy.typing import ArrayLike, NDArray

from unitclass.phase.counts import count_cycles
from unitclass.phase.exposure import CycleResamples, Exposure, cycle_resamples, exposure
from unitclass.phase.features import features_of, lead_frame
from unitclass.phase.histogram import histogram_of, raster_of
from unitclass.phase.locked import LockedFrame, locked_frame, locked_of
from unitclass.phase.modulation import described_modulation, with_eta_squared
from unitclass.phase.shift_null import shift_null
from unitclass.records import Cycles, Features, LockedHistogram, Modulation, PhaseHistogram, Raster
from unitclass.settings import Settings

UNIT_CYCLES_AT_ONCE = 120_000
"""Units times cycles held at once, so that memory does not grow with the recording."""
FRAMES_KEPT = 4

Train = tuple[ArrayLike, ArrayLike | None]
"""Spike times in seconds, and observation intervals (n_intervals, 2) or None for always."""


@dataclass(frozen=True)
class UnitProfile:
    """What the phase layer says of one unit in one condition."""

    histogram: PhaseHistogram
    locked: tuple[LockedHistogram, LockedHistogram]
    modulation: Modulation
    features: Features
    raster: Raster


@dataclass(frozen=True)
class CountedProfile(UnitProfile):
    """The same with the counts of every cycle.

    `by_phase` (n_cycles, n_bins) and `exposure.seconds` of the same shape are what the classifier
    counts on; units observed over the same time share one exposure.
    """

    by_phase: NDArray[np.float32]
    exposure: Exposure

    def without_counts(self) -> UnitProfile:
        """Return what stays when the counts have been used: they grow with the recording."""
        return UnitProfile(self.histogram, self.locked, self.modulation, self.features, self.raster)


def unit_profiles(trains: Iterable[Train], cycles: Cycles, *, settings: Settings, seed: int) -> Iterator[CountedProfile]:
    """Yield the profile of each unit, in the order given.

    A unit's profile depends on its own spikes, the cycles, the settings and the seed only. Trains
    are drawn from the iterable as they are needed and not kept.

    Parameters
    ----------
    trains : iterable of (spike_times_s, observed_s)
        Spike times, shape (n_spikes,), any order; observation intervals, (n_intervals, 2) or None.
    cycles : Cycles
        The cycles in use, shape (n_cycles,), in time order.
    settings : Settings
    seed : int
        Of the resamples and the shifts.

    Raises
    ------
    ValueError
        As `phase_histogram`.
    """
    frames: dict[bytes, _Frame] = {}
    drafts = (_draft(times, _frame(observed_s, frames, cycles, settings, seed), settings)
              for times, observed_s in trains)
    at_once = max(1, UNIT_CYCLES_AT_ONCE // max(cycles.n_cycles, 1))
    while batch := list(islice(drafts, at_once)):
        yield from _with_eta_squared(batch, cycles, settings, seed)


@dataclass(frozen=True)
class _Frame:
    """What units observed over the same time share."""

    exposure: Exposure
    resamples: CycleResamples
    locked: tuple[LockedFrame, LockedFrame]
    lead: LockedFrame


def _frame(observed_s: ArrayLike | None, known: dict[bytes, _Frame], cycles: Cycles, settings: Settings,
           seed: int) -> _Frame:
    """Return the frame of an observation time, made unless it is `known`; the oldest known one is let go."""
    given = exposure(cycles, observed_s=observed_s, n_bins=settings.phase.n_bins)
    key = given.observed_s.tobytes()
    if key not in known:
        observed = None if given.is_always else given.observed_s
        window, width = settings.phase.locked_window_ms, settings.phase.locked_bin_ms
        known[key] = _Frame(given, cycle_resamples(given, settings.phase.n_bootstrap, np.random.default_rng(seed)),
                            (locked_frame(cycles, "onset", window, width, observed_s=observed),
                             locked_frame(cycles, "offset", window, width, observed_s=observed)),
                            lead_frame(cycles, observed))
        if len(known) > FRAMES_KEPT:
            del known[next(iter(known))]
    return known[key]


@dataclass(frozen=True)
class _Draft:
    """A profile that waits for the null which units share."""

    profile: CountedProfile
    by_fraction: NDArray[np.uint16]


def _draft(times_s: ArrayLike, frame: _Frame, settings: Settings) -> _Draft:
    counts = count_cycles(times_s, frame.exposure, n_fractions=settings.modulation.n_fractions)
    histogram = histogram_of(counts, frame.resamples)
    profile = CountedProfile(
        histogram=histogram,
        locked=(locked_of(counts.time_s, frame.locked[0]), locked_of(counts.time_s, frame.locked[1])),
        modulation=described_modulation(counts, histogram, frame.resamples),
        features=features_of(counts, histogram, frame.lead, settings),
        raster=raster_of(counts.phase, counts.cycle, counts.cycles.n_cycles),
        by_phase=counts.by_phase,
        exposure=counts.exposure,
    )
    return _Draft(profile, counts.by_fraction)


def _with_eta_squared(batch: list[_Draft], cycles: Cycles, settings: Settings, seed: int) -> Iterator[CountedProfile]:
    null = shift_null(np.stack([d.by_fraction for d in batch]), settings.modulation.n_shifts, seed,
                      cycle_s=cycles.ttot_s, used=np.stack([d.profile.exposure.is_whole for d in batch]))
    for row, draft in enumerate(batch):
        profile = draft.profile
        yield replace(profile, modulation=with_eta_squared(profile.modulation, null, row, profile.histogram,
                                                           settings.modulation))
