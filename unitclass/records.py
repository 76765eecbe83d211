"""Frozen records that every layer shares.

They hold values, or a small picklable reader that opens its file when asked; never an open
file handle, because recordings and results travel between processes.

Vocabulary of shapes: n_spikes, n_cycles, n_bins, n_units, n_types. Phases are canonical:
[0, 2), inspiration 0 to 1, expiration 1 to 2.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass, field, replace
from math import inf
from typing import Any, Protocol

import numpy as np
from numpy.typing import NDArray

FloatArray = NDArray[np.floating[Any]]
IntArray = NDArray[np.int64]
BoolArray = NDArray[np.bool_]

SILENT = "silent"
UNDETERMINED = "undetermined"
NOT_MODULATED = "NRM"
OTHER = "other"
NOT_ONE_CELL = "not one cell"

REGIMES = ("three-phase", "two-phase", "one-phase")

ROLES = ("phrenic", "vagus", "hypoglossal", "abdominal", "laryngeal", "cervical", "muscle", "pressure",
         "airflow", "ecg", "pump", "co2", "membrane", "stimulus", "unknown")


# ----------------------------------------------------------------------------- raw data

@dataclass(frozen=True)
class Chunk:
    """Consecutive samples; `start_s` is the session time of the first one.

    A chunk that starts where the one before ended (to half a sample) goes on with the same
    stretch; any other start means a gap. `values` are float64, or float32 where the file holds
    at most 16-bit integers or single precision, so that a raw nerve costs half the memory.
    """

    start_s: float
    values: FloatArray | NDArray[np.float32]


class ChunkReader(Protocol):
    """Streams a signal in its physical unit. Must be picklable and hold no open file."""

    def chunks(self, start_s: float = -inf, stop_s: float = inf) -> Iterator[Chunk]:
        """Yield the samples with start_s <= time < stop_s in order, a few seconds at a time."""
        ...


class SpikeReader(Protocol):
    """Reads one unit's spike times. Must be picklable and hold no open file."""

    def read(self) -> FloatArray:
        """Return the finite spike times in seconds, ascending, shape (n_spikes,)."""
        ...


@dataclass(frozen=True)
class ArrayChunks:
    """A chunk reader over an array in memory: for tests, simulation and short series."""

    values: FloatArray
    rate_hz: float
    start_s: float = 0.0
    chunk_s: float = 10.0

    def chunks(self, start_s: float = -inf, stop_s: float = inf) -> Iterator[Chunk]:
        """Yield the samples with start_s <= time < stop_s, `chunk_s` seconds at a time."""
        first = 0 if start_s == -inf else max(0, int(np.ceil((start_s - self.start_s) * self.rate_hz - 1e-6)))
        last = self.values.size
        if stop_s != inf:
            last = min(last, int(np.ceil((stop_s - self.start_s) * self.rate_hz - 1e-6)))
        step = max(1, round(self.chunk_s * self.rate_hz))
        for i in range(first, last, step):
            part = np.asarray(self.values[i : min(i + step, last)], dtype=float)
            yield Chunk(self.start_s + i / self.rate_hz, part)


@dataclass(frozen=True)
class ArraySpikes:
    """A spike reader over an array in memory."""

    times_s: FloatArray

    def read(self) -> FloatArray:
        """Return the spike times, ascending."""
        return np.sort(np.asarray(self.times_s, dtype=float))


@dataclass(frozen=True)
class Signal:
    """One channel of a nerve, muscle, pressure, membrane potential or other continuous signal.

    Attributes
    ----------
    name : str
        The name a user types after `--nerve`: the series' name, with the column's own name or
        number after a slash when the series has several.
    role : str
        One of ROLES; a guess whose grounds are in `reason`.
    unit : str
        Physical unit of the streamed values.
    rate_hz : float
        Samples per second (after resampling, for irregular timestamps).
    start_s, stop_s : float
        First and last moment covered, on the session clock.
    is_integrated : bool
        True when the signal is an envelope already (used as it is), False when raw.
    form_reason : str
        Why raw or integrated was assumed.
    location : str
        Where in the file, e.g. "/acquisition/PNA".
    """

    name: str
    role: str
    unit: str
    rate_hz: float
    start_s: float
    stop_s: float
    reader: ChunkReader
    is_integrated: bool = False
    reason: str = ""
    form_reason: str = ""
    description: str = ""
    location: str = ""


