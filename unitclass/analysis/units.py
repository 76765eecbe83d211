"""Every cell in one condition: profile, suggestion, flags."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass

import numpy as np

from unitclass.analysis.beats import Beats, beat_flags
from unitclass.analysis.cells import Cell, train_digest
from unitclass.analysis.flags import unit_flags
from unitclass.analysis.potential import mean_potential, membrane_levels
from unitclass.analysis.rhythm import ConditionCycles
from unitclass.classify.draws import Timing, draw_families
from unitclass.classify.membrane import MembraneLevels
from unitclass.classify.regime import Regime, judge_regime
from unitclass.classify.suggestion import UnitFacts, suggest
from unitclass.classify.templates import TypeLibrary
from unitclass.classify.unit_counts import CountRow, count_row, stacked
from unitclass.phase.multiple_testing import benjamini_hochberg
from unitclass.phase.profiles import CountedProfile, Train, UnitProfile, unit_profiles
from unitclass.records import Cycles, Suggestion, UnitResult, VmProfile
from unitclass.settings import Settings

SEED = 1


@dataclass(frozen=True)
class JudgedUnits:
    """Results of one condition, and the regime under which they were judged."""

    results: tuple[UnitResult, ...]
    regime: Regime

NEGLIGIBLE = 0.1  # depth of modulation up to which a cell is called not modulated (common practice)


@dataclass(frozen=True)
class _Seen:
    """One cell's profile in the condition, with what the classifier counts on."""

    cell: Cell
    digest: str
    profile: UnitProfile
    row: CountRow
    vm: VmProfile | None
    levels: MembraneLevels | None
    follows: tuple[str, ...]


def judge_units(found: ConditionCycles, cells: Sequence[Cell], library: TypeLibrary,
                settings: Settings, beats: Sequence[Beats] = ()) -> JudgedUnits:
    """Return the result of every cell in one condition, in the order given."""
    if not cells:
        nobody = np.zeros((0, len(library.families) + 1))
        return JudgedUnits((), judge_regime(found.nerve_cycles.rhythm, nobody, library, given=settings.classify.regime,
                                            other_prior=settings.classify.other_prior))
    cycles = found.brainstem_cycles(settings)
    seen = _seen(cells, cycles, settings, beats)
    drawn = draw_families(library, Timing.of(cycles), n_bins=settings.phase.n_bins,
                          n_draws=settings.classify.n_draws)
    table = stacked([one.row for one in seen], settings.phase.n_bins)
    suggested = suggest([_facts(one) for one in seen], table, found.nerve_cycles.rhythm,
                        library=library, drawn=drawn, settings=settings)
    q_values = benjamini_hochberg([one.profile.modulation.eta_squared_p for one in seen])
    results = tuple(_result(one, found, suggestion, float(q), settings)
                    for one, suggestion, q in zip(seen, suggested.suggestions, q_values, strict=True))
    return JudgedUnits(results, suggested.regime)


def _seen(cells: Sequence[Cell], cycles: Cycles, settings: Settings, beats: Sequence[Beats]) -> list[_Seen]:
    digests: list[str] = []
    follows: list[tuple[str, ...]] = []

    def trains() -> Iterator[Train]:
        for cell in cells:
            times_s = cell.train.read()
            digests.append(train_digest(times_s))
            follows.append(beat_flags(times_s, beats, cycles))
            yield times_s, cell.observed_s

    profiles = unit_profiles(trains(), cycles, settings=settings, seed=SEED)
    seen = []
    for i, (cell, profile) in enumerate(zip(cells, profiles, strict=True)):
        potential = mean_potential(cell, cycles, settings)
        levels = membrane_levels(cell, potential, cycles)
        seen.append(_Seen(cell, digests[i], profile.without_counts(), _row(profile), potential, levels, follows[i]))
    return seen


def _row(profile: CountedProfile) -> CountRow:
    m = profile.modulation
    is_negligible = m.depth_high <= NEGLIGIBLE  # however certain, it is none to speak of: the test has no say
    return count_row(profile.by_phase, profile.exposure.seconds, np.nan if is_negligible else m.eta_squared_p)


def _facts(one: _Seen) -> UnitFacts:
    profile = one.profile
    return UnitFacts(profile.histogram, profile.modulation, profile.features, profile.histogram.n_cycles,
                     membrane=one.levels, is_held=one.cell.is_held)


def _result(one: _Seen, found: ConditionCycles, suggestion: Suggestion, q_value: float,
            settings: Settings) -> UnitResult:
    profile = one.profile
    return UnitResult(
        unit=one.cell.id, condition=found.condition.name, digest=one.digest,
        n_cycles=profile.histogram.n_cycles, n_spikes=profile.histogram.n_spikes, histogram=profile.histogram,
        locked=profile.locked, modulation=profile.modulation, features=profile.features, suggestion=suggestion,
        raster=profile.raster, flags=(*unit_flags(profile, suggestion, one.cell, settings), *one.follows), q_value=q_value,
        columns=one.cell.columns, vm=one.vm, vm_spikes=one.cell.vm_spikes)
