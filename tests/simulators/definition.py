"""What each type's name promises of a cell's own histogram, in numbers a colleague would accept.

Used to throw out simulated cells that came out as something else than was meant. It is a wide net:
only what contradicts the words of domain.md is refused.
"""

from __future__ import annotations

from collections.abc import Callable

import numpy as np

from unitclass.records import NOT_MODULATED, OTHER, Cycles, FloatArray

N = 20


def clean_profile(train: FloatArray, cycles: Cycles) -> FloatArray:
    """Return spikes/s in N bins of inspiration and N of expiration, lightly smoothed, shape (2 N,)."""
    k = np.searchsorted(cycles.onset_s, train, side="right") - 1
    inside = (k >= 0) & (train < cycles.end_s[-1])
    t, k = train[inside], k[inside]
    in_i = t < cycles.offset_s[k]
    x = np.where(in_i, (t - cycles.onset_s[k]) / cycles.ti_s[k], 1 + (t - cycles.offset_s[k]) / cycles.te_s[k])
    counts = np.bincount(np.clip((x * N).astype(int), 0, 2 * N - 1), minlength=2 * N)
    seconds = np.repeat([cycles.ti_s.sum() / N, cycles.te_s.sum() / N], N)
    return _smoothed(counts / seconds)


def agrees(name: str, profile: FloatArray) -> bool:
    """Tell whether a clean profile, shape (2 N,), is what the type's name promises."""
    top = profile.max()
    if top <= 0:
        return False
    p = profile / top
    return bool(_PROMISES[name](p[:N], p[N:]))


def _smoothed(rate: FloatArray) -> FloatArray:
    """Average each bin with its neighbours within the same phase."""
    out = []
    for half in (rate[:N], rate[N:]):
        padded = np.concatenate([half[:1], half, half[-1:]])
        out.append((padded[:-2] + padded[1:-1] + padded[2:]) / 3)
    return np.concatenate(out)


def _part(half: FloatArray, start: float, stop: float) -> float:
    """Return the mean over a fraction of a phase."""
    return float(half[round(start * N):round(stop * N)].mean())


def _pre_i(i: FloatArray, e: FloatArray) -> bool:
    late = _part(e, 0.9, 1)
    return late > 0.12 and _part(e, 0.1, 0.6) < 0.35 * late and _part(i, 0.1, 0.8) > 0.25


def _early_i(i: FloatArray, e: FloatArray) -> bool:
    return (i.argmax() < 0.3 * N and _part(i, 0.8, 1) < 0.6 * _part(i, 0.05, 0.3) and e[2:].max() < 0.2
            and _part(e, 0.9, 1) < 0.10)


def _ramp_i(i: FloatArray, e: FloatArray) -> bool:
    return _part(i, 0.7, 0.95) > 1.6 * _part(i, 0.05, 0.35) and _part(i, 0.25, 0.5) > 0.12 and e[2:].max() < 0.2


def _late_i(i: FloatArray, e: FloatArray) -> bool:
    return _part(i, 0, 0.5) < 0.08 and _part(i, 0.75, 1) > 0.4 and e[2:].max() < 0.2


def _con_i(i: FloatArray, e: FloatArray) -> bool:
    return 0.72 < _part(i, 0.1, 0.4) / max(_part(i, 0.6, 0.9), 1e-9) < 1.38 and e[2:].max() < 0.2 and _part(
        i, 0.1, 0.25) > 0.5


def _i_e(i: FloatArray, e: FloatArray) -> bool:
    return (_part(i, 0.85, 1) > 0.3 and _part(e, 0, 0.1) > 0.3 and _part(i, 0, 0.4) < 0.12
            and _part(e, 0.5, 1) < 0.08)


def _post_i(i: FloatArray, e: FloatArray) -> bool:
    return i.max() < 0.2 and e.argmax() < 0.25 * N and _part(e, 0.67, 1) < 0.10 and _part(e, 0, 0.25) > 0.3


def _aug_e(i: FloatArray, e: FloatArray) -> bool:
    return (i[1:].max() < 0.25 and _part(e, 0.8, 0.98) > 1.3 * _part(e, 0.4, 0.6) and _part(e, 0.5, 0.75) > 0.15
            and _part(e, 0, 0.15) < 0.25)


def _late_e(i: FloatArray, e: FloatArray) -> bool:
    return i[1:].max() < 0.25 and _part(e, 0, 0.7) < 0.06 and _part(e, 0.85, 1) > 0.3


def _con_e(i: FloatArray, e: FloatArray) -> bool:
    return (i[1:].max() < 0.3 and 0.75 < _part(e, 0.1, 0.4) / max(_part(e, 0.6, 0.9), 1e-9) < 1.33
            and _part(e, 0.08, 0.2) > 0.5)


def _dec_e(i: FloatArray, e: FloatArray) -> bool:
    return (i[1:].max() < 0.25 and e.argmax() < 0.3 * N and 0.08 < _part(e, 0.8, 1) < 0.65
            and _part(e, 0, 0.4) > 1.35 * _part(e, 0.6, 1) and _part(e, 0.4, 0.6) > 0.2)


def _bi_e(i: FloatArray, e: FloatArray) -> bool:
    return (min(_part(e, 0, 0.1), _part(e, 0.9, 1)) > 0.25 and _part(e, 0.4, 0.6) < 0.15
            and _part(i, 0.1, 0.9) < 0.15)


def _tonic(i: FloatArray, e: FloatArray) -> bool:
    low = min(i.min(), e.min())
    return bool(low > 0.28 and min(_part(i, 0, 1), _part(e, 0, 1), low) < 0.65)


def _anything(i: FloatArray, e: FloatArray) -> bool:
    return True


_PROMISES: dict[str, Callable[[FloatArray, FloatArray], bool]] = {
    "pre-I": _pre_i, "early-I": _early_i, "ramp-I": _ramp_i, "late-I": _late_i, "con-I": _con_i,
    "I-E": _i_e, "post-I": _post_i, "aug-E": _aug_e, "con-E": _con_e, "late-E": _late_e, "dec-E": _dec_e, "bi-E": _bi_e,
    "tonic": _tonic, NOT_MODULATED: _anything, OTHER: _anything,
}
