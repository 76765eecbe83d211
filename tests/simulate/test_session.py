import numpy as np
import pytest

from unitclass.errors import UsageError
from unitclass.simulate import KINDS, simulate_session
from unitclass.simulate.breathing import phase_at
from unitclass.simulate.curves import TYPES


@pytest.fixture(scope="module")
def removed():
    return simulate_session("pons-removed", seed=3, seconds=60)


@pytest.mark.parametrize("kind", KINDS)
def test_the_same_seed_gives_the_same_session_and_another_seed_another(kind):
    one, same, other = (simulate_session(kind, seed=s, seconds=15, raw_rate_hz=1000) for s in (5, 5, 6))
    assert all(np.array_equal(a.counts, b.counts) for a, b in zip(one.nerves, same.nerves, strict=True))
    assert all(np.array_equal(a.spike_times_s, b.spike_times_s) for a, b in zip(one.units, same.units, strict=True))
    assert not np.array_equal(one.nerves[0].counts, other.nerves[0].counts)
    if one.membrane is not None:
        assert np.array_equal(one.membrane.counts, same.membrane.counts)


def test_the_truth_has_a_row_for_every_unit_and_condition(removed):
    rows = removed.truth()
    assert len(rows) == 2 * len(removed.units)
    assert {row["condition"] for row in rows} == {"baseline", "pons removed"}
    assert {row["type"] for row in rows} <= set(TYPES)


def test_conditions_are_apart_and_the_operation_is_excluded(removed):
    before, after = removed.conditions
    operation = removed.exclusions[-1]
    assert before.stop_s == operation.start_s
    assert operation.stop_s == after.start_s
    assert removed.stop_s == after.stop_s
    for c, condition in enumerate(removed.conditions):
        here = removed.breaths.condition == c
        assert removed.breaths.onset_s[here].min() >= condition.start_s
        assert removed.breaths.end_s[here].max() <= condition.stop_s


def test_a_unit_that_is_silent_after_the_operation_has_no_spike_there(removed):
    silent = [u for u in removed.units if u.types["pons removed"] == "silent"]
    start = removed.conditions[1].start_s
    assert silent
    assert all(np.sum(u.spike_times_s > start + 3) < 5 for u in silent)
    assert all(np.sum(u.spike_times_s < start) > 50 for u in silent)


def test_post_inspiratory_units_fire_after_inspiration():
    session = simulate_session("three-phase", seed=4, seconds=60, raw_rate_hz=1000)
    for unit in session.units:
        if unit.types["baseline"] == "post-I":
            phase, _ = phase_at(session.breaths, unit.spike_times_s)
            assert np.mean((phase > 1) & (phase < 1.6)) > 0.9


def test_late_expiratory_units_skip_breaths_together_with_the_abdominal_nerve():
    session = simulate_session("hypercapnia", seed=1, seconds=60, raw_rate_hz=1000)
    unit = next(u for u in session.units if u.details.get("9 % CO2") == "2:1")
    _, breath = phase_at(session.breaths, unit.spike_times_s[unit.spike_times_s > session.conditions[1].start_s])
    assert np.mean(breath % 2 == 0) > 0.95
    assert unit.types == {"5 % CO2": "silent", "9 % CO2": "late-E"}


def test_size_follows_what_is_asked():
    session = simulate_session("slice", seed=1, seconds=30, n_units=23, raw_rate_hz=5000)
    assert len(session.units) == 23
    assert session.nerves[0].counts.size == 30 * 5000


@pytest.mark.parametrize(("asked", "where"), [
    ({"kind": "aquatic"}, "kind of session"), ({"kind": "slice", "seconds": -1}, "seconds"),
    ({"kind": "slice", "n_units": -2}, "n_units"), ({"kind": "intracellular", "cell": "late-E"}, "cell"),
    ({"kind": "slice", "seconds": 1.6}, "no whole breath"),
])
def test_what_makes_no_session_is_refused_in_one_line(asked, where):
    with pytest.raises(UsageError) as refused:
        simulate_session(seed=1, **asked)
    assert where in str(refused.value)
    assert "\n" not in str(refused.value)
