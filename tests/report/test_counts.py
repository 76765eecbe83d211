"""Counts of types, their intervals, and the table in which animals are the sample."""

from __future__ import annotations

import pytest
from statsmodels.stats.proportion import proportion_confint

from unitclass.report.counts import TypedUnit, animal_rows, type_counts, wilson

ORDER = ("ramp-I", "post-I", "aug-E")


def unit(animal: str, condition: str, name: str, *, is_decided: bool = False) -> TypedUnit:
    return TypedUnit(animal, f"{animal} 1", condition, "1", name, is_decided)


@pytest.mark.parametrize(("n", "of"), [(0, 10), (1, 10), (5, 10), (10, 10), (3, 250)])
def test_the_interval_is_that_of_statsmodels(n, of):
    assert wilson(n, of) == pytest.approx(proportion_confint(n, of, method="wilson"), abs=1e-12)


def test_shares_are_of_the_animal_and_condition_and_types_follow_the_order_given():
    units = [unit("heron", "a", "post-I"), unit("heron", "a", "ramp-I"), unit("heron", "a", "post-I"),
             unit("wren", "a", "silent"), unit("heron", "b", "aug-E")]
    counts = type_counts(units, ORDER)
    assert [(c.animal, c.condition, c.type, c.n, c.of) for c in counts] == [
        ("heron", "a", "ramp-I", 1, 3), ("heron", "a", "post-I", 2, 3), ("wren", "a", "silent", 1, 1),
        ("heron", "b", "aug-E", 1, 1)]
    together = type_counts(units, ORDER, by_animal=False)
    assert {(c.type, c.of) for c in together if c.condition == "a"} == {("ramp-I", 4), ("post-I", 4), ("silent", 4)}


def test_every_animal_has_one_row_per_condition_with_every_type_so_that_means_over_animals_can_be_taken():
    import numpy as np
    from statsmodels.stats.weightstats import DescrStatsW

    units = [unit("heron", "a", "post-I", is_decided=True), unit("heron", "a", "ramp-I"), unit("wren", "a", "ramp-I")]
    rows = animal_rows(units, ORDER)
    assert [(r["animal"], r["n_units"], r["n_decided"], r["n_ramp-I"], r["n_post-I"]) for r in rows] == [
        ("heron", 2, 1, 1, 1), ("wren", 1, 0, 1, 0)]
    assert len({tuple(row) for row in rows}) == 1
    shares = np.array([float(row["share_ramp-I"]) for row in rows])
    assert DescrStatsW(shares).mean == pytest.approx(0.75)  # the mean over animals, not 2 of 3 units