@dataclass(frozen=True)
class Unit:
    """One sorted unit.

    Attributes
    ----------
    id : str
        Id in the units table (or the cell's name for an intracellular recording).
    train : SpikeReader
    observed_s : ndarray, shape (n_intervals, 2)
        Observation intervals; the whole recording when the file has none.
    is_observed_stated : bool
        False when `observed_s` is an assumption.
    columns : Mapping
        Region, depth and any other scalar column of the source's units or electrodes.
    notes : tuple of str
        What was odd about the unit (unsorted times, NaN, beyond the recording), in words.
    """

    id: str
    train: SpikeReader
    observed_s: FloatArray
    is_observed_stated: bool = False
    columns: Mapping[str, str] = field(default_factory=dict)
    notes: tuple[str, ...] = ()


@dataclass(frozen=True)
class Electrode:
    """An intracellular electrode, as far as the file tells. NaN or empty means not told."""

    name: str
    cell_id: str = ""
    fill: str = ""
    description: str = ""
    bias_current_pa: float = np.nan
    bridge_balance_mohm: float = np.nan
    access_mohm: float = np.nan
    junction_potential: str = ""
    columns: Mapping[str, str] = field(default_factory=dict)

    @property
    def cell(self) -> str:
        """Return the cell's name: `cell_id` where given, else the electrode's name."""
        return self.cell_id or self.name


@dataclass(frozen=True)
class Membrane:
    """One cell's membrane potential in mV, its sweeps joined in time with their gaps."""

    signal: Signal
    electrode: Electrode
    notes: tuple[str, ...] = ()


@dataclass(frozen=True)
class Condition:
    """A labelled stretch of the session. `name` is unique within the recording.

    `label` is the interval's own label; a second visit to the same label gets its own name
    ("baseline (2)") because conditions are never pooled unless the user maps them together. Then
    `visits` holds every visit, shape (n_visits, 2) as tuples, and start_s to stop_s spans them all.
    """

    name: str
    start_s: float
    stop_s: float
    label: str = ""
    visits: tuple[tuple[float, float], ...] = ()

    @property
    def spans(self) -> tuple[tuple[float, float], ...]:
        """Return the stretches of the session that belong to the condition, in order."""
        return self.visits or ((self.start_s, self.stop_s),)


@dataclass(frozen=True)
class Exclusion:
    """A window that no histogram may use, and why."""

    start_s: float
    stop_s: float
    reason: str


@dataclass(frozen=True)
class Finding:
    """One line of the inventory: what was recognised, where, as what, and why."""

    kind: str
    name: str
    location: str
    reason: str


@dataclass(frozen=True)
class Recording:
    """One NWB session as the analysis sees it. Nothing large is loaded.

    Attributes
    ----------
    path : str
        As given on the command line (for a folder, the path found in it).
    session : str
        The NWB session_id, else the identifier.
    nerves : tuple of Signal
        Every continuous signal that is not a membrane potential.
    reference : str
        `name` of the nerve that defines inspiration; empty when none was recognised.
    references : Mapping
        Condition name to another reference nerve, where the user named one.
    """

    path: str
    session: str
    identifier: str
    object_id: str
    animal: str
    start_s: float
    stop_s: float
    nerves: tuple[Signal, ...] = ()
    reference: str = ""
    reference_reason: str = ""
    references: Mapping[str, str] = field(default_factory=dict)
    units: tuple[Unit, ...] = ()
    membranes: tuple[Membrane, ...] = ()
    conditions: tuple[Condition, ...] = ()
    exclusions: tuple[Exclusion, ...] = ()
    findings: tuple[Finding, ...] = ()
    missing: tuple[str, ...] = ()

    def nerve(self, name: str) -> Signal:
        """Return the nerve called `name`; raises KeyError when there is none."""
        for signal in self.nerves:
            if signal.name == name:
                return signal
        raise KeyError(name)


