"""Every tunable number in one place, each with unit, range, meaning and source.

A settings file is TOML with one table per group, e.g. ``[cycles]`` ``min_ti_s = 0.08``; `io`
reads it and calls `Settings.from_mapping`.
"""

from __future__ import annotations

import difflib
import hashlib
import math
from collections.abc import Iterator, Mapping
from dataclasses import dataclass, field, fields, replace
from typing import Any

from unitclass.errors import UsageError

TRADE = "common practice"


@dataclass(frozen=True)
class Tunable:
    """What `unitclass settings` prints of one number."""

    name: str
    value: Any
    unit: str
    low: float
    high: float
    meaning: str
    source: str


def tunable(default: Any, unit: str, low: float, high: float, meaning: str, source: str = TRADE) -> Any:
    """Declare a number with its unit, range, meaning and source."""
    return field(default=default, metadata={"unit": unit, "low": low, "high": high, "meaning": meaning,
                                            "source": source})


def worded(default: Any, meaning: str, *, choices: tuple[str, ...] = ()) -> Any:
    """Declare a setting that is a word, a list of words, a table or a yes/no."""
    if isinstance(default, dict):
        return field(default_factory=lambda: dict(default),
                     metadata={"meaning": meaning, "choices": choices})
    return field(default=default, metadata={"meaning": meaning, "choices": choices})


@dataclass(frozen=True)
class NerveSettings:
    """From raw nerve to envelope."""

    low_cut_hz: float = tunable(100.0, "Hz", 1, 2000, "lower edge of the band-pass of a raw nerve")
    high_cut_hz: float = tunable(3000.0, "Hz", 50, 20000,
                                 "upper edge of the band-pass; never above 0.45 x the sampling rate")
    tau_ms: float = tunable(50.0, "ms", 1, 500, "time constant of the displayed integrator")
    smoother: str = worded("leaky", "integrator of the displayed envelope", choices=("leaky", "moving average"))


@dataclass(frozen=True)
class CycleSettings:
    """From envelope to cycles."""

    min_burst_s: float = tunable(0.0, "s", 0, 5, "shortest burst; 0 derives it from the trace")
    min_gap_s: float = tunable(0.0, "s", 0, 5, "shortest gap between bursts; 0 derives it from the trace")
    threshold_scale: float = tunable(1.0, "x", 0.2, 5, "multiplies the detector's own threshold")
    sigh_amplitude: float = tunable(1.5, "x", 1.1, 5, "burst amplitude over the local median that makes a sigh",
                                    "memory of the literature: 1.5 to 2.5 x")
    after_sigh: int = tunable(1, "cycles", 0, 5, "cycles after a sigh that are left out with it")
    apnoea_te: float = tunable(2.5, "x", 1.5, 10, "TE over the local median that makes an apnoea",
                               "memory of the literature: over 2 to 3 x")
    settling_s: float = tunable(0.0, "s", 0, 3600, "time after the start of a condition that is left out")


@dataclass(frozen=True)
class PhaseSettings:
    """Histograms."""

    n_bins: int = tunable(40, "bins", 8, 200, "bins over one cycle, half of them inspiration; even")
    n_bootstrap: int = tunable(200, "resamples", 50, 5000, "bootstrap resamples of cycles for the limits")
    locked_window_ms: float = tunable(1000.0, "ms", 50, 10000, "half width of onset- and offset-locked histograms")
    locked_bin_ms: float = tunable(20.0, "ms", 1, 200, "bin of onset- and offset-locked histograms")


@dataclass(frozen=True)
class ModulationSettings:
    """Is a unit modulated at all?"""

    n_fractions: int = tunable(20, "bins", 8, 60, "equal time fractions of the cycle for eta squared",
                               "Orem & Dick 1983")
    n_shifts: int = tunable(500, "shifts", 99, 10000, "circular shifts of the null distribution")
    min_cycles: int = tunable(10, "cycles", 3, 200, "fewer accepted cycles is undetermined")
    few_cycles: int = tunable(30, "cycles", 5, 500, "fewer accepted cycles is flagged")
    min_spikes: int = tunable(20, "spikes", 5, 500, "fewer spikes is undetermined")
    silent_share: float = tunable(0.1, "spikes/cycle", 0.0, 1.0, "fewer spikes per cycle is silent")
    refractory_ms: float = tunable(1.0, "ms", 0.3, 5.0, "intervals below this cannot be one cell's")
    max_violations: float = tunable(0.01, "share", 0.0001, 0.5, "share of such intervals that raises a flag")


