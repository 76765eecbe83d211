"""An independent generator of raw and integrated nerves whose onsets and offsets are known.

Bursts are drawn as an envelope on a fine grid; truth is read off that envelope, where it passes a
tenth of its own peak (or where inspiration is cut, when an after-discharge follows). A raw nerve is
two independent noises: a floor, and the burst's noise times the envelope. An integrated nerve is
that raw nerve rectified and passed through a leaky integrator, or the envelope itself with noise of
the amplifier added.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field, replace

import numpy as np
from scipy import signal as sps

from unitclass.records import ArrayChunks, FloatArray, Signal

FINE_HZ = 2000.0


@dataclass(frozen=True)
class Plan:
    """What the nerve does. Durations in s, amplitudes relative to a plain breath.

    `events` maps a cycle's index to "sigh", "apnoea", "doublet", "swallow" or "gasp". `duty_cv` scatters
    TI apart from TTOT. `lead_in_s` is the silence before the first burst.
    """

    shape: str = "ramp"
    n_cycles: int = 60
    ttot_s: float = 3.0
    duty: float = 0.3
    cv: float = 0.08
    amplitude_cv: float = 0.08
    after_discharge: float = 0.0
    after_tau_s: float = 0.3
    edge_s: float = 0.02
    lead_in_s: float = 1.0
    events: Mapping[int, str] = field(default_factory=dict)
    post_i: float = 0.0


@dataclass(frozen=True)
class Truth:
    """The envelope drawn, shape (n_samples,), at FINE_HZ from zero, and the marks read off it."""

    envelope: FloatArray
    onset_s: FloatArray
    offset_s: FloatArray
    events: Mapping[int, str]
    burst_rms: float
    extra_s: FloatArray = field(default_factory=lambda: np.empty(0))

    @property
    def duration_s(self) -> float:
        """Return the length of the drawn envelope."""
        return self.envelope.size / FINE_HZ


def burst(shape: str, n: int, edge: int) -> FloatArray:
    """Return one burst of peak one over n samples; `edge` samples of raised cosine where it is steep."""
    u = (np.arange(n) + 0.5) / n
    curves = {
        "ramp": u,
        "gentle": u**2,
        "arched": np.sin(np.pi / 2 * u) ** 1.2,
        "bell": np.sin(np.pi * np.minimum(u / 1.6, 1)) ** 1.5,
        "square": np.ones(n),
        "decrementing": 1.0 - 0.7 * u,
        "falling": np.exp(-3.0 * u),
    }
    curve = curves[shape].copy()
    edge = max(1, min(edge, n // 4))
    flank = 0.5 - 0.5 * np.cos(np.pi * (np.arange(edge) + 0.5) / edge)
    if shape in ("square", "decrementing", "falling"):
        curve[:edge] *= flank
    if shape != "falling":
        curve[-edge:] *= flank[::-1]
    return curve / curve.max()


def draw(plan: Plan, rng: np.random.Generator) -> Truth:
    """Draw the envelope and read its marks."""
    ttot, ti, amplitude = _durations(plan, rng)
    starts = plan.lead_in_s + np.concatenate([[0.0], np.cumsum(ttot)])
    envelope = np.zeros(int((starts[-1] + 0.3) * FINE_HZ))
    onset, offset, peaks, extra = [], [], [], []
    edge = round(plan.edge_s * FINE_HZ)
    for i, start in enumerate(starts[:-1]):
        shape = "decrementing" if plan.events.get(i) == "gasp" else plan.shape
        curve = amplitude[i] * burst(shape, max(8, round(ti[i] * FINE_HZ)), edge)
        at = round(start * FINE_HZ)
        envelope[at : at + curve.size] += curve
        marks = np.flatnonzero(curve >= 0.1 * curve.max())
        onset.append((at + marks[0]) / FINE_HZ)
        offset.append((at + marks[-1] + 1) / FINE_HZ)
        peaks.append(curve)
        level = plan.after_discharge * amplitude[i]
        _add(envelope, at + curve.size, _tail(level, plan.after_tau_s))
        if plan.events.get(i) == "doublet":
            gap = ti[i] + 0.15 * (ttot[i] - ti[i])
            second = burst(plan.shape, max(8, round(0.7 * ti[i] * FINE_HZ)), edge) * 0.8 * amplitude[i]
            _add(envelope, round((start + gap) * FINE_HZ), second)
            marks = np.flatnonzero(second >= 0.1 * second.max()) / FINE_HZ
            extra.append(start + gap + marks[0])
        if plan.events.get(i) == "swallow":
            short = burst("bell", max(8, round(0.25 * ti[i] * FINE_HZ)), edge) * 1.2
            _add(envelope, round((start + ti[i] + 0.45 * (ttot[i] - ti[i])) * FINE_HZ), short)
    rms = float(np.sqrt(np.mean(np.concatenate(peaks) ** 2)))
    return Truth(envelope, np.array(onset), np.array(offset), plan.events, rms, np.array(extra))


def _durations(plan: Plan, rng: np.random.Generator) -> tuple[FloatArray, FloatArray, FloatArray]:
    n = plan.n_cycles
    ttot = plan.ttot_s * np.exp(plan.cv * rng.standard_normal(n))
    ti = plan.duty * plan.ttot_s * np.exp(plan.cv * rng.standard_normal(n))
    ti = np.minimum(ti, 0.85 * ttot)
    amplitude = np.exp(plan.amplitude_cv * rng.standard_normal(n))
    for i, event in plan.events.items():
        if event == "sigh":
            amplitude[i], ti[i] = 2.0, 1.3 * ti[i]
            ttot[i] = ti[i] + 1.7 * plan.ttot_s * (1 - plan.duty)
        if event == "apnoea":
            ttot[i] = ti[i] + 4.0 * plan.ttot_s * (1 - plan.duty)
        if event == "gasp":
            amplitude[i], ti[i] = 1.6, 0.5 * ti[i]
        if event == "doublet":
            ttot[i] = max(ttot[i], 1.1 * plan.ttot_s)
    return ttot, ti, amplitude


def _tail(level: float, tau_s: float) -> FloatArray:
    if level <= 0:
        return np.empty(0)
    return level * np.exp(-np.arange(round(4 * tau_s * FINE_HZ)) / FINE_HZ / tau_s)


def _add(envelope: FloatArray, at: int, curve: FloatArray) -> None:
    stop = min(envelope.size, at + curve.size)
    envelope[at:stop] += curve[: max(0, stop - at)]


@dataclass(frozen=True)
class Rig:
    """How the nerve is recorded.

    `snr` is burst over floor, r.m.s. `trouble` is any of "hum", "heart", "drift", "dead", "saturation",
    "nan", "movement".
    """

    rate_hz: float = 20000.0
    snr: float = 6.0
    scale: float = 1e-5
    trouble: tuple[str, ...] = ()
    hum_hz: float = 50.0
    heart_hz: float = 6.0
    band_hz: tuple[float, float] = (100.0, 3000.0)


def raw_values(truth: Truth, rig: Rig, rng: np.random.Generator) -> FloatArray:
    """Return the raw nerve, shape (n_samples,), in V (floor r.m.s. equals `rig.scale`)."""
    n = int(truth.duration_s * rig.rate_hz)
    t = np.arange(n) / rig.rate_hz
    strength = np.interp(t, (np.arange(truth.envelope.size) + 0.5) / FINE_HZ, truth.envelope)
    gain = rig.snr / truth.burst_rms
    values = noise(n, rig, rng) + gain * strength * noise(n, rig, rng)
    if "hum" in rig.trouble:
        values += hum(t, rig, rng)
    if "drift" in rig.trouble:
        values = values * np.exp(0.6 * np.sin(2 * np.pi * t / t[-1])) + 3 * np.sin(2 * np.pi * t / 20)
    if "heart" in rig.trouble:
        values += heart(t, rig, rng)
    return rig.scale * broken(values, rig, rng)


def noise(n: int, rig: Rig, rng: np.random.Generator) -> FloatArray:
    """Return band-limited Gaussian noise of unit r.m.s."""
    top = min(rig.band_hz[1], 0.45 * rig.rate_hz)
    sos = sps.butter(2, [min(rig.band_hz[0], top / 3), top], "band", fs=rig.rate_hz, output="sos")
    values = sps.sosfilt(sos, rng.standard_normal(n))
    return np.asarray(values / values.std())


def hum(t: FloatArray, rig: Rig, rng: np.random.Generator) -> FloatArray:
    """Return mains hum four times the floor with odd harmonics; its frequency wanders by 0.02 Hz."""
    dt = t[1] - t[0]
    phase = 2 * np.pi * (np.cumsum(rig.hum_hz + 0.02 * np.sin(2 * np.pi * t / 37)) * dt + rng.uniform())
    return np.asarray(4 * np.sin(phase) + 1.5 * np.sin(3 * phase + 1) + 0.8 * np.sin(5 * phase + 2)
                      + 0.4 * np.sin(7 * phase))


def heart(t: FloatArray, rig: Rig, rng: np.random.Generator) -> FloatArray:
    """Return biphasic cardiac spikes, about 8 ms wide, eight times the floor."""
    out = np.zeros(t.size)
    width = 0.0015
    n = round(0.02 * rig.rate_hz)
    k = (np.arange(n) - n / 2) / rig.rate_hz / width
    shape = -k * np.exp(0.5 - k**2 / 2)
    at = 0.1
    while at < t[-1] - 0.05:
        first = int(at * rig.rate_hz)
        out[first : first + n] += 8 * shape
        at += (1 + 0.04 * rng.standard_normal()) / rig.heart_hz
    return out


def broken(values: FloatArray, rig: Rig, rng: np.random.Generator) -> FloatArray:
    """Return `values` with the dead stretch, gap, saturation or movement asked for."""
    n, rate = values.size, rig.rate_hz
    out = values.copy()
    third = n // 3
    if "dead" in rig.trouble:
        out[third : third + int(4 * rate)] = 0.0
    if "nan" in rig.trouble:
        out[2 * third : 2 * third + int(0.7 * rate)] = np.nan
    if "movement" in rig.trouble:
        m = int(1.5 * rate)
        sway = np.hanning(m) * 300 * np.sin(2 * np.pi * 3 * np.arange(m) / rate)
        out[third : third + m] += sway + 40 * np.hanning(m) * rng.standard_normal(m)
    if "saturation" in rig.trouble:
        rail = np.nanquantile(np.abs(out), 0.99)
        out = np.clip(out, -rail, rail)
    return out


def raw(truth: Truth, rig: Rig, rng: np.random.Generator, *, name: str = "PNA", role: str = "phrenic") -> Signal:
    """Return the nerve as a raw signal."""
    values = raw_values(truth, rig, rng)
    return as_signal(values, rig.rate_hz, name=name, role=role, integrated=False)


def integrated(truth: Truth, rig: Rig, rng: np.random.Generator, *, tau_s: float = 0.05, rate_hz: float = 1000.0,
               name: str = "PNA", role: str = "phrenic") -> Signal:
    """Return the raw nerve high-passed, rectified and integrated by a leaky integrator, at `rate_hz`."""
    fine = replace(rig, rate_hz=max(rig.rate_hz, 10000.0), trouble=tuple(
        w for w in rig.trouble if w in ("hum", "heart", "drift", "movement")))
    band = sps.butter(2, fine.band_hz[0], "high", fs=fine.rate_hz, output="sos")
    values = np.abs(sps.sosfilt(band, raw_values(truth, fine, rng)))
    keep = np.exp(-1 / (fine.rate_hz * tau_s))
    smooth = sps.lfilter([1 - keep], [1, -keep], values)
    step = round(fine.rate_hz / rate_hz)
    coarse = smooth[step - 1 :: step]
    late = tuple(w for w in rig.trouble if w in ("dead", "nan", "saturation"))
    coarse = broken(coarse, replace(rig, rate_hz=fine.rate_hz / step, trouble=late), rng)
    return as_signal(coarse, fine.rate_hz / step, name=name, role=role, integrated=True)


def drawn(truth: Truth, rig: Rig, rng: np.random.Generator, *, rate_hz: float = 100.0, smoothing_s: float = 0.0,
          name: str = "PNA", role: str = "phrenic") -> Signal:
    """Return the envelope itself with white noise added at `rate_hz` (an ideal, centred integrator)."""
    t = np.arange(int(truth.duration_s * rate_hz)) / rate_hz
    clean = np.interp(t, (np.arange(truth.envelope.size) + 0.5) / FINE_HZ, truth.envelope)
    values = clean * rig.snr / truth.burst_rms + rng.standard_normal(t.size)
    if "hum" in rig.trouble:
        values += 0.5 * np.sin(2 * np.pi * rig.hum_hz * t)
    if "drift" in rig.trouble:
        values += 0.3 * rig.snr * np.sin(2 * np.pi * t / t[-1])
    if smoothing_s:
        width = max(1, round(smoothing_s * rate_hz)) | 1
        values = np.convolve(values, np.ones(width) / width, mode="same")
    return as_signal(rig.scale * (values + 2.0), rate_hz, name=name, role=role, integrated=True)


def as_signal(values: FloatArray, rate_hz: float, *, name: str = "PNA", role: str = "phrenic",
              integrated: bool = False, start_s: float = 0.0, chunk_s: float = 10.0) -> Signal:
    """Return values in memory as a signal that starts at `start_s`."""
    reader = ArrayChunks(values, rate_hz, start_s, chunk_s)
    return Signal(name, role, "V", rate_hz, start_s, start_s + values.size / rate_hz, reader, integrated)
