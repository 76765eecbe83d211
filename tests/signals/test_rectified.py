"""Rectified noise is told from an envelope with noise added."""

from __future__ import annotations

import numpy as np
import pytest

from tests.simulators import nerves
from unitclass.records import FloatArray, Signal
from unitclass.signals.rectified import is_rectified


def values_of(signal: Signal) -> FloatArray:
    return np.concatenate([np.asarray(chunk.values, float) for chunk in signal.reader.chunks()])


@pytest.mark.parametrize("shape", ["ramp", "square", "decrementing"])
@pytest.mark.parametrize("snr", [2.0, 6.0])
def test_a_leaky_integrator_s_trace_is_rectified_and_a_drawn_envelope_is_not(shape, snr):
    rng = np.random.default_rng(1)
    truth, rig = nerves.draw(nerves.Plan(shape=shape, n_cycles=20), rng), nerves.Rig(rate_hz=10000.0, snr=snr)
    assert is_rectified(values_of(nerves.integrated(truth, rig, rng)), 1000.0)
    drawn = values_of(nerves.drawn(truth, rig, rng, rate_hz=200.0))
    assert not is_rectified(drawn - drawn.min(), 200.0)


def test_the_unit_does_not_matter_and_a_trace_below_zero_is_never_rectified():
    rng = np.random.default_rng(2)
    truth = nerves.draw(nerves.Plan(n_cycles=20), rng)
    values = values_of(nerves.integrated(truth, nerves.Rig(rate_hz=10000.0), rng))
    assert is_rectified(1e6 * values, 1000.0)
    assert not is_rectified(values - values.mean(), 1000.0)
    assert not is_rectified(np.ones(5000), 1000.0)
