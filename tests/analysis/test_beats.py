"""A cell that follows the heart but not the breath is NRM, with a flag that says so."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from tests.simulators.sessions import whole
from unitclass.analysis import analyse
from unitclass.io.template_files import read_library
from unitclass.records import ArrayChunks, ArraySpikes, Recording, Signal
from unitclass.settings import Settings

RATE_HZ = 250.0


@pytest.fixture(scope="module")
def judged():
    """Return the suggestions and flags by unit: an ordinary population, and one cell that follows the heart."""
    rng = np.random.default_rng(5)
    recording, _ = whole("rates", "three-phase", 3, n_cycles=60, rng=rng, types=("ramp-I", "post-I"),
                             peak_hz=(20.0, 50.0), hardness=0.2)
    heart = np.cumsum(rng.normal(0.19, 0.008, int(recording.stop_s / 0.19)))
    heart = heart[heart < recording.stop_s - 1]
    spikes = np.sort(np.concatenate([heart + rng.normal(0.05, 0.012, heart.size),
                                     rng.uniform(0, recording.stop_s - 1, heart.size)]))
    cell = replace(recording.units[0], id="vascular", train=ArraySpikes(spikes))
    result = analyse(with_ecg(replace(recording, units=(*recording.units, cell)), heart, rng), read_library(""),
                     Settings(), program_version="test")
    return {unit.unit: unit for _, unit in result.units()}


def with_ecg(recording: Recording, heart: np.ndarray, rng: np.random.Generator) -> Recording:
    times = np.arange(int(recording.stop_s * RATE_HZ)) / RATE_HZ
    trace = rng.normal(0, 0.03, times.size)
    trace[np.round(heart * RATE_HZ).astype(int)] += 1.0
    ecg = Signal("ECG", "ecg", "V", RATE_HZ, 0.0, times.size / RATE_HZ, ArrayChunks(trace, RATE_HZ))
    return replace(recording, nerves=(*recording.nerves, ecg))


def test_the_cell_that_follows_the_heart_is_flagged_with_channel_and_rate(judged):
    flag, = [flag for flag in judged["vascular"].flags if "heart" in flag]
    assert flag.startswith("follows the heart (ECG, 5.")
    assert judged["vascular"].suggestion.type in ("NRM", "tonic")


def test_respiratory_cells_are_not_flagged(judged):
    assert not [name for name, unit in judged.items() if name != "vascular" and any("heart" in f for f in unit.flags)]
