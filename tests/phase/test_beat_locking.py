"""Spikes that follow the heart are told from those that follow the breath."""

from __future__ import annotations

import numpy as np
import pytest

from unitclass.phase.beat_locking import beat_locking


def beats(rng: np.random.Generator, hz: float = 6.0, seconds: float = 120.0) -> np.ndarray:
    return np.cumsum(rng.normal(1 / hz, 0.05 / hz, int(seconds * hz)))


def bursts(rng: np.random.Generator) -> np.ndarray:
    """Return a train that bursts with the breath, every 3 s, and knows of no heart."""
    return np.sort(np.concatenate([3 * k + np.sort(rng.uniform(0, 1, 25)) for k in range(40)]))


def test_a_train_at_a_fixed_phase_of_the_beats_is_locked_with_the_resultant_it_was_given():
    rng = np.random.default_rng(1)
    heart = beats(rng)
    phase = rng.vonmises(1.0, 2.0, heart.size - 1) / (2 * np.pi) % 1
    spikes = np.sort(heart[:-1] + phase * np.diff(heart))
    found = beat_locking(spikes, heart)
    assert found.p <= 0.01
    # Mean resultant of a von Mises distribution of concentration 2, I1(2) / I0(2): Mardia and Jupp, from memory.
    assert found.resultant_length == pytest.approx(0.698, abs=0.06)
    assert found.beats_hz == pytest.approx(6.0, rel=0.02)


def test_breath_bursts_are_locked_to_no_heart_more_often_than_chance_allows():
    rngs = [(np.random.default_rng(seed), np.random.default_rng(100 + seed)) for seed in range(60)]
    p = [beat_locking(bursts(one), beats(other)).p for one, other in rngs]
    assert np.mean(np.array(p) <= 0.05) < 0.15
    assert np.mean(p) == pytest.approx(0.5, abs=0.12)


def test_the_clock_does_not_matter():
    rng = np.random.default_rng(2)
    heart, spikes = beats(rng), bursts(rng)
    assert beat_locking(spikes + 500, heart + 500).resultant_length == pytest.approx(
        beat_locking(spikes, heart).resultant_length)


def test_few_spikes_or_beats_tell_nothing():
    rng = np.random.default_rng(3)
    assert np.isnan(beat_locking(np.arange(10.0), beats(rng)).p)
    assert np.isnan(beat_locking(bursts(rng), np.arange(5.0)).p)
    assert np.isnan(beat_locking(bursts(rng), np.zeros(0)).p)
