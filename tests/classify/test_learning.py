"""Learning from labels: a laboratory with habits of its own."""

from __future__ import annotations

import numpy as np
import pytest

from tests.simulators import rates
from tests.simulators.common import breathing, preparation
from unitclass.classify.draws import DrawnFamilies, Timing, draw_families
from unitclass.classify.learning import ShapeCounts, learn, teach
from unitclass.classify.posterior import probabilities, score_units, type_log_prior
from unitclass.classify.taught import LabelledUnit, ShapedUnit, taught_suggestions
from unitclass.classify.unit_counts import count_row, stacked
from unitclass.io.template_files import read_library
from unitclass.phase.counts import count_cycles
from unitclass.phase.exposure import exposure
from unitclass.records import Cycles, FloatArray, Suggestion
from unitclass.settings import Settings

SETTINGS = Settings()
NONE = np.zeros(0)


def late_ramp(cycles: Cycles, rng: np.random.Generator) -> FloatArray:
    """Return a cell that this laboratory calls ramp-I: it begins a third to half into inspiration."""
    onset, peak_hz = rng.uniform(0.3, 0.5), rng.uniform(15, 80)
    spikes = []
    for start, stop in zip(cycles.onset_s, cycles.offset_s, strict=True):
        phase = np.sort(rng.random(rng.poisson(peak_hz * (stop - start))))
        kept = rng.random(phase.size) < np.clip((phase - onset) / (1 - onset), 0, 1)
        spikes.append(start + phase[kept] * (stop - start))
    return np.concatenate(spikes)


def laboratory(seed: int) -> tuple[list[ShapedUnit], list[str], DrawnFamilies]:
    """Return units, what this laboratory calls each, and the families drawn for its rhythm."""
    rng = np.random.default_rng(seed)
    cycles = breathing(80, preparation("three-phase", rng), rng)
    simulated = rates.simulate(12, regime="three-phase", rng=rng, cycles=cycles, hardness=0.5, peak_hz=(8, 80),
                               with_other=False)
    seconds = exposure(cycles, n_bins=40)
    rows = []
    for train, name in zip(simulated.trains, simulated.types, strict=True):
        spikes = late_ramp(cycles, rng) if name == "ramp-I" else train
        rows.append(count_row(count_cycles(spikes, seconds).by_phase, seconds.seconds))
    names = ["aug-E" if name == "con-E" else name for name in simulated.types]
    timing = Timing(float(np.median(cycles.ti_s)), float(np.median(cycles.te_s)))
    library = read_library("")
    drawn = draw_families(library, timing, n_bins=40, n_draws=512)
    units = stacked(rows, 40)
    prior = type_log_prior(library, {"three-phase": 1.0}, SETTINGS.classify.other_prior)
    table = probabilities(score_units(units, drawn, SETTINGS.classify), prior, 1.0)
    return [shaped(str(i), units.counts[i], units.exposure_s[i], row, drawn) for i, row in enumerate(table)], names, drawn


def shaped(name: str, counts: FloatArray, seconds: FloatArray, row: FloatArray, drawn: DrawnFamilies) -> ShapedUnit:
    """Return one unit with the suggestion that the row of probabilities makes."""
    types = (*drawn.types, "other")
    ranked = {types[i]: float(row[i]) for i in np.argsort(-row)}
    return ShapedUnit(f"unit {name}", counts, seconds,
                      Suggestion(next(iter(ranked)), ranked, ("fires", "odds"), {}, NONE, NONE, NONE))


def said(units: list[ShapedUnit], anew: tuple[Suggestion | None, ...]) -> list[Suggestion]:
    """Return the suggestion in force of every unit."""
    return [new or unit.suggestion for unit, new in zip(units, anew, strict=True)]


@pytest.mark.parametrize("seed", [1, 2, 5])
def test_thirty_labels_in_the_order_of_the_queue_cut_the_remaining_error_by_half(seed):
    units, names, drawn = laboratory(seed)
    labelled: list[int] = []
    now = [unit.suggestion for unit in units]
    for _ in range(30):
        left = [i for i in range(len(units)) if i not in labelled]
        labelled.append(min(left, key=lambda i: now[i].probability))
        lessons = [LabelledUnit(units[i], names[i], is_blind=False) for i in labelled]
        now = said(units, taught_suggestions(units, lessons, drawn, concentration=300))
    left = [i for i in range(len(units)) if i not in labelled]
    before = np.mean([unit.suggestion.type != name for unit, name in zip(units, names, strict=True)])
    after = np.mean([now[i].type != names[i] for i in left])
    assert before > 0.05
    assert after <= before / 2


