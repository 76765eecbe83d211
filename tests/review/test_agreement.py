"""Agreement between reviewers against published values and independent libraries."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np
import pytest

from tests.io.stores import IDENTIFIER, OBJECT_ID, decision
from unitclass.io.decisions import DecisionStore
from unitclass.review.agreement import StoredSession, agreement, confusion, rated_units
from unitclass.review.kappa import cohen_kappa, fleiss_kappa

COHEN_1960 = [[88, 14, 18], [10, 40, 10], [2, 6, 12]]


def test_kappa_of_cohens_own_table():
    """Cohen, Educ Psychol Meas 1960;20:37: the table; kappa and SE as in check_values (statsmodels 0.15.0)."""
    kappa = cohen_kappa(COHEN_1960)
    assert kappa.value == pytest.approx(0.491525, abs=5e-7)
    assert kappa.se == pytest.approx(0.051002, abs=5e-7)
    assert (kappa.n_units, kappa.observed, kappa.expected) == (200, pytest.approx(0.70), pytest.approx(0.41))


@pytest.mark.parametrize("seed", range(5))
def test_kappa_and_its_error_agree_with_other_libraries(seed):
    metrics = pytest.importorskip("sklearn.metrics")
    inter_rater = pytest.importorskip("statsmodels.stats.inter_rater")
    rng = np.random.default_rng(seed)
    first = rng.integers(0, 5, 120)
    second = np.where(rng.random(120) < 0.6, first, rng.integers(0, 5, 120))
    table = confusion("a", "b", [(str(x), str(y)) for x, y in zip(first, second, strict=True)]).counts
    ours, theirs = cohen_kappa(table), inter_rater.cohens_kappa(table)
    assert ours.value == pytest.approx(metrics.cohen_kappa_score(first, second))
    assert (ours.value, ours.se) == (pytest.approx(theirs.kappa), pytest.approx(theirs.std_kappa))


def test_the_error_of_kappa_matches_its_spread_over_resampled_units():
    """Brute force: the standard deviation of kappa over multinomial tables of the same shares."""
    rng = np.random.default_rng(3)
    shares = np.ravel(COHEN_1960) / 200
    values = [cohen_kappa(rng.multinomial(200, shares).reshape(3, 3)).value for _ in range(4000)]
    assert np.std(values) == pytest.approx(cohen_kappa(COHEN_1960).se, rel=0.05)


def test_kappa_at_its_ends():
    assert cohen_kappa(np.diag([4, 5, 6])).value == 1.0
    assert cohen_kappa([[0, 5], [5, 0]]).value == pytest.approx(-1.0)
    assert cohen_kappa(np.outer([3, 7], [4, 6])).value == pytest.approx(0.0)
    one_type = cohen_kappa([[9]])
    assert (math.isnan(one_type.value), one_type.observed, one_type.n_units) == (True, 1.0, 9)
    assert cohen_kappa(np.zeros((0, 0))).n_units == 0


@pytest.mark.parametrize("table", [[[1, 2, 3]], [1, 2], [[1, -1], [0, 1]], [[1, np.nan], [0, 1]]])
def test_a_table_that_is_none_is_refused(table):
    with pytest.raises(ValueError, match="table must"):
        cohen_kappa(table)


def test_fleiss_kappa_of_his_own_psychiatric_diagnoses():
    """Fleiss, Psychol Bull 1971;76:378: 30 patients, 6 raters, kappa .430; data as statsmodels carries them."""
    data = pytest.importorskip("statsmodels.stats.tests.test_inter_rater").diagnoses
    counts = np.stack([(data == k).sum(axis=1) for k in range(1, 6)], axis=1)
    assert counts.shape == (30, 5)
    assert fleiss_kappa(counts).value == pytest.approx(0.430, abs=5e-4)


def test_fleiss_kappa_agrees_with_statsmodels():
    inter_rater = pytest.importorskip("statsmodels.stats.inter_rater")
    counts = np.random.default_rng(5).multinomial(4, [0.5, 0.3, 0.2], size=40)
    assert fleiss_kappa(counts).value == pytest.approx(inter_rater.fleiss_kappa(counts))


@pytest.mark.parametrize("counts", [[[1, 0], [1, 0]], [[2, 1], [2, 0]], [1, 2]])
def test_fleiss_kappa_needs_the_same_number_of_reviewers_everywhere(counts):
    with pytest.raises(ValueError, match=r"reviewers|shape"):
        fleiss_kappa(counts)


def test_the_confusion_table_counts_pairs_with_the_first_reviewer_in_rows():
    table = confusion("anna", "ben", [("ramp-I", "con-I"), ("ramp-I", "ramp-I"), ("ramp-I", "con-I")])
    assert (table.types, table.counts.tolist()) == (("con-I", "ramp-I"), [[0, 0], [2, 1]])


# ------------------------------------------------------------------------- from the store

@pytest.fixture
def store(tmp_path):
    with DecisionStore(tmp_path / "unitclass.sqlite") as opened:
        yield opened


def report(store, **session):
    return agreement(rated_units(store, [StoredSession("a.nwb", IDENTIFIER, OBJECT_ID, **session)]))


def give(store, reviewer, types, **changes):
    for unit, kind in types.items():
        store.decide([replace(decision(kind, unit=unit, reviewer=reviewer), **changes)])


def test_only_units_that_both_judged_count_and_conditions_stay_apart(store):
    give(store, "anna", {"1": "ramp-I", "2": "post-I", "3": "aug-E"})
    give(store, "ben", {"1": "ramp-I", "2": "dec-E"})
    give(store, "anna", {"1": "early-I"}, condition="pons removed")
    give(store, "ben", {"1": "early-I"}, condition="pons removed")
    pairs = {p.condition: p for p in report(store).pairs}
    assert {name: p.kappa.n_units for name, p in pairs.items()} == {"baseline": 2, "pons removed": 1}
    assert pairs["baseline"].confusion.types == ("dec-E", "post-I", "ramp-I")


def test_settlements_are_no_opinions_and_mark_what_is_settled(store):
    give(store, "anna", {"1": "ramp-I", "2": "post-I"})
    give(store, "ben", {"1": "con-I", "2": "dec-E"})
    give(store, "anna", {"1": "con-I"}, how="settled")
    found = report(store)
    assert found.pairs[0].kappa.observed == 0.0
    assert [(u.unit, u.is_settled) for u in found.discuss] == [("2", False), ("1", True)]


def test_how_much_was_seen_is_told_with_the_figure(store):
    give(store, "anna", {"1": "ramp-I", "2": "post-I"}, how="batch")
    give(store, "ben", {"1": "ramp-I"}, how="batch")
    give(store, "ben", {"2": "post-I"}, how="blind")
    give(store, "anna", {"3": "aug-E"}, how="blind")
    give(store, "ben", {"3": "aug-E"}, how="blind")
    (pair,) = report(store).pairs
    assert (pair.n_unseen, pair.n_blind) == (2, 1)


def test_three_reviewers_are_compared_in_pairs_and_together(store):
    for name, last in (("anna", "aug-E"), ("ben", "aug-E"), ("carla", "con-E")):
        give(store, name, {"1": "ramp-I", "2": "post-I", "3": last})
    give(store, "anna", {"4": "NRM"})
    found = report(store)
    assert [(p.confusion.first, p.confusion.second) for p in found.pairs] == [
        ("anna", "ben"), ("anna", "carla"), ("ben", "carla")]
    (group,) = found.groups
    assert group.kappa.n_units == 3
    # 3 units: all agree on two; on the third one pair of three agrees. By hand:
    observed = (1 + 1 + 1 / 3) / 3
    expected = (3**2 + 3**2 + 2**2 + 1) / 81
    assert group.kappa.value == pytest.approx((observed - expected) / (1 - expected))


def test_opinions_on_an_older_spike_train_do_not_count(store):
    give(store, "anna", {"1": "ramp-I"}, digest="old")
    give(store, "ben", {"1": "con-I"}, digest="new")
    assert report(store).discuss == ()
    give(store, "anna", {"1": "ramp-I"}, digest="new")
    assert len(report(store).discuss) == 1
    assert report(store, digests={"1": "old"}).discuss == ()


def test_one_reviewer_or_none_gives_an_empty_report(store):
    assert report(store).pairs == ()
    give(store, "anna", {"1": "ramp-I"})
    assert (report(store).reviewers, report(store).pairs, report(store).groups) == (("anna",), (), ())
