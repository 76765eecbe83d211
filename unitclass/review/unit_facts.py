"""Numbers about units, cycles and populations that screens show and do not compute."""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence

import numpy as np

from unitclass.records import Cycles, Envelope, FloatArray, UnitResult

UNKNOWN = float("nan")


def mean_durations(cycles: Cycles) -> tuple[float, float]:
    """Return the mean TI and TE of the accepted cycles in seconds; NaN when there are none."""
    used = cycles.accepted & np.isfinite(cycles.ti_s) & np.isfinite(cycles.te_s)
    if not used.any():
        return UNKNOWN, UNKNOWN
    return float(cycles.ti_s[used].mean()), float(cycles.te_s[used].mean())


def picture_top(envelope: Envelope, threshold: float = UNKNOWN) -> float:
    """Return the value at which an envelope's picture ends: above all but the rarest samples."""
    known = envelope.values[np.isfinite(envelope.values)]
    top = float(np.quantile(known[:: max(1, known.size // 20000)], 0.999)) * 1.05 if known.size else UNKNOWN
    return max(top, 1.3 * threshold) if np.isfinite(threshold) else top


def by_phase(rates_hz: np.ndarray) -> list[int]:
    """Return the order of units by the phase of their greatest rate, `rates_hz` (n_units, n_bins).

    The rate is taken over three neighbouring bins, so that one stray bin does not decide.
    """
    if not rates_hz.size:
        return []
    known = np.nan_to_num(rates_hz)
    smooth = np.roll(known, 1, axis=1) + known + np.roll(known, -1, axis=1)
    return [int(i) for i in np.argsort(smooth.argmax(axis=1), kind="stable")]


def grouped(names: Sequence[str], order: Iterable[str]) -> Mapping[str, list[int]]:
    """Return the places of each name, names of `order` first, the others in the order of appearance."""
    groups: dict[str, list[int]] = {name: [] for name in order}
    for place, name in enumerate(names):
        groups.setdefault(name, []).append(place)
    return {name: places for name, places in groups.items() if places}


def facts(unit: UnitResult) -> tuple[tuple[str, str], ...]:
    """Return (name, value with unit) of what is known about a unit, for the full account."""
    f, m = unit.features, unit.modulation
    told = [
        ("cycles", f"{unit.n_cycles}"), ("spikes", f"{unit.n_spikes}"),
        ("onset, peak, offset", _phases(f.onset_phase, f.peak_phase, f.offset_phase)),
        ("rate in inspiration, expiration", _number(f.rate_i_hz, "", 1) + " / " + _number(f.rate_e_hz, "/s", 1)),
        ("rate in first, second half of expiration",
         _number(f.rate_e1_hz, "", 1) + " / " + _number(f.rate_e2_hz, "/s", 1)),
        ("peak rate", _number(f.peak_rate_hz, "/s", 1)), ("slope", _number(f.slope, "", 2)),
        ("decay", _number(f.decay_ms, "ms", 0)), ("lead over inspiration", _number(f.lead_ms, "ms", 0)),
        ("fires in cycles", _number(100 * f.participation, "%", 0)),
        ("depth of modulation", _number(m.depth, "", 2)),
        ("eta squared", _number(m.eta_squared, "", 2)), ("its p", _number(m.eta_squared_p, "", 4)),
        ("q", _number(unit.q_value, "", 4)), ("Rayleigh p", _number(m.rayleigh_p, "", 4)),
        ("halves agree, r", _number(f.split_half_r, "", 2)), ("drift", _number(100 * f.drift, "%", 0)),
        ("refractory violations", _number(100 * f.refractory_violations, "%", 2)),
        ("CV of intervals", _number(f.isi_cv, "", 2)), ("LV", _number(f.isi_lv, "", 2)),
        ("counts over Poisson", _number(f.overdispersion, "x", 1)),
        ("shape group", unit.shape_group)]
    if unit.vm is not None:
        told += [("resting Vm", _number(unit.vm.resting_mv, "mV", 1)),
                 ("Vm swing over the cycle", _number(unit.vm.swing_mv, "mV", 1))]
    told += [(str(name), str(value)) for name, value in unit.columns.items()]
    return tuple((name, value) for name, value in told if value and value != "-")


def _phases(*phases: float) -> str:
    return ", ".join(_number(phase, "", 2) for phase in phases) if np.isfinite(phases).any() else ""


def _number(value: float, unit: str, decimals: int) -> str:
    if not np.isfinite(value):
        return "-"
    text = f"{value:.{decimals}f}"
    if float(text) == 0 and value != 0:
        text = f"{value:.2g}"
    return f"{text} {unit}".strip() if unit not in ("/s",) else f"{text}/s"


def family_band(profiles: FloatArray) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Return the 5th, 50th and 95th percentile of a family's profiles, each profile's peak being 1.

    `profiles` has shape (n_draws, n_bins); the results have shape (n_bins,).
    """
    if not profiles.size:
        return np.zeros(0), np.zeros(0), np.zeros(0)
    scaled = profiles / np.maximum(profiles.max(axis=1, keepdims=True), 1e-12)
    low, middle, high = np.quantile(scaled, [0.05, 0.5, 0.95], axis=0)
    return low, middle, high