def test_without_labels_nothing_changes_and_forgetting_them_brings_the_first_answers_back_exactly():
    units, names, drawn = laboratory(2)
    lessons = [LabelledUnit(unit, name, is_blind=True) for unit, name in zip(units, names, strict=True)]
    assert any(taught_suggestions(units, lessons, drawn, concentration=300))
    assert taught_suggestions(units, (), drawn, concentration=300) == (None,) * len(units)


def test_a_changed_suggestion_says_what_it_was_and_which_labelled_cells_changed_it():
    units, names, drawn = laboratory(2)
    lessons = [LabelledUnit(unit, name, is_blind=True) for unit, name in zip(units, names, strict=True)
               if unit.suggestion.type == "con-E"][:6]
    anew = taught_suggestions(units, lessons, drawn, concentration=300)
    changed = [new for unit, new in zip(units, anew, strict=True)
               if new is not None and unit.suggestion.type == "con-E" and new.type == "aug-E"]
    assert changed
    assert changed[0].reasons[0].startswith("without labels con-E")
    assert "6 labels" in changed[0].reasons[0]
    assert any("labelled aug-E: unit " in words for words in changed[0].reasons)
    assert changed[0].evidence["labels"] > 0
    assert changed[0].fitted_rate_hz.size == 40
    assert sum(changed[0].probabilities.values()) == pytest.approx(1.0)


def test_a_label_that_agrees_moves_only_cells_in_doubt_to_what_they_are_and_a_blind_one_counts_more():
    units, names, drawn = laboratory(2)
    post = [unit for unit in units if unit.suggestion.type == "post-I"]
    gained = []
    for is_blind in (False, True):
        lessons = [LabelledUnit(unit, "aug-E", is_blind) for unit in post[:2]] + [
            LabelledUnit(unit, "post-I", is_blind) for unit in post[2:4]]
        anew = said(post, taught_suggestions(post, lessons, drawn, concentration=300))
        gained.append(np.mean([s.probabilities["post-I"] for s in anew]))
    agreed = taught_suggestions(units, [LabelledUnit(u, "post-I", is_blind=False) for u in post[:5]], drawn,
                                concentration=300)
    moved = [(unit.suggestion, new.type, name) for unit, new, name in zip(units, agreed, names, strict=True)
             if new is not None and new.type != unit.suggestion.type]
    assert all(new == name == "post-I" and was.probability < 2 / 3 for was, new, name in moved)
    assert len(moved) <= 1
    assert gained[1] > gained[0]


def test_names_of_every_draw_sum_to_one_and_taught_probabilities_too():
    rng = np.random.default_rng(3)
    units, names, drawn = laboratory(1)
    table = np.array([[u.suggestion.probabilities[name] for name in (*drawn.types, "other")] for u in units])
    shapes = ShapeCounts(np.stack([u.counts for u in units]), np.stack([u.exposure_s for u in units]), table)
    chosen = rng.choice(len(units), 20, replace=False)
    learned = learn(ShapeCounts(shapes.counts[chosen], shapes.exposure_s[chosen], table[chosen]),
                    [names[i] for i in chosen], np.ones(20), drawn)
    assert learned.names.sum(axis=1) == pytest.approx(np.ones(drawn.owner.size))
    taught = teach(shapes, learned, drawn)
    assert taught.probabilities.sum(axis=1) == pytest.approx(np.ones(len(units)))
    assert taught.kinship.min() >= 0
    assert taught.kinship.max() <= 1 + 1e-9


def test_labels_of_types_that_the_library_does_not_hold_are_passed_over():
    units, _, drawn = laboratory(2)
    assert taught_suggestions(units, [LabelledUnit(units[0], "swallow cell", is_blind=True)], drawn,
                              concentration=300) == (None,) * len(units)
