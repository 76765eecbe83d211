"""How an integrated recording was smoothed, read off the noise of its floor.

A leaky integrator turns the rectified noise of the floor into noise whose correlation decays
exponentially with the integrator's own time constant; a centred average leaves another trace. So
the time constant need not be known: it is read from the variogram of the floor,
γ(h) = n + s² (1 − exp(−h/τ)), n being noise added after the integrator.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from unitclass.records import BoolArray, FloatArray
from unitclass.signals.smoothing import smooth, widened

TAU_S = (0.008, 0.4)
MIN_PAIRS = 400
SMOOTH_S = 0.1
CLEAR_S = (0.4, 0.25, 0.15)
"""Kept clear of bursts on either side, the longest that leaves enough: a burst's own decay is no noise."""
ENOUGH_S = 8.0
MIN_SHARE = 0.5
"""The correlated share of the floor's noise that makes an integrator worth believing in."""


@dataclass(frozen=True)
class Variogram:
    """Half the mean squared difference of the floor at each lag, shape (n_lags,)."""

    lag_s: FloatArray
    gamma: FloatArray


def quiet_floor(values: FloatArray, rate_hz: float) -> BoolArray:
    """Return where a trace lies on its floor, well after and before any burst, shape (n_samples,)."""
    trace = smooth(values, SMOOTH_S * rate_hz)
    finite = trace[np.isfinite(trace)]
    floor, top = np.quantile(finite, [0.1, 0.98])
    with np.errstate(invalid="ignore"):
        loud = ~(trace < floor + 0.2 * (top - floor))
    quiet = ~loud
    for clear_s in CLEAR_S:
        quiet = ~widened(loud, round(clear_s * rate_hz))
        if quiet.sum() >= ENOUGH_S * rate_hz:
            break
    return quiet


def variogram(values: FloatArray, quiet: BoolArray, rate_hz: float, *, longest_s: float) -> Variogram:
    """Return the variogram of `values` where `quiet`, both shape (n_samples,); lags are even-spaced."""
    longest = max(2, round(longest_s * rate_hz))
    lags = np.unique(np.round(np.linspace(1, longest, min(longest, 60))).astype(int))
    gamma = np.full(lags.size, np.nan)
    masked = np.where(quiet & np.isfinite(values), values, np.nan)
    for i, k in enumerate(lags):
        step = masked[k:] - masked[:-k]
        step = step[np.isfinite(step)]
        if step.size >= MIN_PAIRS:
            gamma[i] = 0.5 * _robust_power(step)
    known = np.isfinite(gamma)
    return Variogram(lags[known] / rate_hz, gamma[known])


def _robust_power(values: FloatArray) -> float:
    """Return the mean square without its largest twentieth (artefacts), scaled back for a Gaussian."""
    power = values**2
    return float(np.mean(power[power <= np.quantile(power, 0.95)])) / 0.759


def _averaged_rise(lag_s: FloatArray, tau_s: float, width_s: float) -> FloatArray:
    """Return the variogram of leakily integrated noise after a moving average of `width_s`, variance 1 before it."""
    def covariance(h: FloatArray) -> FloatArray:
        gap = np.maximum(width_s - h, 0.0)
        far = np.exp(-(h + width_s) / tau_s) + np.exp(-np.abs(h - width_s) / tau_s) - 2 * np.exp(-h / tau_s)
        return (tau_s / width_s) ** 2 * (2 * gap / tau_s + far)

    return np.asarray(covariance(np.zeros(1)) - covariance(lag_s))


def integrator_tau_s(found: Variogram, averaged_s: float = 0.0) -> float:
    """Return the time constant of a leaky integrator, or NaN where the noise does not speak of one.

    `averaged_s` is the moving average that the trace went through since, s.

    The exponential must explain the variogram better than a moving average (a straight rise to a
    corner) and than a smooth bell-shaped kernel (a parabola at the start). In a short recording
    these can come near; an exponential that fits closely is then believed, because most
    integrators are leaky (common practice) and other kernels miss it by far.
    """
    if found.lag_s.size < 6:
        return np.nan
    rise = (lambda h, tau: _averaged_rise(h, tau, averaged_s)) if averaged_s else (lambda h, tau: 1 - np.exp(-h / tau))
    tau, error, share = _best(found, rise)
    _, corner, _ = _best(found, lambda h, width: np.minimum(h / (2 * width), 1))
    _, bell, _ = _best(found, lambda h, width: 1 - np.exp(-((h / (1.5 * width)) ** 2)))
    total = float(np.sum((found.gamma - found.gamma.mean()) ** 2))
    is_best = error < 0.1 * total and error < 0.8 * min(corner, bell)
    is_close = error < 0.03 * total and error < 2 * corner and error < 3 * bell
    convincing = share > MIN_SHARE and (is_best or is_close)
    at_limit = tau <= TAU_S[0] * 1.05 or tau >= TAU_S[1] * 0.95
    return tau if convincing and not at_limit else np.nan


def _best(found: Variogram, model: Callable[[FloatArray, float], FloatArray]) -> tuple[float, float, float]:
    """Return the best time constant, its squared error and the correlated share of the variance."""
    best = (np.nan, np.inf, 0.0)
    for tau in np.geomspace(*TAU_S, 120):
        rise = model(found.lag_s, tau)
        design = np.column_stack([rise, np.ones_like(rise)])
        solved, *_ = np.linalg.lstsq(design, found.gamma, rcond=None)
        sill, nugget = max(solved[0], 0.0), solved[1]
        if nugget < 0:
            nugget, sill = 0.0, max(float(rise @ found.gamma / max(float(rise @ rise), 1e-300)), 0.0)
        error = float(np.sum((found.gamma - sill * rise - nugget) ** 2))
        if error < best[1]:
            best = (float(tau), error, sill / max(sill + nugget, 1e-300))
    return best
