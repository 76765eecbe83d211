"""Spikes in a membrane potential: found, timed, and told from everything that only looks like them.

The traces come from a generator that shares no code with the program; the targets are F1 of
0.995 at 40 mV and 0.97 at 12 mV over 2 mV of noise, and 0.2 ms for the moment of steepest rise.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from tests.simulators.membrane import LeakyCell, Recipe, Shape, Trace, hodgkin_huxley, membrane_trace
from tests.simulators.membrane_checks import Match, matched, membrane_of, membrane_of_trace, membrane_on
from unitclass.errors import SignalError
from unitclass.records import ArrayChunks, VmSpikes
from unitclass.settings import MembraneSettings
from unitclass.signals.vm_spikes import drift_mv, find_vm_spikes

SMALL = Shape(height_mv=12.0, rise_ms=0.25, fall_ms=0.8, ahp_mv=1.0)
TALL = Shape(height_mv=40.0, rise_ms=0.2, fall_ms=0.6)


def found_in(recipe: Recipe, seed: int = 1, **options: float) -> tuple[Trace, VmSpikes, Match]:
    trace = membrane_trace(recipe, np.random.default_rng(seed))
    spikes = find_vm_spikes(membrane_of_trace(trace, **options), MembraneSettings())
    return trace, spikes, matched(spikes.time_s, trace.spike_s)


@pytest.mark.parametrize(("rate_hz", "low_pass_hz"), [(5000, 0), (11025, 0), (20000, 2000), (50000, 0)])
def test_forty_mv_over_two_mv_of_noise_are_all_found_and_timed(rate_hz: float, low_pass_hz: float) -> None:
    _, _, match = found_in(Recipe(30, rate_hz, 2.0, low_pass_hz, TALL))
    assert match.f1 >= 0.995
    assert np.quantile(np.abs(match.errors_ms), 0.99) < 0.2


@pytest.mark.parametrize(("rate_hz", "low_pass_hz"), [(5000, 0), (11025, 0), (20000, 0), (20000, 2000), (50000, 5000)])
def test_twelve_mv_over_two_mv_of_noise_are_nearly_all_found(rate_hz: float, low_pass_hz: float) -> None:
    _, _, match = found_in(Recipe(30, rate_hz, 2.0, low_pass_hz, SMALL))
    assert match.f1 >= 0.97
    assert np.median(np.abs(match.errors_ms)) < 0.1
    assert np.quantile(np.abs(match.errors_ms), 0.95) < 0.25


@pytest.mark.parametrize("change", [
    {"rest_mv": (-70.0, -40.0)},
    {"shrink": 0.85, "rate_in_burst_hz": 60.0},
    {"rate_in_burst_hz": 150.0, "active": (0.0, 0.6)},
    {"spikelet_mv": 10.0, "spikelet_hz": 4.0},
    {"pop_mv": 80.0, "pop_ms": 0.2, "pop_hz": 5.0},
    {"step_mv": 30.0},
    {"synaptic_mv": 3.0},
    {"quantum_mv": 0.5, "noise_mv": 0.1},
    {"noise_mv": 0.0, "synaptic_mv": 0.0},
], ids=["drift", "shrinking", "fast", "spikelets", "pops", "steps", "synaptic", "coarse converter", "noise-free"])
def test_what_real_recordings_hold_costs_no_spikes(change: dict[str, float]) -> None:
    _, _, match = found_in(replace(Recipe(duration_s=20, rate_hz=10000), **change))
    assert match.f1 >= 0.998


@pytest.mark.parametrize("change", [{"pop_mv": 60.0, "pop_ms": 0.2, "pop_hz": 5.0}, {"step_mv": 20.0}, {}],
                         ids=["pops", "bridge steps", "nothing"])
def test_a_silent_cell_has_no_spikes_whatever_the_stimulus(change: dict[str, float]) -> None:
    _, spikes, _ = found_in(replace(Recipe(duration_s=20, active=(0.0, 0.0)), **change))
    assert spikes.time_s.size == 0


def test_pops_and_steps_far_larger_than_a_sharp_electrodes_spikes_are_left_aside() -> None:
    for change in ({"pop_mv": 60.0, "pop_ms": 0.2, "pop_hz": 5.0}, {"step_mv": 30.0}):
        _, _, match = found_in(replace(Recipe(20, 20000, 2.0, shape=SMALL), **change))
        assert match.f1 >= 0.99


def test_spikelets_are_counted_apart() -> None:
    trace, spikes, match = found_in(Recipe(duration_s=30, spikelet_mv=12.0, spikelet_hz=5.0))
    assert match.f1 == 1.0
    assert abs(spikes.n_spikelets - trace.spikelet_s.size) <= 2


def test_events_of_a_few_mv_alone_are_spikelets_not_spikes() -> None:
    trace, spikes, _ = found_in(Recipe(duration_s=30, active=(0.0, 0.0), spikelet_mv=5.5))
    assert spikes.time_s.size == 0
    assert abs(spikes.n_spikelets - trace.spikelet_s.size) <= 2


def test_chunks_change_nothing() -> None:
    trace = membrane_trace(Recipe(duration_s=15, rate_hz=10000), np.random.default_rng(3))
    whole = find_vm_spikes(membrane_of_trace(trace, chunk_s=100.0), MembraneSettings())
    for chunk_s in (0.0123, 0.7, 4.9999):
        parts = find_vm_spikes(membrane_of_trace(trace, chunk_s=chunk_s), MembraneSettings())
        assert parts.time_s == pytest.approx(whole.time_s, abs=1e-9)
        assert parts.height_mv == pytest.approx(whole.height_mv, abs=1e-6)


def test_spikes_at_the_borders_of_blocks_are_found_once() -> None:
    rate = 20000.0
    wave, before_s = Shape().drawn(rate)
    values = np.full(round(30.2 * rate), -60.0) + np.random.default_rng(0).normal(0, 0.3, round(30.2 * rate))
    feet = np.concatenate([k * 5.0 + np.arange(-3, 4) * 0.01 + 0.0003 for k in range(1, 6)])
    for foot in feet:
        first = round((foot - before_s) * rate)
        values[first : first + wave.size] += wave
    spikes = find_vm_spikes(membrane_of(values, rate), MembraneSettings())
    assert matched(spikes.time_s, feet).f1 == 1.0


def test_part_of_the_session_gives_the_spikes_of_that_part() -> None:
    trace = membrane_trace(Recipe(duration_s=30), np.random.default_rng(4))
    spikes = find_vm_spikes(membrane_of_trace(trace), MembraneSettings(), start_s=7.3, stop_s=21.9)
    inside = trace.spike_s[(trace.spike_s > 7.3) & (trace.spike_s < 21.9)]
    assert matched(spikes.time_s, inside).f1 == 1.0
    assert spikes.observed_s == pytest.approx(np.array([[7.3, 21.9]]), abs=1e-4)


class Sweeps:
    """Two sweeps with a gap between them."""

    def __init__(self, *parts: ArrayChunks) -> None:
        self.parts = parts

    def chunks(self, start_s: float = -np.inf, stop_s: float = np.inf):
        for part in self.parts:
            yield from part.chunks(start_s, stop_s)


def test_sweeps_keep_their_times_and_the_gap_is_not_observed() -> None:
    trace = membrane_trace(Recipe(duration_s=20, rate_hz=10000), np.random.default_rng(5))
    cut = 93_457
    reader = Sweeps(ArrayChunks(trace.values_mv[:cut], 10000, 100.0), ArrayChunks(trace.values_mv[cut:], 10000, 130.0))
    stop_s = 130.0 + (trace.values_mv.size - cut) / 10000
    spikes = find_vm_spikes(membrane_on(reader, 10000, 100.0, stop_s), MembraneSettings())
    first, second = trace.spike_s[trace.spike_s < cut / 1e4], trace.spike_s[trace.spike_s >= cut / 1e4]
    assert matched(spikes.time_s, np.concatenate([100 + first, 130 + second - cut / 1e4])).f1 >= 0.99
    assert spikes.observed_s == pytest.approx(np.array([[100.0, 109.3457], [130.0, stop_s]]), abs=1e-3)


def test_a_leaky_cell_fires_at_its_closed_form_interval() -> None:
    # Interval tau ln(RI / (RI - dV)) + refractory: the textbook solution of dV/dt = (RI - V) / tau
    # (e.g. Dayan & Abbott, Theoretical Neuroscience, 2001, section 5.4).
    for cell in (LeakyCell(), LeakyCell(tau_ms=10, drive_mv=40, refractory_ms=2), LeakyCell(drive_mv=15.3)):
        values, true_s = cell.trace(20000, 10.0)
        spikes = find_vm_spikes(membrane_of(values, 20000), MembraneSettings())
        assert matched(spikes.time_s, true_s[:-1]).n_missed == 0
        assert spikes.time_s.size <= true_s.size
        assert np.diff(spikes.time_s).mean() == pytest.approx(cell.interval_s, abs=2e-6)
        assert np.diff(spikes.time_s) == pytest.approx(cell.interval_s, abs=1e-4)


def test_the_squid_axon_fires_where_its_potential_rises_steepest() -> None:
    # Every full cycle of the equations is one spike: counted from upward crossings of 0 mV.
    values = hodgkin_huxley(10000, 0.8, 12.0)
    spikes = find_vm_spikes(membrane_of(values, 10000), MembraneSettings())
    crossings = np.flatnonzero((values[:-1] < 0) & (values[1:] >= 0)) / 10000
    assert spikes.time_s.size == crossings.size
    slope = np.diff(values)
    for t in spikes.time_s[1:-1]:
        near = np.arange(round(t * 10000) - 20, round(t * 10000) + 20)
        assert (near[np.argmax(slope[near])] + 0.5) / 10000 == pytest.approx(t, abs=1e-4)


def brute_force_spikes(values: np.ndarray, rate_hz: float) -> list[float]:
    """Walk along every sample: steep rise of 15 mV or more that falls by half within 5 ms."""
    slope, found, i = np.diff(values) * rate_hz / 1e3, [], 0
    ms = round(rate_hz / 1e3)
    while i < slope.size:
        if slope[i] < 60.0:
            i += 1
            continue
        peak = i + int(np.argmax(values[i : i + 2 * ms]))
        foot = float(np.min(values[max(0, i - ms) : i + 1]))
        height = values[peak] - foot
        if height >= 15.0 and np.any(values[peak : peak + 5 * ms] < foot + height / 2):
            low = max(i - ms // 2, 0)
            steepest = low + int(np.argmax(slope[low : peak + 1]))
            found.append((steepest + 0.5) / rate_hz)
            i = peak + 3 * ms // 2
        else:
            i += 1
    return found


@pytest.mark.parametrize("seed", [1, 2])
def test_a_search_over_every_sample_finds_the_same_spikes(seed: int) -> None:
    trace = membrane_trace(Recipe(duration_s=20, noise_mv=0.3, rate_in_burst_hz=50), np.random.default_rng(seed))
    spikes = find_vm_spikes(membrane_of_trace(trace), MembraneSettings())
    brute = np.array(brute_force_spikes(trace.values_mv, trace.rate_hz))
    match = matched(spikes.time_s, brute)
    assert (match.n_missed, match.n_false) == (0, 0)
    assert np.abs(match.errors_ms).max() < 0.06


def test_a_few_spikes_in_a_long_silence_are_enough() -> None:
    trace, _, match = found_in(Recipe(duration_s=40, cycle_s=12.0, active=(0.0, 0.01), rate_in_burst_hz=8.0))
    assert 0 < trace.spike_s.size < 10
    assert match.f1 == 1.0


def test_a_lasting_drop_in_height_does_not_end_the_cells_spikes() -> None:
    trace = membrane_trace(Recipe(duration_s=120, rate_hz=5000), np.random.default_rng(6))
    t = np.arange(trace.values_mv.size) / trace.rate_hz
    sharp = trace.values_mv - trace.subthreshold_mv
    values = trace.subthreshold_mv + sharp * np.interp(t, [0, 120], [1.0, 0.4])
    spikes = find_vm_spikes(membrane_of(values, 5000), MembraneSettings())
    assert matched(spikes.time_s, trace.spike_s).f1 >= 0.995


def test_limits_the_user_sets_are_kept() -> None:
    trace = membrane_trace(Recipe(duration_s=10), np.random.default_rng(7))
    high = find_vm_spikes(membrane_of_trace(trace), MembraneSettings(min_height_mv=90.0))
    steep = find_vm_spikes(membrane_of_trace(trace), MembraneSettings(min_dvdt_mv_ms=200.0))
    steeper = find_vm_spikes(membrane_of_trace(trace), MembraneSettings(min_dvdt_mv_ms=199.0, min_width_ms=2.0))
    assert high.time_s.size == 0
    assert steep.time_s.size == trace.spike_s.size
    assert steeper.time_s.size == 0


def test_drift_is_the_last_tenth_minus_the_first() -> None:
    assert drift_mv(np.linspace(-70.0, -40.0, 101)) == pytest.approx(27.3, abs=0.1)
    _, spikes, _ = found_in(Recipe(duration_s=40, rate_hz=5000, rest_mv=(-70.0, -40.0)))
    assert spikes.drift_mv == pytest.approx(27.0, abs=1.0)
    assert any("drifted between" in note for note in spikes.notes)


def test_resting_potential_is_the_median_over_time() -> None:
    _, spikes, _ = found_in(Recipe(duration_s=20, rate_hz=5000, swing_mv=0.0, rest_mv=(-61.0, -61.0)))
    assert spikes.resting_mv == pytest.approx(-61.0, abs=0.3)


@pytest.mark.parametrize(("values", "words"), [
    (np.full(20000, -60.0), "constant at -60 mV"), (np.zeros(20000), "constant at 0 mV"),
    (np.full(20000, np.nan), "no finite values"), (np.empty(0), "no samples"),
])
def test_nothing_to_find_spikes_in_is_said_in_one_line(values: np.ndarray, words: str) -> None:
    with pytest.raises(SignalError, match=words) as caught:
        find_vm_spikes(membrane_of(values, 10000), MembraneSettings())
    assert "\n" not in str(caught.value)
    assert str(caught.value).startswith("Vm: ")


def test_a_rate_too_slow_for_spikes_is_refused() -> None:
    with pytest.raises(SignalError, match="1000 Hz, too slow"):
        find_vm_spikes(membrane_of(np.zeros(5000), 1000), MembraneSettings())


@pytest.mark.parametrize("active", [(0.0, 0.0), (0.0, 0.4)], ids=["silent", "firing"])
def test_large_synaptic_potentials_are_neither_spikes_nor_many_spikelets(active: tuple[float, float]) -> None:
    rate, n_potentials = 10000, 600
    trace = membrane_trace(Recipe(duration_s=20, rate_hz=rate, active=active), np.random.default_rng(8))
    rng = np.random.default_rng(9)
    values, ms = trace.values_mv.copy(), np.arange(400) * 1e3 / rate
    for first in rng.integers(0, values.size - 400, n_potentials):
        values[first : first + 400] += 1.4 * rng.gamma(4.0, 1.0) * (np.exp(-ms / 6.0) - np.exp(-ms / 0.8))
    spikes = find_vm_spikes(membrane_of(values, rate), MembraneSettings())
    assert matched(spikes.time_s, trace.spike_s).f1 >= 0.995
    assert spikes.n_spikelets < 0.1 * n_potentials


def test_hum_of_the_mains_hides_no_small_spikes() -> None:
    trace = membrane_trace(Recipe(20, 10000, 2.0, shape=SMALL), np.random.default_rng(10))
    hum = 5.0 * np.sin(2 * np.pi * 50.0 * np.arange(trace.values_mv.size) / 10000)
    spikes = find_vm_spikes(membrane_of(trace.values_mv + hum, 10000), MembraneSettings())
    assert matched(spikes.time_s, trace.spike_s).f1 >= 0.99