# ------------------------------------------------------------------------------- cycles

@dataclass(frozen=True)
class Cycles:
    """Respiratory cycles found on one nerve, in time order, those left out included.

    All arrays have shape (n_cycles,); times are seconds on the session clock.

    Attributes
    ----------
    onset_s, offset_s, end_s
        Onset of inspiration, its end, and the onset of the next cycle. `offset_s` is NaN where
        it cannot be told.
    accepted
        Whether histograms use the cycle.
    kind
        "breath", "sigh", "doublet", "gasp", "artefact" or "edge".
    reason
        Why a cycle is left out, or what is odd about it; empty for a plain breath.
    post_i_end_s
        End of post-inspiration where a vagus tells; NaN elsewhere.
    late_e
        1 where the abdominal nerve has a late-expiratory burst, 0 where not, -1 unknown.
    peak, area
        Of the reference nerve's envelope, its unit and unit·s.
    other_peak, other_area
        Nerve name to the same for every other nerve.
    lead_ms
        Nerve name to its burst onset relative to the reference onset; positive leads.
    """

    nerve: str
    onset_s: FloatArray
    offset_s: FloatArray
    end_s: FloatArray
    accepted: BoolArray
    kind: tuple[str, ...]
    reason: tuple[str, ...]
    post_i_end_s: FloatArray
    late_e: IntArray
    peak: FloatArray
    area: FloatArray
    other_peak: Mapping[str, FloatArray] = field(default_factory=dict)
    other_area: Mapping[str, FloatArray] = field(default_factory=dict)
    lead_ms: Mapping[str, FloatArray] = field(default_factory=dict)

    @property
    def n_cycles(self) -> int:
        """Return the number of cycles, those left out included."""
        return int(self.onset_s.size)

    @property
    def ti_s(self) -> FloatArray:
        """Return the durations of inspiration."""
        return self.offset_s - self.onset_s

    @property
    def te_s(self) -> FloatArray:
        """Return the durations of expiration."""
        return self.end_s - self.offset_s

    @property
    def ttot_s(self) -> FloatArray:
        """Return the durations of the whole cycles."""
        return self.end_s - self.onset_s

    def select(self, keep: BoolArray) -> Cycles:
        """Return the cycles where `keep`, shape (n_cycles,), is true."""
        rows = np.flatnonzero(keep)
        arrays: dict[str, Any] = {name: getattr(self, name)[rows] for name in
                  ("onset_s", "offset_s", "end_s", "accepted", "post_i_end_s", "late_e", "peak", "area")}
        maps: dict[str, Any] = {name: {k: v[rows] for k, v in getattr(self, name).items()}
                for name in ("other_peak", "other_area", "lead_ms")}
        return replace(self, kind=tuple(self.kind[i] for i in rows),
                       reason=tuple(self.reason[i] for i in rows), **arrays, **maps)

    def used(self) -> Cycles:
        """Return the accepted cycles only."""
        return self.select(self.accepted)

    @staticmethod
    def plain(onset_s: FloatArray, offset_s: FloatArray, end_s: FloatArray, nerve: str = "phrenic") -> Cycles:
        """Return accepted breaths from their three marks alone, each shape (n_cycles,)."""
        n = np.size(onset_s)
        nan = np.full(n, np.nan)
        return Cycles(nerve=nerve, onset_s=np.asarray(onset_s, float), offset_s=np.asarray(offset_s, float),
                      end_s=np.asarray(end_s, float), accepted=np.ones(n, bool), kind=("breath",) * n,
                      reason=("",) * n, post_i_end_s=nan, late_e=np.full(n, -1), peak=nan, area=nan)


