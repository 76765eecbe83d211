"""Taking the lag of a leaky integrator out of a neurogram that was integrated by hardware.

A leaky integrator delays the end of a ramp by about twice its time constant. What it did can be
undone exactly when the time constant is known: from the file's own words, from the noise of
the floor, or from the falls, since after an abrupt end no integrated trace can fall faster than its integrator
lets it.
"""

from __future__ import annotations

import re
from dataclasses import dataclass, replace

import numpy as np

from unitclass.records import FloatArray
from unitclass.signals.neurogram import Activity
from unitclass.signals.rectified import is_rectified
from unitclass.signals.smoothing import boxcar
from unitclass.signals.variogram import integrator_tau_s, quiet_floor, variogram

_STATED = re.compile(r"(?:time[ -]?constants?|tau|τ|TC)\D{0,12}(\d+(?:\.\d+)?)\s*(ms|s)\b|"
                     r"(\d+(?:\.\d+)?)\s*(ms|s)\b\W{0,3}(?:time[ -]?constant|tau|τ)", re.I)
_CENTRED = re.compile(r"moving[ -]average|centred|centered|zero[ -]phase|gaussian|filtfilt|boxcar|savitzky", re.I)
SHORTEST_S, LONGEST_S = 0.015, 0.15  # time constants in use: common practice
STEP_S = 0.02  # over which a fall is measured
BANDS = (((0.55, 2.0), (0.15, 0.4), 1.35), ((0.2, 0.3), (0.1, 0.2), 1.1))
"""Levels, as shares of the top, between which falls are compared, and the ratio of their rates within
which they are an exponential's: whole bursts, then what is smaller (bursts that end low, heart beats)."""
VARIOGRAM_S = 0.25
RIPPLE_S = 0.02  # a mains period: ripple of the rectified hum averages out
DRIFT_S = 3.0
LEAST = 20  # samples of fall to judge by


@dataclass(frozen=True)
class Lag:
    """Time constant of the integrator, 0 when none was found, and why."""

    tau_s: float
    words: str


def without_lag(made: Activity, description: str) -> Activity:
    """Return the activity with its integrator undone, where one is stated or seen.

    Parameters
    ----------
    made : Activity
        As recorded, integrated.
    description : str
        The file's words about the signal.
    """
    lag = stated_lag(description) or heard_lag(made, description) or seen_lag(made.values, made.rate_hz, description)
    if lag.tau_s * made.rate_hz < 0.5:
        return replace(made, is_power=is_rectified(made.values, made.rate_hz),
                       words=(*made.words, *((lag.words,) if lag.words else ())))
    keep = float(np.exp(-1.0 / (made.rate_hz * lag.tau_s)))
    before = np.concatenate([made.values[:1], made.values[:-1]])
    undone = (made.values - keep * before) / (1 - keep)
    # Each value is now the mean of the input since the sample before, hence half a sample earlier.
    return replace(made, values=undone, start_s=made.start_s - 0.5 / made.rate_hz,
                   is_power=is_rectified(made.values, made.rate_hz), words=(*made.words, lag.words))


def stated_lag(description: str) -> Lag | None:
    """Return the time constant that the file's words give, or None."""
    found = _STATED.search(description)
    if not found or _CENTRED.search(description):
        return None
    number, unit = (found.group(1), found.group(2)) if found.group(1) else (found.group(3), found.group(4))
    tau_s = float(number) / (1e3 if unit.lower() == "ms" else 1.0)
    if not 0.001 <= tau_s <= 1.0:
        return None
    return Lag(tau_s, f"integrator with a time constant of {1e3 * tau_s:.0f} ms, as the file says: its lag is undone")


def heard_lag(made: Activity, description: str = "") -> Lag | None:
    """Return the time constant that the noise of the floor shows, or None."""
    if _CENTRED.search(description):
        return None
    quiet = quiet_floor(made.values, made.rate_hz)
    steady = boxcar(made.values, round(RIPPLE_S * made.rate_hz))
    slow = boxcar(np.where(quiet, steady, np.nan), round(DRIFT_S * made.rate_hz))
    width = round(RIPPLE_S * made.rate_hz)
    tau_s = integrator_tau_s(variogram(steady - slow, quiet, made.rate_hz, longest_s=VARIOGRAM_S),
                             averaged_s=width / made.rate_hz if width > 1 else 0.0)
    if not SHORTEST_S <= tau_s <= LONGEST_S:
        return None
    return Lag(tau_s, f"the floor's noise is that of a leaky integrator with a time constant of {1e3 * tau_s:.0f} ms: "
                      "its lag is undone")


def seen_lag(values: FloatArray, rate_hz: float, description: str = "") -> Lag:
    """Return the time constant that the falls of the trace show.

    The fastest falls of a leaky integrator are exponential, all with its own time constant. Falls
    that are too slow, too fast or too various show none.
    """
    if _CENTRED.search(description):
        return Lag(0.0, "")
    level, rates = _fall_rates(values, rate_hz)
    for (high_from, high_to), (low_from, low_to), steady in BANDS:
        high = rates[(level > high_from) & (level < high_to)]
        low = rates[(level > low_from) & (level < low_to)]
        if min(high.size, low.size) < LEAST:
            continue
        fast_high, fast_low = _fastest(high), _fastest(low)
        tau_s = 2.0 / (fast_high + fast_low)
        # A straight or a steep fall is slower, by its level, high up than low down; an exponential is not.
        if SHORTEST_S <= tau_s <= LONGEST_S and 1 / steady <= fast_low / fast_high <= steady:
            return Lag(tau_s, "falls like a leaky integrator with a time constant of "
                              f"{1e3 * tau_s:.0f} ms: its lag is undone")
    return Lag(0.0, "")


def _fastest(rates: FloatArray) -> float:
    """Return the rate shared by the fastest falls, which nothing but the integrator holds up."""
    return float(np.median(rates[rates > 0.6 * np.quantile(rates, 0.9)]))


def _fall_rates(values: FloatArray, rate_hz: float) -> tuple[FloatArray, FloatArray]:
    """Return the level of every fall (0 floor, 1 top) and its rate, 1/s."""
    finite = values[np.isfinite(values)]
    floor, top = np.quantile(finite, [0.1, 0.98])
    step = max(1, round(STEP_S * rate_hz))
    height = (values - floor) / (top - floor + 1e-300)
    now, later = height[:-step], height[step:]
    with np.errstate(invalid="ignore"):
        falling = (now > 0.15) & (later > 0.06) & (later < 0.93 * now)
    rate = np.log(now[falling] / later[falling]) * rate_hz / step
    return np.sqrt(now[falling] * later[falling]), rate
