"""Mains hum in a nerve: found once on a few seconds, then fitted and subtracted frame by frame."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from unitclass.records import FloatArray, Signal
from unitclass.signals.frames import frames
from unitclass.signals.smoothing import filled

MAINS_HZ = (50.0, 60.0)
PROBE_S = 4.0
N_PROBES = 3
FIT_S = 1.0
MIN_LINE = 12.0
"""A line counts when its power is so many times that of its surroundings."""
MIN_SHARE = 0.02
"""Hum is removed when its lines hold so much of the power in the band."""


@dataclass(frozen=True)
class Hum:
    """Lines of the mains, Hz ascending; empty where there is none worth removing."""

    lines_hz: tuple[float, ...] = ()

    @property
    def words(self) -> str:
        """Return what was found, in words."""
        if not self.lines_hz:
            return ""
        listed = ", ".join(f"{line:.0f}" for line in self.lines_hz[:6])
        more = " and more" if len(self.lines_hz) > 6 else ""
        return f"mains hum fitted and subtracted at {listed}{more} Hz"


def find_hum(signal: Signal, *, start_s: float, stop_s: float, low_hz: float, high_hz: float) -> Hum:
    """Return the mains lines of a stretch, judged on three probes of a few seconds.

    Parameters
    ----------
    signal : Signal
        The raw nerve.
    start_s, stop_s : float
        The stretch, session time.
    low_hz, high_hz : float
        The band that the nerve is filtered to: lines below half of `low_hz` do not matter.
    """
    spectra = [_spectrum(values, signal.rate_hz) for values in _probes(signal, start_s, stop_s)
               if values.size >= signal.rate_hz and np.ptp(values) > 0]
    if not spectra:
        return Hum()
    n = min(s.size for s in spectra)
    power = np.median([s[:n] for s in spectra], axis=0)
    resolution_hz = signal.rate_hz / 2 / max(n - 1, 1)
    found = [_lines(power, resolution_hz, mains, 0.5 * low_hz, high_hz) for mains in MAINS_HZ]
    lines, strength = max(found, key=lambda item: item[1])
    band = power[int(0.5 * low_hz / resolution_hz) : int(high_hz / resolution_hz) + 1].sum()
    return Hum(lines) if lines and strength > MIN_SHARE * band else Hum()


def _probes(signal: Signal, start_s: float, stop_s: float) -> list[FloatArray]:
    length = min(PROBE_S, stop_s - start_s)
    places = np.linspace(start_s, max(start_s, stop_s - length), N_PROBES + 2)[1:-1]
    probes = []
    for at in places:
        parts = [f.values for f in frames(signal, start_s=at, stop_s=at + length)]
        probes.append(filled(np.concatenate(parts)) if parts else np.empty(0))
    return probes


def _spectrum(values: FloatArray, rate_hz: float) -> FloatArray:
    n = int(min(values.size, PROBE_S * rate_hz))
    part = values[:n] - values[:n].mean()
    return np.asarray(np.abs(np.fft.rfft(part * np.hanning(n))) ** 2)


def _lines(power: FloatArray, resolution_hz: float, mains_hz: float, low_hz: float,
           high_hz: float) -> tuple[tuple[float, ...], float]:
    lines, strength = [], 0.0
    for k in range(1, int(min(high_hz, 2000.0) / mains_hz) + 1):
        line_hz = k * mains_hz
        if line_hz < low_hz:
            continue
        at = _peak_near(power, line_hz / resolution_hz, 0.002 * line_hz / resolution_hz + 1.5)
        around = _surroundings(power, at, 8.0 / resolution_hz)
        if not around > 0 or power[at] < MIN_LINE * around:
            continue
        lines.append(_interpolated(power, at) * resolution_hz)
        strength += float(power[max(0, at - 2) : at + 3].sum()) - 5 * around
    return _on_one_series(lines, mains_hz), strength


def _on_one_series(lines: list[float], mains_hz: float) -> tuple[float, ...]:
    """Return the lines as exact multiples of one frequency: each tells it k times as finely."""
    if not lines:
        return ()
    order = np.round(np.array(lines) / mains_hz)
    base = float(np.sum(np.array(lines) * order) / np.sum(order**2))
    return tuple(float(k * base) for k in order)


def _peak_near(power: FloatArray, at: float, reach: float) -> int:
    low, high = max(0, int(at - reach)), min(power.size, int(np.ceil(at + reach)) + 1)
    return low + int(np.argmax(power[low:high])) if high > low else min(int(at), power.size - 1)


def _surroundings(power: FloatArray, at: int, reach: float) -> float:
    near, far = 4, max(6, int(reach))
    around = np.concatenate([power[max(0, at - far) : max(0, at - near)], power[at + near : at + far]])
    return float(np.median(around)) if around.size else 0.0


def _interpolated(power: FloatArray, at: int) -> float:
    if not 0 < at < power.size - 1:
        return float(at)
    left, mid, right = np.log(power[at - 1 : at + 2] + 1e-300)
    bend = left - 2 * mid + right
    return at + (0.5 * (left - right) / bend if bend < 0 else 0.0)


class HumFit:
    """Fits the mains lines to consecutive pieces of a second and subtracts them.

    Amplitude and phase of every line may change linearly within a piece, so that a mains
    frequency that wanders by a few hundredths of a hertz is followed.
    """

    def __init__(self, hum: Hum, rate_hz: float) -> None:
        self._hum = hum
        self._rate_hz = rate_hz
        self._bases: dict[int, tuple[FloatArray, FloatArray]] = {}

    def subtract(self, values: FloatArray) -> None:
        """Take the hum out of `values`, shape (n_samples,), in place."""
        if not self._hum.lines_hz:
            return
        n_pieces = max(1, round(values.size / (FIT_S * self._rate_hz)))
        for piece in np.array_split(values, n_pieces):
            if piece.size > 0.1 * self._rate_hz:
                basis, inverse = self._basis(piece.size)
                piece -= basis @ (inverse @ piece)

    def _basis(self, n: int) -> tuple[FloatArray, FloatArray]:
        if n not in self._bases:
            t = (np.arange(n) - (n - 1) / 2) / self._rate_hz
            turns = [2 * np.pi * line * t for line in self._hum.lines_hz]
            waves = [wave(turn) for turn in turns for wave in (np.sin, np.cos)]
            basis = np.column_stack(waves + [w * t / t[-1] for w in waves])
            self._bases[n] = basis, np.linalg.pinv(basis)
        return self._bases[n]
