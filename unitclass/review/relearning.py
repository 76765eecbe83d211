"""Suggestions made afresh with the labels that people gave, over all open sessions."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterator, Mapping, Sequence

import numpy as np

from unitclass.classify.draws import Timing, draw_families
from unitclass.classify.taught import LabelledUnit, ShapedUnit, taught_suggestions
from unitclass.classify.templates import TypeLibrary
from unitclass.io.session_view import LightUnit, SessionView
from unitclass.io.store_records import BLIND
from unitclass.records import Cycles, Suggestion
from unitclass.review.entry import EntryKey
from unitclass.review.teaching import Lesson
from unitclass.settings import Settings

TIMINGS_PER_OCTAVE = 3
"""Families are drawn for durations this near to a condition's own: milliseconds in phase need no more."""


def relearned(views: Sequence[SessionView], lessons: Sequence[Lesson], library: TypeLibrary,
              settings: Settings) -> dict[EntryKey, Suggestion]:
    """Return the suggestions that labels have changed; units not in it keep their own.

    Parameters
    ----------
    views : sequence of SessionView
        Sessions to be taught, with the suggestions that the analysis made.
    lessons : sequence of Lesson
        Labels on units of these sessions; others are passed over.
    """
    if not lessons:
        return {}
    units, timings = _gathered(views)
    taught_by = [LabelledUnit(units[lesson.key], lesson.type, lesson.how == BLIND)
                 for lesson in lessons if lesson.key in units]
    found: dict[EntryKey, Suggestion] = {}
    for timing, keys in _grouped(timings).items():
        drawn = draw_families(library, timing, n_bins=settings.phase.n_bins, n_draws=settings.classify.n_draws)
        anew = taught_suggestions([units[key] for key in keys], taught_by, drawn,
                                  concentration=settings.classify.concentration)
        found |= {key: suggestion for key, suggestion in zip(keys, anew, strict=True) if suggestion is not None}
    return found


def _gathered(views: Sequence[SessionView]) -> tuple[dict[EntryKey, ShapedUnit], dict[EntryKey, Timing]]:
    """Return every unit that has probabilities, and the usual durations in its condition."""
    units: dict[EntryKey, ShapedUnit] = {}
    timings: dict[EntryKey, Timing] = {}
    for view in views:
        timing = {name: _rounded_timing(view.condition_result(name, with_envelopes=False).nerve_cycles.cycles)
                  for name in {light.condition for light in view.units}}
        for key, unit in _shaped(view, several_files=len(views) > 1):
            units[key], timings[key] = unit, timing[key[2]]
    return units, timings


def _shaped(view: SessionView, *, several_files: bool) -> Iterator[tuple[EntryKey, ShapedUnit]]:
    for light in view.units:
        if not light.ranked:
            continue
        unit = view.unit_result(light.unit, light.condition)
        session = view.head.session if several_files else ""
        yield (view.head.path, light.unit, light.condition), ShapedUnit(
            _title(light, session), unit.histogram.counts, unit.histogram.exposure_s, unit.suggestion)


def _title(light: LightUnit, session: str) -> str:
    where = f" of {session}" if session else ""
    return f"unit {light.unit}{where}" + (f" ({light.condition})" if light.condition else "")


def _rounded_timing(cycles: Cycles) -> Timing:
    timing = Timing.of(cycles)
    return Timing(_rounded(timing.ti_s), _rounded(timing.te_s))


def _rounded(duration_s: float) -> float:
    return float(2.0 ** (round(TIMINGS_PER_OCTAVE * np.log2(duration_s)) / TIMINGS_PER_OCTAVE))


def _grouped(timings: Mapping[EntryKey, Timing]) -> dict[Timing, list[EntryKey]]:
    groups: defaultdict[Timing, list[EntryKey]] = defaultdict(list)
    for key, timing in timings.items():
        groups[timing].append(key)
    return dict(groups)
