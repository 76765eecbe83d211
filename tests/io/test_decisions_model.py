"""The store against a naive model that keeps plain lists, over random acts of three people."""

from __future__ import annotations

import random

import pytest

from tests.io.stores import IDENTIFIER, OBJECT_ID, decision
from unitclass.io.decisions import DecisionStore
from unitclass.records import Decision

PEOPLE, TYPES, UNITS = ("anna", "ben", "carla"), ("ramp-I", "con-I"), ("3", "7")


class Model:
    """Every act as (number, decision); undone acts are moved to another list."""

    def __init__(self) -> None:
        self.n = 0
        self.done: dict[str, list[tuple[int, Decision]]] = {name: [] for name in PEOPLE}
        self.undone: dict[str, list[tuple[int, Decision]]] = {name: [] for name in PEOPLE}

    def decide(self, given: Decision) -> None:
        self.n += 1
        self.done[given.reviewer].append((self.n, given))
        self.undone[given.reviewer].clear()

    def undo(self, name: str) -> bool:
        return self._move(self.done[name], self.undone[name])

    def redo(self, name: str) -> bool:
        return self._move(self.undone[name], self.done[name])

    def _move(self, source: list[tuple[int, Decision]], target: list[tuple[int, Decision]]) -> bool:
        if not source:
            return False
        target.append(source.pop())
        self.n += 1
        return True

    def label(self, unit: str) -> tuple[str, tuple[str, ...]]:
        """Return type and flags by reading all standing decisions in order."""
        acts = sorted((pair for acts in self.done.values() for pair in acts if pair[1].unit == unit),
                      key=lambda pair: pair[0])
        settled = max((i for i, (_, d) in enumerate(acts) if d.how == "settled"), default=0)
        last = {d.reviewer: d.type for _, d in acts[settled:]}
        if len(set(last.values())) > 1:
            return "", ("disagreement",)
        return (next(iter(last.values())), ()) if last else ("", ())


@pytest.mark.parametrize("seed", range(3))
def test_labels_follow_a_naive_model_through_random_acts(tmp_path, seed):
    rng, model = random.Random(seed), Model()
    with DecisionStore(tmp_path / "unitclass.sqlite") as store:
        for _ in range(120):
            name = rng.choice(PEOPLE)
            act = rng.choices(("decide", "settle", "undo", "redo"), (5, 1, 4, 3))[0]
            if act in ("undo", "redo"):
                assert (getattr(store, act)(name) is not None) == getattr(model, act)(name)
            else:
                given = decision(rng.choice(TYPES), unit=rng.choice(UNITS), reviewer=name,
                                 how="settled" if act == "settle" else "viewed")
                store.decide([given])
                model.decide(given)
            labels = store.labels_for(IDENTIFIER, OBJECT_ID, {unit: f"digest-{unit}" for unit in UNITS})
            for unit in UNITS:
                found = labels.get((unit, "baseline"))
                assert (("", ()) if found is None else (found.type, found.flags)) == model.label(unit)
