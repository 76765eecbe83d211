"""Whether a signal is raw or integrated already, and on what grounds."""

from __future__ import annotations

import re
from collections.abc import Sequence
from typing import Any

import numpy as np
from numpy.typing import NDArray

LOW_RATE_HZ = 500.0
_SLOW_ROLES = ("pressure", "airflow", "co2", "pump", "stimulus")
_NOT = r"(?<!non-)(?<!non )(?<!not )(?<!un)(?<!un-)(?<!before being )"
_INTEGRATED = re.compile(_NOT + r"\b(?:integrated|envelope|smoothed|rectified|integral|moving average|rms|leaky)\b"
                         r"|\u222b", re.I)
_INTEGRATED_TOKEN = re.compile(r"(?:^|[_\W\d])(?:int|integ|env|rect|smooth|rms|ma)(?=$|[_\W\d])|"
                               r"(?<=[a-z])(?:Int|Env|Integ)(?![a-z])|^int(?=[A-Z])|^i(?=[A-Z]{2})|"
                               r"(?<=[A-Z])int(?![a-z])|(?:^|[_\W])(?:INT|ENV|RMS|MA)(?=$|[_\W\d])")
_RAW = re.compile(r"(?:\b|(?<=[A-Z]))raw\b|\b(?:unfiltered|non-?integrated|not integrated|unintegrated|wide[- ]?band|"
                  r"band[- ]?pass(?:ed)?)\b", re.I)
_SMOOTH_SHARE = 0.15
_SKEW = 1.5


def form_of(name: str, description: str, role: str, rate_hz: float,
            samples: Sequence[NDArray[Any]]) -> tuple[bool, str]:
    """Return (is integrated, why).

    Parameters
    ----------
    name, description : str
        Words are believed first: "raw", "integrated", "rectified", "moving average" and the like.
    role : str
        Pressures, flows and the like are used as they are.
    rate_hz : float
        Under 500 Hz no raw nerve survives, whatever the words.
    samples : sequence of ndarray, shape (n_samples,)
        Stretches of the signal from several places; a smooth, one-signed trace is an envelope.
    """
    if role in _SLOW_ROLES:
        return True, "a slow signal, used as it is"
    if rate_hz < LOW_RATE_HZ:
        return True, f"integrated: {rate_hz:g} Hz is too slow for a raw nerve"
    for words, whose in ((re.sub(r"_+", " ", name), "name"), (description, "description")):
        said = _said(words, name if whose == "name" else "")
        if said:
            return said[0], f"{'integrated' if said[0] else 'raw'}: its {whose} says {said[1]!r}"
    return _by_samples(samples, rate_hz)


def _said(words: str, name: str) -> tuple[bool, str] | None:
    raw = _RAW.search(words)
    if raw:
        return False, raw.group(0).strip()
    integrated = _INTEGRATED.search(words) or (_INTEGRATED_TOKEN.search(name) if name else None)
    return (True, integrated.group(0).strip("_ ")) if integrated else None


def _by_samples(samples: Sequence[NDArray[Any]], rate_hz: float) -> tuple[bool, str]:
    parts = [s[np.isfinite(s)].astype(float) for s in samples]
    parts = [p for p in parts if p.size >= 16]
    if not parts or max(np.ptp(p) for p in parts) == 0:
        return False, f"raw: sampled at {rate_hz:g} Hz, and the samples looked at are constant"
    whole = np.concatenate(parts)
    low, middle, high = np.percentile(whole, [1, 50, 99])
    if _is_one_signed(low, high):
        return True, "integrated: its values have one sign and start near zero"
    if roughness(parts, rate_hz) < _SMOOTH_SHARE and high - middle > _SKEW * (middle - low):
        return True, "integrated: smooth, with peaks to one side"
    return False, f"raw: sampled at {rate_hz:g} Hz, with fast swings to both sides"


def _is_one_signed(low: float, high: float) -> bool:
    """Tell whether values stay on one side of zero and come near it (a raw trace on an offset does not)."""
    near, far = sorted((abs(low), abs(high)))
    return (low >= 0 or high <= 0) and near < 0.25 * far


def roughness(parts: Sequence[NDArray[Any]], rate_hz: float) -> float:
    """Return the spread left after a 5 ms running mean is taken off, over the whole spread."""
    width = max(3, round(0.005 * rate_hz))
    fast = total = 0.0
    for part in parts:
        if part.size <= width:
            continue
        running = np.convolve(part, np.full(width, 1.0 / width), mode="valid")
        middle = part[width // 2 : width // 2 + running.size]
        fast += float(np.square(middle - running).sum())
        total += float(np.square(middle - part.mean()).sum())
    return float(np.sqrt(fast / total)) if total > 0 else 1.0