@dataclass(frozen=True)
class Envelope:
    """A nerve's integrated activity on an even grid; `values` shape (n_samples,), NaN in gaps.

    `smoother` says in words how it was made; sample i is at start_s + i / rate_hz.
    """

    name: str
    role: str
    unit: str
    start_s: float
    rate_hz: float
    values: NDArray[np.float32]
    smoother: str = ""

    @property
    def times_s(self) -> FloatArray:
        """Return the session time of every sample."""
        return self.start_s + np.arange(self.values.size) / self.rate_hz


@dataclass(frozen=True)
class NerveProfile:
    """Mean envelope of a nerve over canonical phase, for pictures; shape (n_bins,)."""

    name: str
    role: str
    unit: str
    mean: FloatArray


@dataclass(frozen=True)
class RhythmEvidence:
    """What the nerves of one condition say of the regime: log-likelihood per regime and why."""

    log_likelihood: Mapping[str, float]
    reasons: tuple[str, ...]
    pattern: str = ""


@dataclass(frozen=True)
class NerveCycles:
    """Cycles of one condition with all that was decided on the way.

    `envelopes` holds the reference first; `detection` says in words what was assumed and why;
    `threshold` is the level on the reference envelope at which a burst counts (its unit).
    """

    cycles: Cycles
    envelopes: tuple[Envelope, ...]
    detection: tuple[str, ...]
    rhythm: RhythmEvidence
    threshold: float = np.nan
    notes: tuple[str, ...] = ()
    summary: Mapping[str, float] = field(default_factory=dict)


@dataclass(frozen=True)
class CycleEdit:
    """A person's change to the cycles of one condition.

    `action` is "drop" or "restore" (the cycle whose span holds `at_s`), or "threshold" (multiply the
    detector's own level by `value`). Later edits win.
    """

    condition: str
    action: str
    at_s: float = np.nan
    value: float = np.nan
    reviewer: str = ""
    made_at: str = ""
    note: str = ""


# -------------------------------------------------------------------------------- phase

@dataclass(frozen=True)
class PhaseHistogram:
    """Spike counts by phase with the seconds observed in each bin; arrays of shape (n_bins,).

    The first half of the bins is inspiration, the second expiration. `low_hz` and `high_hz`
    are 95 % limits by bootstrap over cycles (NaN where they cannot be told).
    """

    counts: FloatArray
    exposure_s: FloatArray
    low_hz: FloatArray
    high_hz: FloatArray
    n_cycles: int

    @property
    def n_bins(self) -> int:
        """Return the number of bins over one cycle."""
        return int(self.counts.size)

    @property
    def n_spikes(self) -> int:
        """Return the number of spikes counted."""
        return int(self.counts.sum())

    @property
    def rate_hz(self) -> FloatArray:
        """Return counts over exposure, spikes/s; NaN where nothing was observed."""
        with np.errstate(invalid="ignore", divide="ignore"):
            return np.where(self.exposure_s > 0, self.counts / self.exposure_s, np.nan)

    @property
    def centres(self) -> FloatArray:
        """Return the canonical phase of the bins' middles."""
        return (np.arange(self.n_bins) + 0.5) * (2.0 / self.n_bins)


@dataclass(frozen=True)
class LockedHistogram:
    """Spike rate by time from a transition: `centres_ms` and `rate_hz`, shape (n_bins,)."""

    lock: str
    centres_ms: FloatArray
    rate_hz: FloatArray


@dataclass(frozen=True)
class Modulation:
    """Whether, and how much, a unit follows the cycle.

    `eta_squared` is one-way over equal time fractions, `eta_squared_within` with the variance
    between cycles removed; `eta_squared_p` comes from circular shifts in time. The circular
    statistics are on exposure-equalised phase. `depth` is (max − min)/(max + min) of the
    smoothed rate with its 95 % upper limit. NaN where too little data.
    """

    eta_squared: float
    eta_squared_within: float
    eta_squared_p: float
    n_shifts: int
    sign_test_p: float
    friedman_p: float
    rayleigh_p: float
    kuiper_p: float
    watson_u2: float
    mean_phase: float
    resultant_length: float
    depth: float
    depth_high: float


