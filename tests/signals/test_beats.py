"""Beats of a heart or strokes of a pump from their own channel."""

from __future__ import annotations

import numpy as np
import pytest

from unitclass.signals.beats import find_beats

RATE_HZ = 500.0


def heart(rng: np.random.Generator, hz: float, seconds: float = 60.0) -> tuple[np.ndarray, np.ndarray]:
    """Return true beats and a trace of narrow peaks with a slower wave after each, drift and noise."""
    true = np.cumsum(rng.normal(1 / hz, 0.04 / hz, int(seconds * hz) - 2)) + 0.2
    times = np.arange(int(seconds * RATE_HZ)) / RATE_HZ
    trace = 0.5 * np.sin(2 * np.pi * times / 20) + rng.normal(0, 0.05, times.size)
    for beat in true:
        trace += np.exp(-0.5 * ((times - beat) / 0.006) ** 2)
        trace += 0.25 * np.exp(-0.5 * ((times - beat - 0.35 / hz) / (0.06 / hz)) ** 2)
    return true[true < seconds], trace


@pytest.mark.parametrize("hz", [1.2, 5.0, 9.0])
@pytest.mark.parametrize("sign", [1, -1])
def test_every_beat_is_found_once_within_ten_milliseconds_whatever_the_polarity(hz, sign):
    true, trace = heart(np.random.default_rng(1), hz)
    found = find_beats(sign * trace, RATE_HZ, 0.0)
    near = np.abs(found[:, None] - true).min(axis=1)
    assert abs(found.size - true.size) <= 0.02 * true.size + 1
    assert np.mean(near < 0.01) > 0.98


def test_a_pumps_smooth_strokes_are_found():
    times = np.arange(int(60 * RATE_HZ)) / RATE_HZ
    found = find_beats(np.sin(2 * np.pi * 1.5 * times), RATE_HZ, 100.0)
    assert np.diff(found) == pytest.approx(1 / 1.5, abs=0.02)
    assert found[0] >= 100.0


def test_noise_and_a_constant_beat_not():
    assert find_beats(np.random.default_rng(2).normal(size=30000), RATE_HZ, 0.0).size == 0
    assert find_beats(np.ones(30000), RATE_HZ, 0.0).size == 0


def test_beats_are_not_told_in_a_gap():
    _, trace = heart(np.random.default_rng(3), 5.0)
    trace[10000:15000] = np.nan
    found = find_beats(trace, RATE_HZ, 0.0)
    assert not ((found > 20.05) & (found < 29.95)).any()
