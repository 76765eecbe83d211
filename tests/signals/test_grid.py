"""Hours of nerve are kept coarser, and give the same cycles."""

from __future__ import annotations

import numpy as np
import pytest

import unitclass.signals.neurogram as neurogram
from tests.simulators import nerves
from unitclass.settings import Settings
from unitclass.signals.cycles import find_cycles
from unitclass.signals.neurogram import grid_hz


def test_the_activity_of_hours_holds_no_more_samples_than_fifty_minutes_until_the_grid_is_125_hz():
    assert grid_hz(600) == grid_hz(3000) == 500.0
    assert [grid_hz(h * 3600) for h in (0.5, 1, 2, 24)] == [500.0, 250.0, 125.0, 125.0]


@pytest.mark.parametrize("shape", ["ramp", "square"])
def test_cycles_on_the_coarse_grid_are_those_on_the_fine_one(shape, monkeypatch):
    rng = np.random.default_rng(3)
    truth = nerves.draw(nerves.Plan(shape=shape, n_cycles=30), rng)
    signal = nerves.raw(truth, nerves.Rig(rate_hz=5000.0), rng)

    def found() -> object:
        return find_cycles(signal, (), start_s=0.0, stop_s=signal.stop_s, settings=Settings()).cycles

    fine = found()
    monkeypatch.setattr(neurogram, "MOST_SAMPLES", 10_000)
    coarse = found()
    assert coarse.kind == fine.kind
    assert coarse.onset_s == pytest.approx(fine.onset_s, abs=0.012)
    assert coarse.offset_s == pytest.approx(fine.offset_s, abs=0.012, nan_ok=True)
