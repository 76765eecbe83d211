"""From a nerve, raw or integrated, to its activity: streamed, decimated early, never delayed.

Two traces come of it. The *activity* is fine (about 500 Hz) and without lag: cycles are found on
it. The *envelope* is what the trade looks at, through the leaky integrator asked for; it lags by
its time constant and is for pictures, peaks and areas only.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, replace

import numpy as np

from unitclass.errors import SignalError
from unitclass.records import Envelope, FloatArray, Signal
from unitclass.settings import NerveSettings
from unitclass.signals.decimation import decimated
from unitclass.signals.frames import frames
from unitclass.signals.highpass import HighPass
from unitclass.signals.mains import HumFit, find_hum
from unitclass.signals.smoothing import boxcar, filled

GRID_HZ, LEAST_GRID_HZ = 500.0, 125.0
MOST_SAMPLES = 1_500_000  # 50 minutes at 500 Hz: longer stretches are kept coarser, so memory does not grow with them
ENVELOPE_HZ = 250.0
WARM_UP_S = 0.25
RECURSION = 64
SLOW_ROLES = ("pressure", "airflow", "co2", "pump", "ecg")  # no integrator stands before these


@dataclass(frozen=True)
class Activity:
    """Fine activity of one nerve without lag.

    Attributes
    ----------
    values : ndarray, shape (n_samples,)
        Amplitude in the nerve's unit; NaN in gaps. Sample i is centred on start_s + i / rate_hz.
    is_power : bool
        True when floor and burst add as powers (a rectified trace with a true zero), False when they
        add as they are.
    sign : int
        -1 when the trace was turned over.
    words : tuple of str
        How it was made.
    """

    name: str
    role: str
    unit: str
    start_s: float
    rate_hz: float
    values: FloatArray
    is_power: bool
    sign: int = 1
    words: tuple[str, ...] = ()

    @property
    def times_s(self) -> FloatArray:
        """Return the session time of every sample."""
        return self.start_s + np.arange(self.values.size) / self.rate_hz


def envelope(signal: Signal, settings: NerveSettings, *, start_s: float, stop_s: float) -> Envelope:
    """Return the integrated activity of a stretch, as the trade displays it.

    Parameters
    ----------
    signal : Signal
        Raw (band-passed, rectified, integrated) or integrated already (used as it is, turned
        over when its bursts point down).
    settings : NerveSettings
        Band, integrator and time constant.
    start_s, stop_s : float
        The stretch, session time.

    Returns
    -------
    Envelope
        At most about 250 samples a second; NaN in gaps.

    Raises
    ------
    SignalError
        When the stretch holds no sample, or none but NaN, or a constant.
    """
    return displayed(activity(signal, settings, start_s=start_s, stop_s=stop_s), settings, signal.is_integrated)


def activity(signal: Signal, settings: NerveSettings, *, start_s: float, stop_s: float) -> Activity:
    """Return the fine activity of a stretch; parameters and errors as for `envelope`."""
    start_s, stop_s = max(start_s, signal.start_s), min(stop_s, signal.stop_s)
    if not stop_s > start_s:
        raise SignalError(f"nerve {signal.name} covers {signal.start_s:.1f} to {signal.stop_s:.1f} s, nothing of "
                          "this stretch", remedy="name another nerve with --nerve")
    if not signal.is_integrated:
        return _checked(_rectified(signal, settings, start_s, stop_s))
    from unitclass.signals.unlag import without_lag
    from unitclass.signals.upright import upright

    made = _checked(_stored(signal, start_s, stop_s))
    return without_lag(upright(made), signal.description) if signal.role not in SLOW_ROLES else made


def grid_hz(stretch_s: float) -> float:
    """Return the rate at which the activity of a stretch is kept: 500 Hz, halved for hours."""
    rate_hz = GRID_HZ
    while rate_hz > LEAST_GRID_HZ and stretch_s * rate_hz > MOST_SAMPLES:
        rate_hz /= 2
    return rate_hz


def as_recorded(signal: Signal, *, start_s: float, stop_s: float) -> Activity:
    """Return a stretch as it was recorded, averaged down to about 500 Hz, neither filtered nor rectified.

    Raises
    ------
    SignalError
        When it holds no sample, or none but NaN, or a constant.
    """
    return _checked(_stored(signal, start_s, stop_s))


def displayed(fine: Activity, settings: NerveSettings, is_integrated: bool) -> Envelope:
    """Return the envelope of an activity: integrated when raw, as it is when integrated."""
    values, words = fine.values, "as recorded, no further smoothing"
    if not is_integrated:
        values, words = integrated(fine.values, fine.rate_hz, settings)
    step = max(1, int(fine.rate_hz // ENVELOPE_HZ))
    coarse, shift_s = averaged(values, step), (step - 1) / 2 / fine.rate_hz
    return Envelope(fine.name, fine.role, fine.unit, fine.start_s + shift_s, fine.rate_hz / step,
                    coarse.astype(np.float32), words)


def integrated(values: FloatArray, rate_hz: float, settings: NerveSettings) -> tuple[FloatArray, str]:
    """Return rectified activity through the integrator of the settings, and its name in words."""
    tau_s = settings.tau_ms / 1000
    if settings.smoother == "moving average":
        width = max(1, round(tau_s * rate_hz)) | 1
        return boxcar(values, width), f"centred moving average of {settings.tau_ms:.0f} ms"
    return leaky(values, rate_hz, tau_s), f"leaky integrator, time constant {settings.tau_ms:.0f} ms (lags)"


def leaky(values: FloatArray, rate_hz: float, tau_s: float) -> FloatArray:
    """Return `values` through a leaky integrator: a step reaches 63.2 % after one time constant.

    First order, exact for an input that is constant within a sample. NaN is bridged for the
    integrator and put back afterwards.
    """
    bridged = filled(values)
    keep = float(np.exp(-1.0 / (rate_hz * tau_s)))
    return np.where(np.isfinite(values), _recursed(bridged, keep), np.nan)


def _recursed(values: FloatArray, keep: float) -> FloatArray:
    """Return y[n] = keep y[n-1] + (1 - keep) x[n] from y[-1] = x[0], a block of samples at a time.

    The answer within a block is a product with a triangular matrix; only the blocks' last
    values follow one from another.
    """
    n_blocks = -(-values.size // RECURSION)
    padded = np.concatenate([values, np.full(n_blocks * RECURSION - values.size, values[-1])])
    powers = keep ** np.arange(RECURSION)
    ages = np.arange(RECURSION)[:, None] - np.arange(RECURSION)[None, :]
    within = np.where(ages >= 0, (1 - keep) * powers[np.maximum(ages, 0)], 0.0)
    alone = padded.reshape(n_blocks, RECURSION) @ within.T
    carried = np.empty(n_blocks)
    state, share = float(values[0]), float(keep**RECURSION)
    for i, end in enumerate(alone[:, -1].tolist()):
        carried[i] = state
        state = share * state + end
    return (alone + carried[:, None] * (keep * powers)).ravel()[: values.size]


# ------------------------------------------------------------------------------------- raw

def _rectified(signal: Signal, settings: NerveSettings, start_s: float, stop_s: float) -> Activity:
    low_hz, high_hz = _band(signal.rate_hz, settings)
    coarse = decimated(signal, high_hz)
    block = max(1, round(coarse.rate_hz / grid_hz(stop_s - start_s)))
    warm_up = int(min(WARM_UP_S, start_s - signal.start_s) * coarse.rate_hz / block)
    from_s = start_s - warm_up * block / coarse.rate_hz
    hum = find_hum(coarse, start_s=start_s, stop_s=stop_s, low_hz=low_hz, high_hz=0.45 * coarse.rate_hz)
    high_pass = HighPass(low_hz, coarse.rate_hz)
    origin_s, parts = start_s, []
    for origin_s, values in _filtered(coarse, from_s, stop_s, block, high_pass, HumFit(hum, coarse.rate_hz)):  # noqa: B007
        parts.append(averaged(values, block).astype(np.float32))
    values = np.concatenate(parts).astype(float)[warm_up:] if parts else np.empty(0)
    words = (f"raw at {signal.rate_hz:g} Hz ({signal.form_reason or 'as given'}): band-passed {low_hz:g} to "
             f"{high_hz:g} Hz, rectified", hum.words)
    first_s = origin_s + (warm_up * block + (block - 1) / 2 - high_pass.delay) / coarse.rate_hz
    return Activity(signal.name, signal.role, signal.unit, first_s, coarse.rate_hz / block, values,
                    is_power=True, words=tuple(w for w in words if w))


def _band(rate_hz: float, settings: NerveSettings) -> tuple[float, float]:
    high_hz = min(settings.high_cut_hz, 0.45 * rate_hz)
    return min(settings.low_cut_hz, 0.3 * high_hz), high_hz


def _filtered(signal: Signal, start_s: float, stop_s: float, block: int, high_pass: HighPass,
              hum: HumFit) -> Iterator[tuple[float, FloatArray]]:
    """Yield the rectified band-passed trace frame by frame, NaN where the recording has none."""
    base, last = np.nan, np.nan
    for frame in frames(signal, start_s=start_s, stop_s=stop_s, multiple=block):
        values, missing = frame.values, np.isnan(frame.values)
        if missing.any():
            values = _held(values, missing, last)
        if np.isnan(base):
            base = values[0]
        last = values[-1]
        values = values - base
        hum.subtract(values)
        values = np.abs(high_pass.filtered(values))
        if missing.any():
            values[missing] = np.nan
        yield frame.origin_s, values


def _held(values: FloatArray, missing: np.ndarray, last: float) -> FloatArray:
    """Return values with NaN replaced by the last sample before (no step for the filter to ring on)."""
    at = np.where(missing, -1, np.arange(values.size))
    at = np.maximum.accumulate(at)
    start = values[~missing][0] if np.isnan(last) and (~missing).any() else (0.0 if np.isnan(last) else last)
    return np.where(at < 0, start, values[np.maximum(at, 0)])


# ------------------------------------------------------------------------------ integrated

def _stored(signal: Signal, start_s: float, stop_s: float) -> Activity:
    block = max(1, round(signal.rate_hz / grid_hz(stop_s - start_s)))
    origin_s, parts = start_s, []
    for frame in frames(signal, start_s=start_s, stop_s=stop_s, multiple=block):
        origin_s = frame.origin_s
        parts.append(averaged(frame.values, block))
    values = np.concatenate(parts) if parts else np.empty(0)
    words = f"integrated already ({signal.form_reason or 'as given'}): used as it is"
    return Activity(signal.name, signal.role, signal.unit, origin_s + (block - 1) / 2 / signal.rate_hz,
                    signal.rate_hz / block, values, is_power=False, words=(words,))


# ---------------------------------------------------------------------------------- shared

def averaged(values: FloatArray, block: int) -> FloatArray:
    """Return means over consecutive blocks; NaN where more than half of a block is missing."""
    if block == 1:
        return np.asarray(values, dtype=float)
    n = values.size // block
    cut = values[: n * block].reshape(n, block)
    means = cut.mean(axis=1)
    bad = np.flatnonzero(np.isnan(means))
    if bad.size:
        present = np.isfinite(cut[bad])
        count = present.sum(axis=1)
        total = np.where(present, cut[bad], 0.0).sum(axis=1)
        means[bad] = np.where(count * 2 > block, total / np.maximum(count, 1), np.nan)
    return np.asarray(means)


def _checked(made: Activity) -> Activity:
    finite = made.values[np.isfinite(made.values)]
    if not made.values.size:
        raise SignalError(f"nerve {made.name} holds no sample in this stretch",
                          remedy="name another nerve with --nerve")
    if not finite.size:
        raise SignalError(f"nerve {made.name} is all NaN in this stretch", remedy="name another nerve with --nerve")
    if not np.ptp(finite) > 1e-9 * float(np.abs(finite).max()):
        raise SignalError(f"nerve {made.name} is constant in this stretch: nothing was recorded",
                          remedy="name another nerve with --nerve")
    return replace(made, values=made.values)