@dataclass(frozen=True)
class ClassifySettings:
    """From counts to probabilities."""

    n_draws: int = tunable(1024, "draws", 32, 4096, "profiles drawn from each family")
    concentration: float = tunable(300.0, "spikes", 10, 100000,
                                   "spikes after which a histogram stops adding evidence: doubt about the shape")
    temperature: float = tunable(1.0, "x", 0.2, 10.0, "flattens (over 1) or sharpens the probabilities")
    sure_probability: float = tunable(0.95, "probability", 0.5, 1.0, "suggestions at or over this are sure")
    other_prior: float = tunable(0.05, "probability", 0.0001, 0.9, "prior share of cells like none of the families")
    nrm_depth: float = tunable(0.35, "depth", 0.05, 0.9, "upper limit of depth below which a cell is NRM")
    conduction_delay_ms: float = tunable(0.0, "ms", -50, 200, "subtracted from nerve times: brainstem to electrode")
    regime: str = worded("auto", "rhythm regime", choices=("auto", "three-phase", "two-phase", "one-phase"))
    membrane_vote: str = worded("auto", "whether the membrane potential may vote on the type",
                                choices=("auto", "always", "never"))


@dataclass(frozen=True)
class MembraneSettings:
    """Spikes in a membrane potential."""

    min_dvdt_mv_ms: float = tunable(0.0, "mV/ms", 0, 200, "threshold of dV/dt; 0 derives it from the trace",
                                    "memory of the literature: 10 to 20, 5 to 10 for filtered or sharp")
    min_height_mv: float = tunable(0.0, "mV", 0, 100, "smallest spike; 0 derives it from the trace")
    min_width_ms: float = tunable(0.3, "ms", 0.05, 5, "rise and fall within less is an artefact",
                                  "memory of the literature")
    refractory_ms: float = tunable(1.5, "ms", 0.5, 10, "no second spike within this", "memory of the literature")
    cut_before_ms: float = tunable(2.0, "ms", 0.2, 20, "cut before the spike when averaging",
                                   "memory of the literature")
    cut_after_ms: float = tunable(5.0, "ms", 0.5, 50, "cut after the spike when averaging",
                                  "memory of the literature")
    holding_pa: float = tunable(50.0, "pA", 0, 5000, "bias current (absolute) that counts as holding the cell")


@dataclass(frozen=True)
class RigSettings:
    """What a laboratory's files call things. Remembered for the rig in its settings file."""

    nerve: str = worded("", "name of the reference nerve")
    roles: Mapping[str, str] = worded({}, "series name to role, e.g. ch3 = \"phrenic\"")
    forms: Mapping[str, str] = worded({}, "series name to \"raw\" or \"integrated\"")
    references: Mapping[str, str] = worded({}, "condition to reference nerve, where it differs")
    condition_column: str = worded("", "column of the intervals table that names the condition")
    condition_table: str = worded("", "intervals table that holds the conditions")
    same_condition: bool = worded(False, "pool repeated visits to one condition")
    exclude: tuple[str, ...] = worded((), "interval tables or labels to leave out, e.g. \"stimulation\"")
    electrode_fill: str = worded("", "fill of the intracellular electrode when the files do not tell")


@dataclass(frozen=True)
class ReviewSettings:
    """The terminal review."""

    mouse: bool = worded(True, "report mouse events to the program")
    learn: bool = worded(True, "let the labels given so far change the suggestions of other units")
    keys: Mapping[str, str] = worded({}, "action id to key, e.g. accept = \"enter\"")
    reviewer: str = worded("", "name of the reviewer; empty is the login name")
    background: str = worded("auto", "background of the terminal, for the shading of inspiration",
                             choices=("auto", "dark", "light"))