@dataclass(frozen=True)
class Features:
    """What a reviewer reads about a unit. NaN means it cannot be told. Phases canonical.

    rates in spikes/s; `slope` is the change of rate over the active phase relative to its mean
    (+2 rises from nothing, −2 falls to nothing); `decay_ms` the time constant after the peak;
    `lead_ms` how long before the onset of inspiration firing begins (negative: after);
    `participation` the fraction of cycles with at least one spike in the active phase;
    `split_half_r` correlation of the histograms of odd and even cycles; `drift` the change in
    mean rate from first to last third relative to the mean; `overdispersion` variance of the
    cycle counts over that of a Poisson process.
    """

    onset_phase: float
    peak_phase: float
    offset_phase: float
    rate_i_hz: float
    rate_e_hz: float
    rate_e1_hz: float
    rate_e2_hz: float
    peak_rate_hz: float
    slope: float
    decay_ms: float
    lead_ms: float
    participation: float
    n_to_1: int
    isi_cv: float
    isi_cv2: float
    isi_lv: float
    refractory_violations: float
    drift: float
    split_half_r: float
    overdispersion: float


# ------------------------------------------------------------------------ intracellular

@dataclass(frozen=True)
class VmSpikes:
    """Action potentials found in a membrane potential; arrays of shape (n_spikes,).

    `time_s` is the moment of steepest rise. `problems` says, per stretch, what time was left
    out and why; `n_spikelets` counts smaller all-or-none events apart.
    """

    time_s: FloatArray
    threshold_mv: FloatArray
    height_mv: FloatArray
    half_width_ms: FloatArray
    ahp_mv: FloatArray
    max_dvdt_mv_ms: FloatArray
    n_spikelets: int
    observed_s: FloatArray
    problems: tuple[Exclusion, ...]
    resting_mv: float
    drift_mv: float
    notes: tuple[str, ...] = ()


@dataclass(frozen=True)
class VmProfile:
    """Cycle-averaged membrane potential without spikes; arrays over phase (n_bins,), in mV.

    `mean_mv` and `sd_mv` (between cycles) on canonical phase; `reference_mv` is the cell's own
    time-weighted mean over the cycle; `swing_mv` peak minus trough. `locked` holds the onset-
    and offset-locked means: name to (centres_ms, mean_mv). `covariance_mv2`, shape (n_bins, n_bins),
    is that of the bins between cycles around each cycle's own mean: what errors of levels need.
    """

    mean_mv: FloatArray
    sd_mv: FloatArray
    n_cycles: int
    reference_mv: float
    swing_mv: float
    locked: Mapping[str, tuple[FloatArray, FloatArray]]
    plateau_bias_mv: float
    resting_mv: float
    notes: tuple[str, ...] = ()
    covariance_mv2: FloatArray = field(default_factory=lambda: np.empty((0, 0)))


# ---------------------------------------------------------------------------- suggestion

@dataclass(frozen=True)
class Suggestion:
    """What the engine says of a unit in a condition.

    Attributes
    ----------
    type : str
        Most probable type, or "silent" or "undetermined" (then `probabilities` is empty).
    probabilities : Mapping
        Type id to posterior, all types, NRM and other; sums to one. Sorted, highest first.
    reasons : tuple of str
        Sentences that a reviewer reads as grounds.
    evidence : Mapping
        Witness ("histogram", "lead", "participation", "membrane potential", "regime") to its log
        evidence for the first type over the second.
    fitted_rate_hz : ndarray, shape (n_bins,)
        Posterior mean profile of the suggested family at the fitted gain; empty for states.
    fitted_low_hz, fitted_high_hz : ndarray
        Its 90 % band.
    rule_type : str
        What the specialist's rule of thumb says, as a cross-check.
    """

    type: str
    probabilities: Mapping[str, float]
    reasons: tuple[str, ...]
    evidence: Mapping[str, float]
    fitted_rate_hz: FloatArray
    fitted_low_hz: FloatArray
    fitted_high_hz: FloatArray
    rule_type: str = ""

    @property
    def probability(self) -> float:
        """Return the posterior of the suggested type; NaN for a state."""
        return self.probabilities.get(self.type, np.nan)

    @property
    def ranked(self) -> tuple[tuple[str, float], ...]:
        """Return (type, probability), most probable first."""
        return tuple(sorted(self.probabilities.items(), key=lambda pair: -pair[1]))


