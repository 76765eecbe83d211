"""Membrane potentials with known spike times, made without any code of the program.

The trace is drawn at a fine rate (200 kHz or more), so that sub-sample times, filters and any
sampling rate from 5 to 50 kHz are honest; the truth is the steepest rise of the noise-free,
filtered action potential. Numbers are invented, of the usual order for brainstem cells.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray
from scipy import signal

Array = NDArray[np.float64]


@dataclass(frozen=True)
class Shape:
    """One action potential: height above the foot, rise, fall and after-hyperpolarisation."""

    height_mv: float = 60.0
    rise_ms: float = 0.15
    fall_ms: float = 0.5
    ahp_mv: float = 5.0
    ahp_ms: float = 6.0

    def drawn(self, rate_hz: float) -> tuple[Array, float]:
        """Return the waveform in mV and the seconds from its first sample to its foot."""
        before_s, after_s = 0.003, 0.04
        t = np.arange(-round(before_s * rate_hz), round(after_s * rate_hz)) / rate_hz * 1e3
        fast = 1.0 / (1.0 + np.exp(-t / (self.rise_ms / 2.2)))
        bump = fast * np.exp(-np.maximum(t, 0.0) / self.fall_ms)
        bump /= bump.max()
        after = np.where(t > 0, (1 - np.exp(-np.maximum(t, 0) / (2 * self.fall_ms))) *
                         np.exp(-np.maximum(t, 0) / self.ahp_ms), 0.0)
        return self.height_mv * bump - self.ahp_mv * after, before_s


@dataclass(frozen=True)
class Trace:
    """A recorded trace and what is true of it; times in seconds, potentials in mV."""

    values_mv: Array
    rate_hz: float
    spike_s: Array
    spikelet_s: Array
    subthreshold_mv: Array


@dataclass(frozen=True)
class Recipe:
    """What to draw. Everything has a plain default; `replace` what a test is about."""

    duration_s: float = 60.0
    rate_hz: float = 20000.0
    noise_mv: float = 0.5
    low_pass_hz: float = 0.0
    shape: Shape = Shape()
    rest_mv: tuple[float, float] = (-60.0, -60.0)
    swing_mv: float = 6.0
    cycle_s: float = 2.0
    rate_in_burst_hz: float = 30.0
    active: tuple[float, float] = (0.0, 0.4)
    shrink: float = 1.0
    spikelet_mv: float = 0.0
    spikelet_hz: float = 2.0
    pop_mv: float = 0.0
    pop_ms: float = 0.1
    pop_hz: float = 2.0
    step_mv: float = 0.0
    step_s: float = 0.3
    synaptic_mv: float = 0.5
    quantum_mv: float = 0.0
    min_interval_s: float = 0.004


FINE_HZ = 200_000.0


def membrane_trace(recipe: Recipe, rng: np.random.Generator) -> Trace:
    """Draw the trace of `recipe`, ten seconds at a time at the fine rate."""
    factor = max(1, round(FINE_HZ / recipe.rate_hz))
    fine_hz = factor * recipe.rate_hz
    spikes, sizes = _spike_train(recipe, rng)
    spikelets = _apart(_poisson(recipe.spikelet_hz if recipe.spikelet_mv else 0.0, recipe.duration_s, rng), spikes)
    parts, smooth_parts = [], []
    step = 10.0
    for start in np.arange(0.0, recipe.duration_s, step):
        stop = min(start + step, recipe.duration_s)
        smooth = _subthreshold(recipe, fine_hz, start, stop)
        sharp = _events(recipe, fine_hz, start, stop, spikes, sizes, spikelets)
        parts.append(sharp)
        smooth_parts.append(smooth)
    smooth = np.concatenate([p[::factor] for p in smooth_parts])
    smooth += _synaptic(recipe, smooth.size, rng)
    sharp = _recorded(recipe, np.concatenate(parts), fine_hz, factor)
    values = smooth + sharp + _noise(recipe, smooth.size, rng)
    values += _stimuli(recipe, smooth.size, rng, np.concatenate([spikes, spikelets]))
    if recipe.quantum_mv:
        values = np.round(values / recipe.quantum_mv) * recipe.quantum_mv
    delay = steepest_s(recipe, fine_hz)
    return Trace(values, recipe.rate_hz, spikes + delay, spikelets + delay, smooth)


def steepest_s(recipe: Recipe, fine_hz: float) -> float:
    """Return the seconds from an event's foot to its steepest rise as recorded."""
    wave, before_s = recipe.shape.drawn(fine_hz)
    padded = _recorded(recipe, np.concatenate([np.zeros(2000), wave, np.zeros(2000)]), fine_hz, 1)
    slope = np.gradient(padded)
    i = int(np.argmax(slope))
    left, top, right = slope[i - 1 : i + 2]
    bend = left - 2 * top + right
    shift = 0.5 * (left - right) / bend if bend else 0.0
    return float((i + shift - 2000) / fine_hz - before_s)


