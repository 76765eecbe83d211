import numpy as np
import pytest

from tests.builders import phasic_spikes, steady_spikes, varied_cycles
from unitclass.phase.active_phase import active_phase
from unitclass.phase.histogram import phase_histogram


def circular_gap(a, b):
    return abs((a - b + 1) % 2 - 1)


def found_phases(rate, *, rate_scale=1.0, n_cycles=150, n_units=8, background_hz=0.0):
    rng = np.random.default_rng(0)
    cycles = varied_cycles(n_cycles, rng)
    trains = [phasic_spikes(cycles, lambda p: rate_scale * rate(p) + background_hz, rng) for _ in range(n_units)]
    return [active_phase(phase_histogram(t, cycles, rng=rng)) for t in trains]


SHAPES = {  # rate in spikes/s by canonical phase; onset and offset where the rate passes a tenth of its peak
    "constant inspiratory": (lambda p: np.where(p < 1, 40.0, 0.0), 0.0, 1.0),
    "ramp inspiratory": (lambda p: np.where(p < 1, 60 * p, 0.0), 0.1, 1.0),
    "late inspiratory": (lambda p: np.where((p > 0.67) & (p < 1), 50.0, 0.0), 0.67, 1.0),
    "pre-inspiratory": (lambda p: np.where(p > 1.7, (p - 1.7) * 80, np.where(p < 0.9, 40.0, 0.0)), 1.76, 0.9),
    "post-inspiratory": (lambda p: np.where(p >= 1, 80 * np.exp(-(p - 1) / 0.2), 0.0), 1.0, 1.46),
    "augmenting expiratory": (lambda p: np.where(p > 1.3, (p - 1.3) * 90, 0.0), 1.37, 0.0),
    "late expiratory": (lambda p: np.where(p > 1.83, 50.0, 0.0), 1.83, 0.0),
    "spanning": (lambda p: np.where((p > 0.7) & (p < 1.3), 40.0, 0.0), 0.7, 1.3),
}


@pytest.mark.parametrize("name", SHAPES)
@pytest.mark.parametrize(("scale", "tolerance"), [(1.0, 0.05), (0.03, 0.12)])
def test_onset_and_offset_are_found_from_many_spikes_and_from_some_dozens(name, scale, tolerance):
    rate, onset, offset = SHAPES[name]
    found = [a for a in found_phases(rate, rate_scale=scale, n_units=15) if a.is_found]
    assert len(found) >= 12
    assert np.median([circular_gap(a.onset, onset) for a in found]) <= tolerance
    assert np.median([circular_gap(a.offset, offset) for a in found]) <= tolerance


@pytest.mark.parametrize("name", ["pre-inspiratory", "late inspiratory", "late expiratory", "spanning"])
def test_a_background_moves_neither_edge_much(name):
    rate, onset, offset = SHAPES[name]
    found = found_phases(rate, background_hz=5.0)
    assert np.median([circular_gap(a.onset, onset) for a in found]) < 0.08
    assert np.median([circular_gap(a.offset, offset) for a in found]) < 0.08
    assert np.median([a.background_hz for a in found]) == pytest.approx(5, abs=1)


def test_an_onset_before_inspiration_wraps_over_the_end_of_the_cycle():
    found = found_phases(SHAPES["pre-inspiratory"][0])[0]
    assert found.wraps
    assert found.onset > found.offset
    assert 0 <= found.peak < 0.9
    assert found.is_active[0]
    assert found.is_active[39]
    assert not found.is_active[25]


def test_the_peak_of_a_ramp_lies_at_its_end_and_of_a_decrement_at_its_start():
    assert np.median([a.peak for a in found_phases(SHAPES["ramp inspiratory"][0])]) > 0.9
    assert np.median([a.peak for a in found_phases(SHAPES["post-inspiratory"][0])]) < 1.1
    peaks = [a.peak_hz for a in found_phases(SHAPES["constant inspiratory"][0])]
    assert np.median(peaks) == pytest.approx(40, rel=0.15)


def test_a_steady_unit_has_no_active_phase_however_many_or_bursty_its_spikes():
    rng = np.random.default_rng(0)
    cycles = varied_cycles(100, rng)
    histograms = [phase_histogram(steady_spikes(cycles, rate, rng), cycles) for rate in (0.5, 3, 30)
                  for _ in range(20)]
    for _ in range(20):
        starts = steady_spikes(cycles, 1.0, rng)
        bursts = (starts[:, None] + np.arange(6) * 0.02).ravel()
        histograms.append(phase_histogram(bursts, cycles))
    assert np.mean([active_phase(h).is_found for h in histograms]) < 0.08


def test_silence_has_no_active_phase():
    found = active_phase(phase_histogram([], varied_cycles(20, np.random.default_rng(0))))
    assert not found.is_found
    assert not found.is_active.any()
