"""Nerve activity as an electrode sees it: noise shaped by an envelope, hum, heart and drift."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from unitclass.records import FloatArray
from unitclass.simulate.breathing import Breaths, phase_at
from unitclass.simulate.curves import NERVES, level_at

BLOCK_S = 20.0


@dataclass(frozen=True)
class Wire:
    """How a nerve is recorded.

    `snr` is the standard deviation of activity at the top of a usual burst over that of the
    background; `hum` and `heart` are amplitudes relative to the background; `every` is the share of
    breaths (1 in n) that the nerve takes part in, per condition.
    """

    name: str
    nerve: str
    curves: Sequence[str]
    rate_hz: float
    is_integrated: bool = False
    snr: float = 6.0
    hum_hz: float = 50.0
    hum: float = 0.6
    heart_hz: float = 5.2
    heart: float = 5.0
    every: Sequence[int] = (1, 1)


@dataclass(frozen=True)
class NerveTrace:
    """A recorded nerve: volts = counts × conversion; counts of shape (n_samples,), int16."""

    wire: Wire
    counts: NDArray[np.int16]
    conversion: float

    @property
    def description(self) -> str:
        """Return what the data file says of the trace."""
        if self.wire.is_integrated:
            return (f"{self.wire.nerve} nerve, band-passed, rectified and integrated (leaky, 50 ms), "
                    f"{self.wire.rate_hz:g} Hz")
        return f"{self.wire.nerve} nerve, raw neurogram, suction electrode, {self.wire.rate_hz:g} Hz"


def record(wire: Wire, breaths: Breaths, stop_s: float, rng: np.random.Generator) -> NerveTrace:
    """Return the nerve from 0 to `stop_s`, made block by block so that memory stays small."""
    if wire.is_integrated:
        return _integrated(wire, breaths, stop_s, rng)
    volts_per_count, noise_counts = 2e-7, 24.0
    blocks = [np.clip(np.round(noise_counts * block), -32000, 32000).astype(np.int16)
              for block in _blocks(wire, breaths, stop_s, wire.rate_hz, rng)]
    return NerveTrace(wire, np.concatenate(blocks), volts_per_count)


def envelope(wire: Wire, breaths: Breaths, times_s: FloatArray) -> FloatArray:
    """Return the nerve's activity at each time, 1 at the top of a usual burst, shape (n_times,)."""
    phase, breath = phase_at(breaths, times_s)
    condition = breaths.condition[breath]
    level = np.zeros(times_s.size)
    for c, name in enumerate(wire.curves):
        here = (breath >= 0) & (condition == c)
        takes_part = breath[here] % wire.every[c] == 0
        level[here] = level_at(NERVES[name], phase[here]) * breaths.amplitude[breath[here]] * takes_part
    return level


def _blocks(wire: Wire, breaths: Breaths, stop_s: float, rate_hz: float,
            rng: np.random.Generator) -> Iterator[FloatArray]:
    """Yield the raw neurogram in units of its background's standard deviation."""
    from scipy.signal import lfilter

    size, n = round(BLOCK_S * rate_hz), round(stop_s * rate_hz)
    b, a, scale = _resonance(min(400.0, 0.2 * rate_hz), rate_hz)
    states = [np.zeros(2), np.zeros(1)]
    beats = _heart_beats(wire, stop_s, rng)
    for first in range(0, n, size):
        times = np.arange(first, min(first + size, n)) / rate_hz
        activity, states[0] = lfilter(b, a, rng.standard_normal(times.size), zi=states[0])
        slow, states[1] = lfilter([0.6], [1, -0.8], rng.standard_normal(times.size), zi=states[1])
        shaped = wire.snr * envelope(wire, breaths, times) * activity / scale
        fade = 1 - 0.15 * times / stop_s
        yield fade * shaped + slow + _hum(wire, times) + wire.heart * _heart(times, beats)


def _resonance(peak_hz: float, rate_hz: float) -> tuple[FloatArray, FloatArray, float]:
    """Return a second-order filter that colours noise like compound action potentials, and its gain."""
    from scipy.signal import lfilter

    r, w = 0.75, 2 * np.pi * peak_hz / rate_hz
    b, a = np.array([1.0, 0.0, -1.0]), np.array([1.0, -2 * r * np.cos(w), r * r])
    response = lfilter(b, a, np.r_[1.0, np.zeros(400)])
    return b, a, float(np.sqrt(np.sum(response**2)))


def _hum(wire: Wire, times_s: FloatArray) -> FloatArray:
    turn = 2 * np.pi * wire.hum_hz * times_s
    sway = 0.8 * np.sin(2 * np.pi * 0.02 * times_s)
    return np.asarray(wire.hum * (np.sin(turn) + 0.3 * np.sin(3 * turn + 1)) + sway)


def _heart_beats(wire: Wire, stop_s: float, rng: np.random.Generator) -> FloatArray:
    if wire.heart == 0:
        return np.zeros(0)
    gaps = (1 + 0.03 * rng.standard_normal(int(1.2 * stop_s * wire.heart_hz) + 10)) / wire.heart_hz
    return np.cumsum(gaps)


def _heart(times_s: FloatArray, beats_s: FloatArray) -> FloatArray:
    """Return a biphasic deflection of about 6 ms at each beat."""
    if beats_s.size == 0:
        return np.zeros(times_s.size)
    k = np.clip(np.searchsorted(beats_s, times_s), 1, beats_s.size - 1)
    since, until = times_s - beats_s[k - 1], beats_s[k] - times_s
    lag = np.where(since < until, since, -until)
    return np.exp(-0.5 * (lag / 0.0012) ** 2) - 0.6 * np.exp(-0.5 * ((lag - 0.003) / 0.0016) ** 2)


def _integrated(wire: Wire, breaths: Breaths, stop_s: float, rng: np.random.Generator) -> NerveTrace:
    """Rectify and integrate a raw neurogram at 2 kHz, then keep every n-th sample."""
    from scipy.signal import butter, lfilter, sosfilt

    raw_hz, tau_s = 2000.0, 0.05
    sos = butter(2, (100, 900), "bandpass", fs=raw_hz, output="sos")
    step = round(raw_hz / wire.rate_hz)
    keep = np.exp(-1 / (raw_hz * tau_s))
    raw = np.concatenate(list(_blocks(wire, breaths, stop_s, raw_hz, rng)))
    smooth = lfilter([1 - keep], [1, -keep], np.abs(sosfilt(sos, raw)))[::step]
    return NerveTrace(wire, np.clip(np.round(1000 * smooth), 0, 32000).astype(np.int16), 5e-9)
