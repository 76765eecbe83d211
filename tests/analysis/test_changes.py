"""Types from one condition to the next."""

from __future__ import annotations

from dataclasses import replace

from tests.results import session_result
from unitclass.analysis.changes import change_counts, type_changes
from unitclass.records import Label, SessionResult

BEFORE, AFTER = "baseline", "pons removed"


def session(types: dict[str, tuple[str, str]], animal: str = "heron") -> SessionResult:
    """Return a session whose units have these types before and after."""
    made = session_result(conditions=(BEFORE, AFTER))
    conditions = []
    for i, condition in enumerate(made.conditions):
        template = condition.units[0]
        units = tuple(replace(template, unit=name, condition=condition.condition.name, suggestion=replace(
            template.suggestion, type=pair[i], probabilities={pair[i]: 0.9})) for name, pair in types.items())
        conditions.append(replace(condition, units=units, condition=replace(condition.condition, start_s=float(i))))
    return replace(made, animal=animal, conditions=tuple(conditions))


def test_each_unit_has_one_step_and_conditions_follow_in_time_not_in_name():
    result = session({"1": ("post-I", "silent"), "2": ("ramp-I", "ramp-I")})
    turned = replace(result, conditions=result.conditions[::-1])
    for one in (result, turned):
        steps = {c.unit: (c.condition_before, c.type_before, c.condition_after, c.type_after)
                 for c in type_changes(one, {})}
        assert steps == {"1": (BEFORE, "post-I", AFTER, "silent"), "2": (BEFORE, "ramp-I", AFTER, "ramp-I")}


def test_a_label_stands_over_the_suggestion():
    label = Label(type="dec-E", reviewer="anna", decided_at="2026-01-01", how="viewed")
    step, = type_changes(session({"1": ("post-I", "silent")}), {("1", BEFORE): label})
    assert (step.type_before, step.type_after) == ("dec-E", "silent")


def test_steps_are_counted_per_animal_the_commonest_first():
    steps = [*type_changes(session({"1": ("post-I", "silent"), "2": ("aug-E", "tonic"), "3": ("aug-E", "tonic")}), {}),
             *type_changes(session({"1": ("aug-E", "tonic")}, animal="wren"), {})]
    counts = change_counts(steps)
    assert [(c.animal, c.type_before, c.type_after, c.n_units) for c in counts] == [
        ("heron", "aug-E", "tonic", 2), ("heron", "post-I", "silent", 1), ("wren", "aug-E", "tonic", 1)]
    assert sum(c.n_units for c in counts) == len(steps)


def test_a_session_of_one_condition_has_no_steps():
    assert type_changes(session_result(conditions=(BEFORE,)), {}) == ()
