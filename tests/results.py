"""Small complete results with known content, for tests of everything after the analysis.

`session_result()` is one session, two conditions, five units of plainly different kinds. Nothing
here is computed by the program: the numbers follow from the shapes below.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import replace

import numpy as np

from unitclass.records import (
    SILENT,
    UNDETERMINED,
    Condition,
    ConditionResult,
    Cycles,
    Envelope,
    Features,
    FloatArray,
    Label,
    LockedHistogram,
    Modulation,
    NerveCycles,
    NerveProfile,
    PhaseHistogram,
    Raster,
    RhythmEvidence,
    SessionResult,
    Suggestion,
    UnitResult,
    VmProfile,
    VmSpikes,
)

PERIOD_S, TI_S = 3.0, 1.0
CONDITION_S = 120.0
TYPES = ("pre-I", "early-I", "ramp-I", "post-I", "aug-E", "late-E", "tonic", "NRM", "other")
SHAPES: Mapping[str, tuple[float, float, float]] = {
    # type: onset phase, peak phase, offset phase
    "pre-I": (1.8, 0.6, 1.0), "early-I": (0.0, 0.05, 0.7), "ramp-I": (0.1, 0.95, 1.0),
    "post-I": (1.0, 1.05, 1.5), "aug-E": (1.3, 1.95, 2.0), "late-E": (1.8, 1.95, 2.0),
}
UNITS: Mapping[str, str] = {"3": "early-I", "7": "post-I", "12": "aug-E", "20": SILENT, "31": UNDETERMINED}


def session_result(path: str = "rig/heron_04.nwb", *, units: Mapping[str, str] = UNITS,
                   conditions: tuple[str, ...] = ("baseline", "pons removed"), n_bins: int = 40,
                   **changes: object) -> SessionResult:
    """Return a session in which `units` (id to suggested type) hold in each of `conditions`."""
    results = tuple(condition_result(name, units, start_s=i * CONDITION_S, n_bins=n_bins)
                    for i, name in enumerate(conditions))
    session = SessionResult(path=path, session="heron_04", identifier="heron-04-identifier",
                            object_id="0b7e7f0e-3b51-4c38-9a3c-6d2f4d6d1a11", animal="heron 04",
                            reference="PNA", conditions=results, findings=(), exclusions=(), notes=(),
                            settings_digest="5e771265d1ce", template_digest="7e3b1a7ed1ce",
                            program_version="0.1.0")
    return replace(session, **changes)  # type: ignore[arg-type]


def condition_result(name: str = "baseline", units: Mapping[str, str] = UNITS, *, start_s: float = 0.0,
                     n_bins: int = 40) -> ConditionResult:
    """Return one condition of CONDITION_S seconds that holds `units`."""
    stop_s = start_s + CONDITION_S
    return ConditionResult(
        condition=Condition(name, start_s, stop_s, name), nerve="PNA", nerve_cycles=nerve_cycles(start_s),
        nerve_profiles=(NerveProfile("PNA", "phrenic", "V", _ramp(n_bins)),),
        regime_probabilities={"three-phase": 0.9, "two-phase": 0.08, "one-phase": 0.02},
        regime_reasons=("augmenting phrenic burst", "post-inspiratory discharge in the vagus"),
        units=tuple(unit_result(unit, kind, name, n_bins=n_bins) for unit, kind in units.items()))


def cycles(start_s: float = 0.0, duration_s: float = CONDITION_S) -> Cycles:
    """Return regular cycles with one sigh (left out) and one last cycle without an offset (edge)."""
    onset = start_s + np.arange(0.5, duration_s - PERIOD_S, PERIOD_S)
    n = onset.size
    plain = Cycles.plain(onset, onset + TI_S, onset + PERIOD_S, "PNA")
    kind, reason, accepted = ["breath"] * n, [""] * n, np.ones(n, bool)
    kind[5], reason[5], accepted[5] = "sigh", "burst 2.1 x the local median", False
    kind[-1], reason[-1], accepted[-1] = "edge", "cut off by the end of the condition", False
    offset = plain.offset_s.copy()
    offset[-1] = np.nan
    peak = np.full(n, 0.25)
    peak[5] = 0.525
    return replace(plain, offset_s=offset, kind=tuple(kind), reason=tuple(reason), accepted=accepted,
                   post_i_end_s=offset + 0.8, late_e=np.full(n, -1), peak=peak, area=peak * 0.4,
                   other_peak={"cVN": peak * 0.5}, other_area={"cVN": peak * 0.1},
                   lead_ms={"cVN": np.full(n, -4.0)})


def nerve_cycles(start_s: float = 0.0) -> NerveCycles:
    """Return the cycles of `cycles` with a matching ramp as envelope."""
    rate_hz = 200.0
    times = start_s + np.arange(int(CONDITION_S * rate_hz)) / rate_hz
    phase_s = (times - start_s - 0.5) % PERIOD_S
    ramp = np.where(phase_s < TI_S, 0.05 + 0.2 * phase_s / TI_S, 0.02).astype(np.float32)
    envelope = Envelope("PNA", "phrenic", "V", start_s, rate_hz, ramp, "leaky integrator, 50 ms")
    return NerveCycles(cycles=cycles(start_s), envelopes=(envelope,),
                       detection=("raw: band-pass 100 to 3000 Hz",),
                       rhythm=RhythmEvidence({"three-phase": 0.0, "two-phase": -2.4, "one-phase": -3.8},
                                             ("augmenting phrenic burst",), "eupnoea"),
                       threshold=0.04, summary={"rate_per_min": 20.0, "median_ti_s": TI_S,
                                                "median_te_s": PERIOD_S - TI_S})


def unit_result(unit: str = "3", kind: str = "early-I", condition: str = "baseline", *, n_bins: int = 40,
                **changes: object) -> UnitResult:
    """Return a unit that fires as `kind` says, in 37 cycles."""
    n_cycles = 37
    histogram = _histogram(kind, n_bins, n_cycles)
    result = UnitResult(
        unit=unit, condition=condition, digest=f"digest-{unit}", n_cycles=n_cycles,
        n_spikes=histogram.n_spikes, histogram=histogram, locked=_locked(),
        modulation=modulation(kind), features=features(kind),
        suggestion=suggestion(kind, histogram), raster=_raster(histogram, n_cycles),
        flags=("few cycles",) if kind == UNDETERMINED else (),
        q_value=np.nan if kind in (SILENT, UNDETERMINED) else 0.004,
        shape_group="" if kind in (SILENT, UNDETERMINED) else "A", columns={"region": "rostral column"})
    return replace(result, **changes)  # type: ignore[arg-type]


def suggestion(kind: str, histogram: PhaseHistogram, probability: float = 0.93) -> Suggestion:
    """Return a suggestion of `kind` with `probability`; the rest is shared evenly."""
    nothing = np.zeros(0)
    if kind in (SILENT, UNDETERMINED):
        return Suggestion(kind, {}, (f"{histogram.n_spikes} spikes",), {}, nothing, nothing, nothing)
    rest = (1 - probability) / (len(TYPES) - 1)
    probabilities = {kind: probability} | {t: rest for t in TYPES if t != kind}
    onset, peak, _ = SHAPES.get(kind, (0.0, 1.0, 2.0))
    rate = np.nan_to_num(histogram.rate_hz)
    return Suggestion(kind, probabilities, (f"begins at phase {onset:.2f}", f"peaks at phase {peak:.2f}"),
                      {"histogram": 14.0, "regime": 0.3}, rate, rate * 0.9, rate * 1.1, rule_type=kind)


def modulation(kind: str) -> Modulation:
    """Return strong modulation, or NaN for a state without enough data."""
    if kind in (SILENT, UNDETERMINED):
        return Modulation(*[np.nan] * 3, 0, *[np.nan] * 9)
    return Modulation(eta_squared=0.62, eta_squared_within=0.66, eta_squared_p=0.002, n_shifts=500,
                      sign_test_p=1e-6, friedman_p=1e-8, rayleigh_p=1e-12, kuiper_p=1e-9, watson_u2=2.2,
                      mean_phase=SHAPES.get(kind, (0.0, 1.0, 2.0))[1], resultant_length=0.7, depth=0.9,
                      depth_high=0.97)


def features(kind: str) -> Features:
    """Return features that suit `kind`, NaN for a state."""
    if kind in (SILENT, UNDETERMINED):
        return Features(*[np.nan] * 12, 0, *[np.nan] * 7)
    onset, peak, offset = SHAPES.get(kind, (0.0, 1.0, 2.0))
    return Features(onset_phase=onset, peak_phase=peak, offset_phase=offset,
                    rate_i_hz=20.0 if peak < 1 else 1.0, rate_e_hz=1.0 if peak < 1 else 15.0, rate_e1_hz=5.0,
                    rate_e2_hz=5.0, peak_rate_hz=40.0, slope=1.2, decay_ms=300.0, lead_ms=25.0,
                    participation=0.97, n_to_1=1, isi_cv=0.8, isi_cv2=0.6, isi_lv=0.7,
                    refractory_violations=0.0, drift=0.05, split_half_r=0.95, overdispersion=1.6)


def labels_for(result: SessionResult, *, reviewer: str = "Ada Fischer") -> dict[tuple[str, str], Label]:
    """Return a label for every unit that has a probability; the last such unit in disagreement."""
    keys = [(unit.key, unit.suggestion.type) for _, unit in result.units() if unit.suggestion.probabilities]
    found = {key: Label(kind, reviewer, "2031-03-04T10:20:30+00:00", "viewed", note="clean")
             for key, kind in keys}
    if keys:
        found[keys[-1][0]] = Label("", "", "", "", flags=("disagreement",))
    return found


def vm_result(unit: str = "cell 2", condition: str = "baseline", *, start_s: float = 0.0,
              n_bins: int = 40) -> UnitResult:
    """Return an intracellular post-I cell: spikes with measures, and a mean membrane potential."""
    onset = start_s + np.arange(0.5, CONDITION_S - PERIOD_S, PERIOD_S)
    times = (onset[:, None] + TI_S + np.array([0.05, 0.12, 0.22, 0.40])).ravel()
    n = times.size
    spikes = VmSpikes(time_s=times, threshold_mv=np.full(n, -45.0), height_mv=np.full(n, 41.0),
                      half_width_ms=np.full(n, 0.9), ahp_mv=np.full(n, 7.5), max_dvdt_mv_ms=np.full(n, 90.0),
                      n_spikelets=0, observed_s=np.array([[start_s, start_s + CONDITION_S]]), problems=(),
                      resting_mv=-56.0, drift_mv=0.8)
    mean = -56.0 - 6.0 * np.sin(np.pi * (np.arange(n_bins) + 0.5) * 2 / n_bins)
    profile = VmProfile(mean_mv=mean, sd_mv=np.full(n_bins, 1.2), n_cycles=37, reference_mv=-56.0,
                        swing_mv=12.0, locked={}, plateau_bias_mv=0.4, resting_mv=-56.0)
    return unit_result(unit, "post-I", condition, n_bins=n_bins, vm=profile, vm_spikes=spikes)


def _histogram(kind: str, n_bins: int, n_cycles: int) -> PhaseHistogram:
    exposure = np.repeat([TI_S, PERIOD_S - TI_S], n_bins // 2) * n_cycles / (n_bins // 2)
    if kind == SILENT:
        counts = np.zeros(n_bins)
    elif kind == UNDETERMINED:
        counts = np.zeros(n_bins)
        counts[n_bins // 4] = 6
    else:
        counts = np.round(exposure * _rate(kind, n_bins))
    rate = counts / exposure
    return PhaseHistogram(counts, exposure, np.maximum(rate - 3, 0), rate + 3, n_cycles)


def _rate(kind: str, n_bins: int) -> FloatArray:
    if kind not in SHAPES:
        return np.full(n_bins, 12.0)
    onset, peak, offset = SHAPES[kind]
    phase = (np.arange(n_bins) + 0.5) * 2 / n_bins
    after_onset, length = (phase - onset) % 2, (offset - onset) % 2 or 2.0
    rise = (peak - onset) % 2
    up = after_onset / max(rise, 1e-9)
    down = (length - after_onset) / max(length - rise, 1e-9)
    return np.where(after_onset < length, 40 * np.clip(np.minimum(up, down), 0, 1), 0.0) + 0.5


def _ramp(n_bins: int) -> FloatArray:
    half = n_bins // 2
    return np.concatenate([np.linspace(0.05, 0.25, half), np.full(n_bins - half, 0.02)])


def _locked() -> tuple[LockedHistogram, ...]:
    centres = np.arange(-990.0, 1000.0, 20.0)
    return (LockedHistogram("onset", centres, np.where(centres > 0, 20.0, 1.0)),
            LockedHistogram("offset", centres, np.where(centres < 0, 20.0, 1.0)))


def _raster(histogram: PhaseHistogram, n_cycles: int) -> Raster:
    phase = np.repeat(histogram.centres, histogram.counts.astype(int))
    rows = (np.arange(phase.size) % n_cycles).astype(np.int32)
    return Raster(phase.astype(np.float32), rows, n_cycles, n_cycles)
