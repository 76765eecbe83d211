"""Rate profiles of the forms, evaluated for many parameter draws at once.

Every function takes a dict of parameters, each of shape (n_draws, 1), and the phase grid of
shape (n_fine,), and returns levels relative to the peak, shape (n_draws, n_fine).
"""

from __future__ import annotations

from collections.abc import Callable, Mapping

import numpy as np

from unitclass.records import FloatArray

STEPS, SHADOWS = 0.2, 0.35  # shares of the draws of a steady cell
LEANS = 0.3  # windows that lean less are plateaus
LEAST_GAP = 0.1  # phase between two humps, without which they are one plateau

Parameters = Mapping[str, FloatArray]


def window(p: Parameters, phase: FloatArray) -> FloatArray:
    """Return one active window: rise to the peak, fall from it, an optional foot.

    The foot is weak firing before the window: how a pre-I cell starts. Works on the unwrapped
    phase; turns that the window reaches into are laid over each other.
    """
    reach = 3.0 * float(p["edge_ms"].max()) / 1e3 / min(float(p["ti_s"][0, 0]), float(p["te_s"][0, 0]))
    level = _hump(p, phase)
    if min(float(p["onset"].min()), float(p["foot_onset"].min()) if p["foot"].any() else 2.0) < reach:
        level = np.maximum(level, _hump(p, phase - 2.0))
    if float(p["offset"].max()) > 2.0 - reach:
        level = np.maximum(level, _hump(p, phase + 2.0))
    return level


def _hump(p: Parameters, phase: FloatArray) -> FloatArray:
    onset = np.minimum(p["onset"], p["offset"] - 0.04)
    peak = np.clip(p["peak"], onset, p["offset"])
    body = _rise_and_fall(phase, onset, peak, p["offset"], p["start_level"], p["end_level"],
                          p["curve_up"], p["curve_down"])
    body = body * _gate(p, phase, onset, p["offset"])
    if p["foot"].any():
        body = body + _foot(p, phase, onset)
    return body


def _foot(p: Parameters, phase: FloatArray, onset: FloatArray) -> FloatArray:
    foot_onset = np.minimum(p["foot_onset"], onset - 0.01)
    foot = p["foot"] * _ramp(phase, foot_onset, onset) * _gate(p, phase, foot_onset, onset)
    return foot * (1 - _gate(p, phase, onset, onset + 9.0))


def _rise_and_fall(phase: FloatArray, onset: FloatArray, peak: FloatArray, offset: FloatArray,
                   start: FloatArray, end: FloatArray, up: FloatArray, down: FloatArray) -> FloatArray:
    rising = np.clip((phase - onset) / np.maximum(peak - onset, 1e-3), 0.0, 1.0)
    falling = np.clip((offset - phase) / np.maximum(offset - peak, 1e-3), 0.0, 1.0)
    return np.where(phase < peak, start + (1 - start) * rising**up, end + (1 - end) * falling**down)


def _ramp(phase: FloatArray, low: FloatArray, high: FloatArray) -> FloatArray:
    return np.clip((phase - low) / np.maximum(high - low, 1e-3), 0.0, 1.0)


def _gate(p: Parameters, phase: FloatArray, onset: FloatArray, offset: FloatArray) -> FloatArray:
    """Return a window with soft edges: jitter from cycle to cycle, in seconds, blurs every transition."""
    now_s, edge_s = _local_s(p, phase), p["edge_ms"] / 1e3
    opening = np.clip((now_s - _local_s(p, onset)) / edge_s + 0.5, 0.0, 1.0)
    closing = np.clip((_local_s(p, offset) - now_s) / edge_s + 0.5, 0.0, 1.0)
    return opening * closing


def _local_s(p: Parameters, phase: FloatArray) -> FloatArray:
    """Return seconds from the onset of inspiration, for unwrapped phase."""
    ti_s, te_s = float(p["ti_s"][0, 0]), float(p["te_s"][0, 0])  # one rhythm for all draws
    turn = np.floor(phase / 2.0)
    within = phase - 2.0 * turn
    return turn * (ti_s + te_s) + np.where(within < 1.0, within * ti_s, ti_s + (within - 1.0) * te_s)


def two_humps(p: Parameters, phase: FloatArray) -> FloatArray:
    """Return two windows with a dip between: firing before and after inspiration, silent in it."""
    first = window(p, phase)
    second = dict(p)
    second.update(onset=np.maximum(p["second_onset"], p["offset"] + LEAST_GAP), offset=p["second_offset"],
                  peak=p["second_offset"], start_level=p["second_start"], end_level=np.ones_like(p["edge_ms"]),
                  foot=0 * p["foot"])
    between = p["dip"] * _gate(p, phase, p["onset"], p["second_offset"])
    return np.maximum.reduce([p["first_level"] * first, p["second_level"] * window(second, phase), between])


def cosine(p: Parameters, phase: FloatArray) -> FloatArray:
    """Return steady firing that waxes and wanes, or steps between inspiration and expiration.

    `depth` is (max - min)/(max + min). A fifth of the draws step at the transitions themselves,
    a third follow one phasic input, excitatory or inhibitory: steady but for one window.
    """
    is_step, is_shadow = p["step"] < STEPS, (p["step"] >= STEPS) & (p["step"] < STEPS + SHADOWS)
    at = np.where(is_step, np.where(p["at"] < 1.0, 0.5, 1.5), p["at"])
    angle = np.pi * (phase - at)
    wave = np.cos(angle) + p["harmonic"] * np.cos(2 * angle + np.pi * at)
    mixed = np.where(is_step, np.tanh(15.0 * np.cos(angle)), np.where(is_shadow, _shadow(p, phase), wave))
    mixed = mixed / np.max(np.abs(mixed), axis=1, keepdims=True)
    return (1 + p["depth"] * mixed) / (1 + p["depth"])


def _shadow(p: Parameters, phase: FloatArray) -> FloatArray:
    """Return -1 with one window that reaches 1, or the other way round.

    The window begins at a transition and decrements, ends at one and augments, or lies anywhere,
    as the inputs from other neurons of the rhythm do.
    """
    span, lean = p["span"], p["lean"]
    transition = np.where(p["at"] < 1.0, 1.0, 2.0)
    onset = np.where(lean < -LEANS, transition, np.where(lean > LEANS, transition - span, p["at"]))
    within = ((phase - onset) % 2.0) / span
    slope = np.where(np.abs(lean) > LEANS, lean, 0.0)
    body = 1.0 - np.abs(slope) * np.where(slope > 0, 1.0 - within, within)
    level = 2.0 * np.where(within <= 1.0, body, 0.0) - 1.0
    return np.where(p["step"] < STEPS + SHADOWS / 2, level, -level)


def flat(p: Parameters, phase: FloatArray) -> FloatArray:
    """Return steady firing with no more modulation than `depth`."""
    return (1 + p["depth"] * np.cos(np.pi * (phase - p["at"]))) / (1 + p["depth"])


FORM_SHAPES: Mapping[str, Callable[[Parameters, FloatArray], FloatArray]] = {
    "augmenting": window, "decrementing": window, "plateau": window, "spanning": window,
    "two humps": two_humps, "cosine": cosine, "flat": flat,
}