@dataclass(frozen=True)
class Raster:
    """Spikes of a sample of cycles for a picture: phase and row of each, (n_shown_spikes,).

    `n_cycles` rows are shown of `of_cycles` accepted ones, evenly spaced in time.
    """

    phase: NDArray[np.float32]
    row: NDArray[np.int32]
    n_cycles: int
    of_cycles: int


@dataclass(frozen=True)
class UnitResult:
    """All about one unit in one condition. `key` names it within its session."""

    unit: str
    condition: str
    digest: str
    n_cycles: int
    n_spikes: int
    histogram: PhaseHistogram
    locked: tuple[LockedHistogram, ...]
    modulation: Modulation
    features: Features
    suggestion: Suggestion
    raster: Raster
    flags: tuple[str, ...] = ()
    q_value: float = np.nan
    shape_group: str = ""
    columns: Mapping[str, str] = field(default_factory=dict)
    vm: VmProfile | None = None
    vm_spikes: VmSpikes | None = None

    @property
    def key(self) -> tuple[str, str]:
        """Return (unit, condition)."""
        return self.unit, self.condition


@dataclass(frozen=True)
class ConditionResult:
    """One condition of a session: its cycles, its regime and its units."""

    condition: Condition
    nerve: str
    nerve_cycles: NerveCycles
    nerve_profiles: tuple[NerveProfile, ...]
    regime_probabilities: Mapping[str, float]
    regime_reasons: tuple[str, ...]
    units: tuple[UnitResult, ...]
    problem: str = ""

    @property
    def regime(self) -> str:
        """Return the most probable regime."""
        return max(self.regime_probabilities, key=lambda name: self.regime_probabilities[name], default="")


@dataclass(frozen=True)
class SessionResult:
    """What the method makes of one recording."""

    path: str
    session: str
    identifier: str
    object_id: str
    animal: str
    reference: str
    conditions: tuple[ConditionResult, ...]
    findings: tuple[Finding, ...]
    exclusions: tuple[Exclusion, ...]
    notes: tuple[str, ...]
    settings_digest: str
    template_digest: str
    program_version: str

    def units(self) -> Iterator[tuple[ConditionResult, UnitResult]]:
        """Yield every unit of every condition, in order."""
        for condition in self.conditions:
            for unit in condition.units:
                yield condition, unit


# ----------------------------------------------------------------------------- decisions

@dataclass(frozen=True)
class Decision:
    """One thing a reviewer decided. Appended to the store, never changed.

    `how` is "viewed", "blind", "batch" or "settled"; `type` is empty when a decision is taken back.
    `decided_at` is UTC in ISO 8601. `suggested_type` and `suggested_probability` are what the
    reviewer could see.
    """

    identifier: str
    object_id: str
    unit: str
    digest: str
    condition: str
    type: str
    reviewer: str
    decided_at: str
    how: str = "viewed"
    note: str = ""
    suggested_type: str = ""
    suggested_probability: float = np.nan
    settings_digest: str = ""
    template_digest: str = ""


@dataclass(frozen=True)
class Label:
    """What stands for one unit in one condition after all decisions are weighed.

    `type` is empty with the flag "disagreement" while reviewers differ and nobody settled it.
    """

    type: str
    reviewer: str
    decided_at: str
    how: str
    note: str = ""
    flags: tuple[str, ...] = ()


Labels = Mapping[tuple[str, str], Label]
"""(unit, condition) to the standing label, for one session."""
