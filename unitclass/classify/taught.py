"""Suggestions after labels: what changed, from what, and because of which labelled cells."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass, replace

import numpy as np

from unitclass.classify.draws import DrawnFamilies
from unitclass.classify.fit import NO_FIT, Fit, fit
from unitclass.classify.learning import Learned, ShapeCounts, learn, teach
from unitclass.classify.likelihood import evidence_share
from unitclass.classify.reasons import odds_words
from unitclass.records import OTHER, FloatArray, Suggestion

LEAST_CHANGE = 0.05  # of a probability; smaller ones are not worth a mark in the queue
KIN = 0.1  # a labelled cell is named as a ground when it stands this far for the unit's shape
MOST_NAMED = 3
UNSEEN, AGREED = 1.0, 0.7  # how much a label counts that repeats the suggestion its giver had seen
NEVER = 1e-12
LEAST_SHARE = 0.05  # of a draw's names: below it the draw is no picture of the type


@dataclass(frozen=True)
class ShapedUnit:
    """One unit with what learning needs of it, and its suggestion without any label."""

    title: str
    counts: FloatArray
    exposure_s: FloatArray
    suggestion: Suggestion


@dataclass(frozen=True)
class LabelledUnit:
    """A unit that a person named, and whether the suggestion was hidden then."""

    unit: ShapedUnit
    type: str
    is_blind: bool


def taught_suggestions(units: Sequence[ShapedUnit], lessons: Sequence[LabelledUnit], drawn: DrawnFamilies, *,
                       concentration: float) -> tuple[Suggestion | None, ...]:
    """Return each unit's suggestion once the labels have spoken, None where it is the same.

    Parameters
    ----------
    units : sequence of ShapedUnit
        With probabilities: silent and undetermined units have none and are not taught.
    lessons : sequence of LabelledUnit
        Labels that name a family of `drawn` or "other"; others are passed over.
    concentration : float
        Spikes after which a histogram stops adding evidence (`ClassifySettings.concentration`).
    """
    types = (*drawn.types, OTHER)
    usable = [lesson for lesson in lessons if lesson.type in types and lesson.unit.suggestion.probabilities]
    if not usable or not units:
        return (None,) * len(units)
    learned = learn(shape_counts([lesson.unit for lesson in usable], types), [lesson.type for lesson in usable],
                    np.array([_weight(lesson) for lesson in usable]), drawn)
    taught = teach(shape_counts(units, types), learned, drawn)
    return tuple(_changed(unit, row, kin, usable, learned, drawn, concentration)
                 for unit, row, kin in zip(units, taught.probabilities, taught.kinship, strict=True))


def shape_counts(units: Sequence[ShapedUnit], types: Sequence[str]) -> ShapeCounts:
    """Return units as one table."""
    return ShapeCounts(np.stack([u.counts for u in units]), np.stack([u.exposure_s for u in units]),
                       np.array([[u.suggestion.probabilities.get(name, 0.0) for name in types] for u in units]))


def _weight(lesson: LabelledUnit) -> float:
    has_repeated = not lesson.is_blind and lesson.type == lesson.unit.suggestion.type
    return AGREED if has_repeated else UNSEEN


def _changed(unit: ShapedUnit, row: FloatArray, kinship: FloatArray, lessons: Sequence[LabelledUnit],
             learned: Learned, drawn: DrawnFamilies, concentration: float) -> Suggestion | None:
    types = (*drawn.types, OTHER)
    before = unit.suggestion
    order = np.argsort(-row, kind="stable")
    name = types[int(order[0])]
    if name == before.type and abs(float(row[order[0]]) - before.probability) < LEAST_CHANGE:
        return None
    found = _own_fit(before) if name == before.type else _fit(unit, name, learned, drawn, concentration)
    second = types[int(order[1])]
    moved = np.log(max(float(row[order[0]]), NEVER) / max(before.probabilities.get(name, 0.0), NEVER))
    return replace(before, type=name, probabilities={types[i]: float(row[i]) for i in order},
                   reasons=(*_why(unit, name, kinship, lessons), *before.reasons[:-1],
                            odds_words(name, second, float(row[order[0]]), float(row[order[1]]))),
                   evidence={**before.evidence, "labels": float(moved)},
                   fitted_rate_hz=found.rate_hz, fitted_low_hz=found.low_hz, fitted_high_hz=found.high_hz)


def _own_fit(suggestion: Suggestion) -> Fit:
    """Return the fit that a suggestion came with."""
    return Fit(suggestion.fitted_rate_hz, suggestion.fitted_low_hz, suggestion.fitted_high_hz)


def _why(unit: ShapedUnit, name: str, kinship: FloatArray, lessons: Sequence[LabelledUnit]) -> Iterator[str]:
    yield (f"without labels {unit.suggestion.type} {unit.suggestion.probability:.2f}; changed by "
           f"{len(lessons)} label{'s' if len(lessons) > 1 else ''}")
    kin = [int(i) for i in np.argsort(-kinship, kind="stable") if kinship[i] >= KIN and lessons[i].type == name]
    if kin:
        named = ", ".join(lessons[i].unit.title for i in kin[:MOST_NAMED])
        more = f" and {len(kin) - MOST_NAMED} more" if len(kin) > MOST_NAMED else ""
        yield f"cells of this shape were labelled {name}: {named}{more}"


def _fit(unit: ShapedUnit, name: str, learned: Learned, drawn: DrawnFamilies, concentration: float) -> Fit:
    if name == OTHER:
        return NO_FIT
    evidence = evidence_share(unit.counts[None], unit.exposure_s[None], np.ones(1), concentration)
    share = learned.names[:, drawn.types.index(name)]
    named = np.flatnonzero(share >= min(LEAST_SHARE, float(share.max())))
    return fit(unit.counts[None], unit.exposure_s[None], evidence, drawn.rate[named],
               learned.log_weight[named] + np.log(share[named]))