@dataclass(frozen=True)
class Settings:
    """All settings in force."""

    nerve: NerveSettings = field(default_factory=NerveSettings)
    cycles: CycleSettings = field(default_factory=CycleSettings)
    phase: PhaseSettings = field(default_factory=PhaseSettings)
    modulation: ModulationSettings = field(default_factory=ModulationSettings)
    classify: ClassifySettings = field(default_factory=ClassifySettings)
    membrane: MembraneSettings = field(default_factory=MembraneSettings)
    rig: RigSettings = field(default_factory=RigSettings)
    review: ReviewSettings = field(default_factory=ReviewSettings)

    @classmethod
    def from_mapping(cls, given: Mapping[str, Any], *, where: str = "settings") -> Settings:
        """Return the defaults with `given` laid over them.

        Raises
        ------
        UsageError
            For an unknown group or key (naming the nearest right one), a value of the wrong
            kind, or a number outside its range.
        """
        groups = {f.name: f for f in fields(cls)}
        changed = {}
        for name, table in given.items():
            _checked_name(name, groups, where, "group")
            if not isinstance(table, Mapping):
                raise UsageError(f"[{name}] must be a table", where=where, remedy=f"write [{name}] on its own line")
            changed[name] = _group_from(getattr(cls(), name), table, f"{where} [{name}]")
        return replace(cls(), **changed)

    def digest(self) -> str:
        """Return a short digest of all that changes results (the review's settings do not)."""
        shown = [(g, f.name, repr(getattr(getattr(self, g), f.name)))
                 for g in ("nerve", "cycles", "phase", "modulation", "classify", "membrane", "rig")
                 for f in fields(getattr(self, g))]
        return hashlib.sha256(repr(shown).encode()).hexdigest()[:12]

    def tunables(self) -> Iterator[Tunable]:
        """Yield every setting in force with what is known of it."""
        for group in fields(self):
            values = getattr(self, group.name)
            for f in fields(values):
                meta = f.metadata
                source = meta.get("source", " | ".join(meta.get("choices", ())))
                yield Tunable(f"{group.name}.{f.name}", getattr(values, f.name), meta.get("unit", ""),
                              meta.get("low", math.nan), meta.get("high", math.nan), meta["meaning"], source)


def _group_from(defaults: Any, table: Mapping[str, Any], where: str) -> Any:
    known = {f.name: f for f in fields(defaults)}
    for key in table:
        _checked_name(key, known, where, "setting")
    values = {key: _checked_value(known[key], getattr(defaults, key), value, where)
              for key, value in table.items()}
    return replace(defaults, **values)


def _checked_name(name: str, known: Mapping[str, Any], where: str, noun: str) -> None:
    if name in known:
        return
    near = difflib.get_close_matches(name, list(known), n=1, cutoff=0.0)
    raise UsageError(f"unknown {noun} {name!r}", where=where, remedy=f"the nearest is {near[0]!r}")


def _checked_value(f: Any, default: Any, value: Any, where: str) -> Any:
    meta = f.metadata
    if isinstance(default, tuple) and isinstance(value, list):
        value = tuple(str(item) for item in value)
    if "low" in meta:
        return _checked_number(f.name, default, value, meta, where)
    if isinstance(default, bool) != isinstance(value, bool) or (
            not isinstance(value, type(default)) and not isinstance(default, Mapping)):
        raise UsageError(f"{f.name} = {value!r} is not a {_kind(default)}", where=where,
                         remedy=f"e.g. {f.name} = {default!r}")
    choices = meta.get("choices", ())
    if choices and value not in choices:
        raise UsageError(f"{f.name} = {value!r} is unknown", where=where,
                         remedy="use one of " + ", ".join(choices))
    return value


def _kind(default: Any) -> str:
    return {bool: "yes/no (true or false)", str: "text", tuple: "list", dict: "table"}[type(default)]


def _checked_number(name: str, default: Any, value: Any, meta: Mapping[str, Any], where: str) -> Any:
    unit, low, high = meta["unit"], meta["low"], meta["high"]
    if isinstance(value, bool) or not isinstance(value, int | float):
        raise UsageError(f"{name} = {value!r} is not a number", where=where, remedy=f"give {low} to {high} {unit}")
    if isinstance(default, int) and float(value) != int(value):
        raise UsageError(f"{name} = {value} is not a whole number", where=where,
                         remedy=f"give {low} to {high} {unit}")
    if not low <= value <= high:
        raise UsageError(f"{name} = {value} is out of range", where=where, remedy=f"give {low} to {high} {unit}")
    return type(default)(value)