def _spike_train(recipe: Recipe, rng: np.random.Generator) -> tuple[Array, Array]:
    """Foot times and relative heights: bursts in the active part of each cycle."""
    times, sizes = [], []
    for onset in np.arange(0.0, recipe.duration_s, recipe.cycle_s):
        t = onset + recipe.active[0] * recipe.cycle_s + rng.exponential(1 / recipe.rate_in_burst_hz)
        size = 1.0
        while t < onset + recipe.active[1] * recipe.cycle_s:
            times.append(t)
            sizes.append(size)
            size = max(0.3, size * recipe.shrink)
            t += recipe.min_interval_s + rng.gamma(4.0, max(0.0, 1 / recipe.rate_in_burst_hz -
                                                            recipe.min_interval_s) / 4.0)
    feet, heights = np.array(times), np.array(sizes)
    inside = (feet > 0.02) & (feet < recipe.duration_s - 0.02)
    return feet[inside], heights[inside]


def _poisson(rate_hz: float, duration_s: float, rng: np.random.Generator) -> Array:
    return np.sort(rng.uniform(0.05, duration_s - 0.05, rng.poisson(rate_hz * duration_s)))


def _apart(times: Array, others: Array, gap_s: float = 0.012) -> Array:
    """Keep the times that are further than `gap_s` from every other and each other."""
    kept: list[float] = []
    for t in times:
        if others.size and np.min(np.abs(others - t)) < gap_s:
            continue
        if kept and t - kept[-1] < gap_s:
            continue
        kept.append(float(t))
    return np.array(kept)


def _subthreshold(recipe: Recipe, fine_hz: float, start: float, stop: float) -> Array:
    t = start + np.arange(round((stop - start) * fine_hz)) / fine_hz
    drift = np.interp(t, [0.0, recipe.duration_s], recipe.rest_mv)
    phase = (t % recipe.cycle_s) / recipe.cycle_s
    middle = 0.5 * sum(recipe.active)
    return np.asarray(drift + 0.5 * recipe.swing_mv * np.cos(2 * np.pi * (phase - middle)))


def _events(recipe: Recipe, fine_hz: float, start: float, stop: float, spikes: Array, sizes: Array,
            spikelets: Array) -> Array:
    out = np.zeros(round((stop - start) * fine_hz))
    wave, before_s = recipe.shape.drawn(fine_hz)
    small, _ = replace(recipe.shape, height_mv=recipe.spikelet_mv, ahp_mv=0.0).drawn(fine_hz)
    for t, size in zip(spikes, sizes, strict=True):
        _add(out, size * wave, t - before_s - start, fine_hz)
    for t in spikelets:
        _add(out, small, t - before_s - start, fine_hz)
    return out


def _add(out: Array, wave: Array, offset_s: float, fine_hz: float) -> None:
    """Add `wave` at the nearest fine sample, as far as it lies inside `out`."""
    first = round(offset_s * fine_hz)
    low, high = max(first, 0), min(first + wave.size, out.size)
    if low < high:
        out[low:high] += wave[low - first : high - first]


def _recorded(recipe: Recipe, sharp: Array, fine_hz: float, factor: int) -> Array:
    """Pass through the amplifier's filter (four-pole Bessel) and sample."""
    if recipe.low_pass_hz:
        sos = signal.bessel(4, recipe.low_pass_hz, fs=fine_hz, output="sos", norm="mag")
        sharp = signal.sosfilt(sos, sharp)
    return np.asarray(sharp[::factor])


def _noise(recipe: Recipe, n: int, rng: np.random.Generator) -> Array:
    white = rng.normal(0.0, 1.0, n)
    if recipe.low_pass_hz and recipe.low_pass_hz < 0.45 * recipe.rate_hz:
        sos = signal.bessel(4, recipe.low_pass_hz, fs=recipe.rate_hz, output="sos", norm="mag")
        white = signal.sosfilt(sos, white)
        white /= white.std()
    return np.asarray(recipe.noise_mv * white)


