"""Shape groups: found again, counted rightly, compared with the templates."""

from __future__ import annotations

import numpy as np
import pytest
from sklearn.metrics import adjusted_rand_score

from unitclass.classify.clustering import components, group_names, relative_rates, shape_groups
from unitclass.records import FloatArray

PHASE = (np.arange(40) + 0.5) / 20
HUMPS = (0.3, 0.9, 1.2, 1.7)


def population(n_each: int, seed: int = 1, humps: tuple[float, ...] = HUMPS) -> tuple[FloatArray, list[int]]:
    """Return Poisson rates of units with one hump each, and whose hump it is."""
    rng = np.random.default_rng(seed)
    kind = np.repeat(np.arange(len(humps)), n_each)
    centre = np.array(humps)[kind] + rng.normal(0, 0.02, kind.size)
    away = np.abs((PHASE - centre[:, None] + 1) % 2 - 1)
    peak_hz = rng.uniform(10, 60, (kind.size, 1))
    observed_s = 4.0
    return rng.poisson(peak_hz * np.exp(-0.5 * (away / 0.12) ** 2) * observed_s) / observed_s, kind.tolist()


def test_groups_made_on_purpose_are_found_in_number_and_membership():
    rates, kind = population(15)
    found = shape_groups(rates, [f"type {k}" for k in kind])
    assert len(found.groups) == 4
    assert adjusted_rand_score(kind, found.names) == pytest.approx(1.0)
    assert found.agreement == pytest.approx(1.0)
    assert found.stability > 0.95
    assert min(group.stability for group in found.groups) > 0.9
    assert [group.types[0] for group in found.groups] == [(f"type {k}", 1.0) for k in range(4)]


def test_the_number_of_groups_is_the_one_of_the_lowest_criterion():
    rates, kind = population(15)
    criterion = shape_groups(rates, ["x"] * len(kind)).criterion
    assert min(criterion, key=lambda k: criterion[k]) == 4


def test_alike_units_are_one_group_and_very_few_units_are_not_grouped():
    rates, _ = population(40, humps=(0.9,))
    assert len(shape_groups(rates, ["ramp-I"] * 40).groups) == 1
    few = shape_groups(rates[:8], ["ramp-I"] * 8)
    assert (few.names, few.groups) == (("",) * 8, ())


def test_groups_are_named_in_the_order_of_phase_and_do_not_depend_on_the_order_of_units():
    rates, kind = population(15)
    order = np.random.default_rng(2).permutation(len(kind))
    found = shape_groups(rates, ["x"] * 60)
    moved = shape_groups(rates[order], ["x"] * 60)
    assert [found.names[i] for i in order] == list(moved.names)
    assert [int(np.argmax(group.mean_rate)) for group in found.groups] == sorted(
        int(np.argmax(group.mean_rate)) for group in found.groups)


def test_a_groups_shape_does_not_depend_on_how_fast_its_units_fire():
    rates, _ = population(15)
    assert components(relative_rates(10 * rates)) == pytest.approx(components(relative_rates(rates)), abs=1e-6)


def test_names_alone_are_those_of_the_groups():
    rates, kind = population(15)
    assert group_names(rates) == shape_groups(rates, ["x"] * len(kind), n_repetitions=2).names
    assert group_names(rates[:8]) == ("",) * 8


def test_bins_never_observed_do_not_make_a_group_of_their_own():
    rates, kind = population(15)
    rates[::7, 33] = np.nan
    assert adjusted_rand_score(kind, group_names(rates)) == pytest.approx(1.0)


def test_a_group_that_no_type_holds_most_of_is_not_explained():
    rates, kind = population(15)
    types = ["other" if k == 0 else "a" if k == 1 else f"b{i % 3}" if k == 2 else "c" for i, k in enumerate(kind)]
    found = shape_groups(rates, types)
    assert [group.is_explained for group in found.groups] == [False, True, False, True]
