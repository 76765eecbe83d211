"""Membrane potential of an integrate-and-fire cell driven by conductances that follow the breath.

    tau dV/dt = (E_leak - V) + g_e (E_e - V) + g_i (E_i - V) + (w + a) (E_k - V)

All conductances are relative to the leak's. g_e and g_i follow curves over the cycle with noise and a
gain that wanders from breath to breath; w is a slow spike-triggered adaptation, a a short
after-hyperpolarisation. At threshold a spike of fixed form is written and V starts again below.
The firing pattern is not put in: it emerges from the conductances.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from math import exp

import numpy as np
from numpy.typing import NDArray

from unitclass.records import FloatArray
from unitclass.simulate.breathing import Breaths, phase_at
from unitclass.simulate.curves import Curve, level_at, points

MV_PER_COUNT = 0.05


@dataclass(frozen=True)
class Synapses:
    """Excitatory and inhibitory conductance over the cycle, relative to the leak."""

    excitation: Curve
    inhibition: Curve


@dataclass(frozen=True)
class Constants:
    """The cell's own numbers; potassium acetate in the electrode leaves E_i where it is."""

    tau_ms: float = 14.0
    leak_mv: float = -61.0
    e_mv: float = 0.0
    i_mv: float = -77.0
    k_mv: float = -88.0
    threshold_mv: float = -47.0
    reset_mv: float = -58.0
    peak_mv: float = 14.0
    adaptation: float = 0.10
    adaptation_ms: float = 180.0
    after: float = 0.9
    after_ms: float = 9.0


CELLS: Mapping[str, Synapses] = {
    "post-I": Synapses(
        excitation=points("0:0.08 0.97:0.08 1:0.5 1.04:0.85 1.2:0.5 1.4:0.25 1.6:0.12 2:0.08"),
        inhibition=points("0:0.9 0.1:1.3 0.9:1.1 0.97:0.3 1:0 1.35:0.05 1.6:0.3 1.97:0.4 2:0.9")),
    "early-I": Synapses(
        excitation=points("0:0.9 0.08:0.95 0.4:0.55 0.8:0.28 0.98:0.18 1:0.08 1.9:0.1 1.99:0.2 2:0.9"),
        inhibition=points("0:0 0.5:0.05 0.95:0.2 1:1.1 1.08:1.4 1.3:0.9 1.45:0.55 1.9:0.5 1.98:0.15 2:0")),
}

_UP_MS, _DOWN_MS = 0.6, 1.4


@dataclass(frozen=True)
class MembraneTrace:
    """A recorded cell: mV = counts × MV_PER_COUNT, counts (n_samples,) int16; `spikes_s` are known."""

    cell_id: str
    type: str
    counts: NDArray[np.int16]
    rate_hz: float
    spikes_s: FloatArray


def impale(cell_id: str, type_: str, breaths: Breaths, stop_s: float, rng: np.random.Generator, *,
           rate_hz: float = 8000.0, noise_mv: float = 0.12, drift_mv: float = 3.0) -> MembraneTrace:
    """Return the membrane potential of a cell of `type_`, one of CELLS, from 0 to `stop_s`.

    `noise_mv` is the amplifier's, `drift_mv` how much the potential creeps up over the recording.
    """
    excitation, inhibition = conductances(CELLS[type_], breaths, stop_s, rate_hz, rng)
    vm, spikes = integrate(excitation, inhibition, rate_hz, Constants())
    vm += noise_mv * rng.standard_normal(vm.size) + drift_mv * np.arange(vm.size) / vm.size
    counts = np.round(vm / MV_PER_COUNT).astype(np.int16)
    return MembraneTrace(cell_id, type_, counts, rate_hz, spikes)


def conductances(synapses: Synapses, breaths: Breaths, stop_s: float, rate_hz: float,
                 rng: np.random.Generator) -> tuple[FloatArray, FloatArray]:
    """Return excitation and inhibition at each sample, relative to the leak, never negative."""
    times = np.arange(round(stop_s * rate_hz)) / rate_hz
    phase, breath = phase_at(breaths, times)
    gain = np.exp(0.08 * rng.standard_normal(breaths.n_breaths))[breath]
    made = []
    for curve in (synapses.excitation, synapses.inhibition):
        mean = _smoothed(level_at(curve, phase) * gain, 0.012 * rate_hz)
        noise = _smoothed(rng.standard_normal(times.size), 0.004 * rate_hz) * np.sqrt(0.008 * rate_hz)
        made.append(np.maximum(mean + 0.07 * noise, 0.0))
    return made[0], made[1]


def integrate(excitation: FloatArray, inhibition: FloatArray, rate_hz: float,
              cell: Constants) -> tuple[FloatArray, FloatArray]:
    """Return the potential in mV at each sample and the moments of the spikes' steepest rise, in s."""
    dt_ms = 1000.0 / rate_hz
    form = _spike_form(dt_ms, cell)
    decay_w, decay_a = np.exp(-dt_ms / cell.adaptation_ms), np.exp(-dt_ms / cell.after_ms)
    vm = np.empty(excitation.size)
    spikes = []
    v, w, a, left = cell.leak_mv, 0.0, 0.0, 0
    for i, (ge, gi) in enumerate(zip(excitation.tolist(), inhibition.tolist(), strict=True)):
        w *= decay_w
        a *= decay_a
        if left:
            v = form[len(form) - left]
            left -= 1
        else:
            total = 1 + ge + gi + w + a
            rest = (cell.leak_mv + ge * cell.e_mv + gi * cell.i_mv + (w + a) * cell.k_mv) / total
            v = rest + (v - rest) * exp(-dt_ms * total / cell.tau_ms)
            if v >= cell.threshold_mv:
                spikes.append(i / rate_hz + 0.5 * _UP_MS / 1000)
                left = len(form)
                w += cell.adaptation
                a += cell.after
        vm[i] = v
    return vm, np.array(spikes)


def _spike_form(dt_ms: float, cell: Constants) -> list[float]:
    """Return the samples of a spike after the one that crosses threshold."""
    t = np.arange(dt_ms, _UP_MS + _DOWN_MS, dt_ms)
    up = np.clip(t / _UP_MS, 0, 1)
    down = np.clip((t - _UP_MS) / _DOWN_MS, 0, 1)
    rising = cell.threshold_mv + (cell.peak_mv - cell.threshold_mv) * up**2 * (3 - 2 * up)
    return list(map(float, rising + (cell.reset_mv - cell.peak_mv) * down**1.3 * (2.3 - 1.3 * down)))


def _smoothed(values: FloatArray, samples: float) -> FloatArray:
    """Return the values through a leaky integrator with this time constant in samples."""
    from scipy.signal import lfilter

    keep = np.exp(-1 / samples)
    return np.asarray(lfilter([1 - keep], [1, -keep], values))