def _synaptic(recipe: Recipe, n: int, rng: np.random.Generator, tau_s: float = 0.008) -> Array:
    keep = float(np.exp(-1.0 / (tau_s * recipe.rate_hz)))
    shock = rng.normal(0.0, recipe.synaptic_mv * np.sqrt(1 - keep**2), n)
    return np.asarray(signal.lfilter([1.0], [1.0, -keep], shock))


def _stimuli(recipe: Recipe, n: int, rng: np.random.Generator, events: Array) -> Array:
    """Pops of either sign, and bridge steps of either sign, away from spikes and spikelets."""
    out = np.zeros(n)
    duration = n / recipe.rate_hz
    if recipe.pop_mv:
        width = max(1, round(recipe.pop_ms * 1e-3 * recipe.rate_hz))
        for t in _apart(_poisson(recipe.pop_hz, duration, rng), events):
            first = round(t * recipe.rate_hz)
            out[first : first + width] += recipe.pop_mv * rng.choice([-1.0, 1.0, 1.0])
    if recipe.step_mv:
        for t in np.arange(1.0, duration - 1.0, 3 * recipe.step_s + 0.173):
            first = round(t * recipe.rate_hz)
            out[first : first + round(recipe.step_s * recipe.rate_hz)] += recipe.step_mv * rng.choice([-1.0, 1.0])
    return out


# ------------------------------------------------------------------------- two model cells

def hodgkin_huxley(rate_hz: float, duration_s: float, current: float, *, from_s: float = 0.1, sub: int = 4) -> Array:
    """Return the potential of the squid axon under a step of current, mV at `rate_hz`.

    Hodgkin & Huxley, J Physiol 1952;117:500, in the modern sign convention (rest at -65 mV);
    `current` in microamperes per square centimetre. Forward Euler at `sub` steps a sample.
    """
    dt = 1e3 / rate_hz / sub
    v, m, h, n = -65.0, 0.0529, 0.5961, 0.3177
    out = np.empty(round(duration_s * rate_hz))
    exp = np.exp
    for i in range(out.size * sub):
        opening_n = 0.01 * (v + 55) / (1 - exp(-(v + 55) / 10)) if abs(v + 55) > 1e-7 else 0.1
        opening_m = 0.1 * (v + 40) / (1 - exp(-(v + 40) / 10)) if abs(v + 40) > 1e-7 else 1.0
        m += dt * (opening_m * (1 - m) - 4 * exp(-(v + 65) / 18) * m)
        h += dt * (0.07 * exp(-(v + 65) / 20) * (1 - h) - h / (1 + exp(-(v + 35) / 10)))
        n += dt * (opening_n * (1 - n) - 0.125 * exp(-(v + 65) / 80) * n)
        into = current if i * dt >= 1e3 * from_s else 0.0
        v += dt * (into - 120 * m**3 * h * (v - 50) - 36 * n**4 * (v + 77) - 0.3 * (v + 54.387))
        if i % sub == 0:
            out[i // sub] = v
    return out


@dataclass(frozen=True)
class LeakyCell:
    """A leaky integrate-and-fire cell under constant current, solved in closed form.

    It fires every tau ln(drive / (drive - threshold)) + refractory, where drive is R times I and
    both are above the resting potential to which the cell is reset.
    """

    tau_ms: float = 20.0
    drive_mv: float = 25.0
    threshold_mv: float = 15.0
    rest_mv: float = -65.0
    refractory_ms: float = 3.0

    @property
    def interval_s(self) -> float:
        """Return the closed-form interval."""
        return 1e-3 * (self.tau_ms * np.log(self.drive_mv / (self.drive_mv - self.threshold_mv)) + self.refractory_ms)

    def trace(self, rate_hz: float, duration_s: float) -> tuple[Array, Array]:
        """Return the potential in mV, and the moments at which it meets the threshold.

        From threshold it rises in a straight line for 0.4 ms to 85 mV above rest and falls back
        to rest within the refractory period.
        """
        t = np.arange(round(duration_s * rate_hz)) / rate_hz
        climb_s = self.interval_s - 1e-3 * self.refractory_ms
        since = np.where(t < climb_s, t + 1e-3 * self.refractory_ms, (t - climb_s) % self.interval_s)
        ms = 1e3 * since
        climbing = self.drive_mv * (1 - np.exp(-(ms - self.refractory_ms) / self.tau_ms))
        rising = self.threshold_mv + (85.0 - self.threshold_mv) * ms / 0.4
        falling = 85.0 * np.maximum(0.0, 1 - (ms - 0.4) / 1.2)
        above = np.where(ms < 0.4, rising, np.where(ms < self.refractory_ms, falling, climbing))
        return self.rest_mv + above, np.arange(climb_s, duration_s, self.interval_s)
