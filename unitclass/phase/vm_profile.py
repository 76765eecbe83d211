"""The membrane potential over the respiratory cycle, spikes cut away."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from unitclass.phase.exposure import exposure
from unitclass.phase.vm_bridging import Stretch, bridged_stretches
from unitclass.phase.vm_levels import VmLevels, vm_phase_levels
from unitclass.phase.warp import to_phase
from unitclass.records import BoolArray, Cycles, FloatArray, Membrane, VmProfile, VmSpikes
from unitclass.settings import MembraneSettings

__all__ = ["VmLevels", "vm_phase_levels", "vm_profile"]


def vm_profile(membrane: Membrane, spikes: VmSpikes, cycles: Cycles, settings: MembraneSettings, *,
               n_bins: int = 40, locked_window_ms: float = 1000.0, locked_bin_ms: float = 20.0) -> VmProfile:
    """Average the membrane potential over the cycle, spikes cut and bridged.

    Each accepted cycle that was observed from end to end counts the same. The spread between cycles is
    that around each cycle's own mean, so that a drift of the level does not pass for irregularity;
    how much the level itself varied is said in `notes`.

    Parameters
    ----------
    membrane : Membrane
        The potential in mV.
    spikes : VmSpikes
        Its spikes and the time that is fit for use.
    cycles : Cycles
        Those left out are left out here too.
    settings : MembraneSettings
        `cut_before_ms` and `cut_after_ms`.
    n_bins : int
        Bins over the cycle; even, the first half inspiration.
    locked_window_ms, locked_bin_ms : float
        Half width and bin of the means around onset and offset of inspiration. Only time inside the
        cycles in use counts.

    Returns
    -------
    VmProfile
        With empty arrays and a note when no cycle can be used. `plateau_bias_mv` is how much higher
        (or lower) the potential stands where the cell fires most than it would with twice as much cut
        around each spike: a measure of what the cut leaves in, or takes.

    Raises
    ------
    ValueError
        If `n_bins` is not a positive even number.
    """
    used = cycles.used()
    whole = exposure(used, observed_s=spikes.observed_s, n_bins=n_bins).is_whole
    used = used.select(whole)
    tally = _Tally(used, n_bins, _Locks(used, locked_window_ms, locked_bin_ms))
    if used.n_cycles:
        signal = membrane.signal
        for part in bridged_stretches(signal.reader, signal.rate_hz, spikes.time_s, settings,
                                      float(used.onset_s[0]) - 0.1, float(used.end_s[-1]) + 0.1):
            tally.add(part)
    covered = tally.covered()
    if not covered.any():
        return _empty(membrane, spikes)
    return _result(tally, covered, membrane, spikes, settings)


@dataclass(frozen=True)
class _Means:
    """Per cycle and bin, shape (n_cycles, n_bins), cycles without a hole only."""

    bridged: FloatArray
    own_mean: FloatArray


class _Locks:
    """Sums around the onsets and offsets of inspiration."""

    def __init__(self, cycles: Cycles, window_ms: float, bin_ms: float) -> None:
        self.half = max(1, round(window_ms / bin_ms))
        self.bin_s = 1e-3 * bin_ms
        self.events = {"onset": np.asarray(cycles.onset_s), "offset": np.asarray(cycles.offset_s)}
        self.sums = {name: np.zeros(2 * self.half) for name in self.events}
        self.counts = {name: np.zeros(2 * self.half) for name in self.events}

    def add(self, times_s: FloatArray, values: FloatArray) -> None:
        """Add samples, ascending in time."""
        if times_s.size == 0:
            return
        reach = self.half * self.bin_s
        for name, events in self.events.items():
            low, high = np.searchsorted(events, [times_s[0] - reach, times_s[-1] + reach])
            for event in events[low:high]:
                a, b = np.searchsorted(times_s, [event - reach, event + reach])
                column = np.floor((times_s[a:b] - event) / self.bin_s).astype(np.int64) + self.half
                column = np.clip(column, 0, 2 * self.half - 1)
                self.sums[name] += np.bincount(column, values[a:b], minlength=2 * self.half)
                self.counts[name] += np.bincount(column, minlength=2 * self.half)

    def means(self) -> dict[str, tuple[FloatArray, FloatArray]]:
        """Return centres in ms and mean in mV by lock, NaN where nothing was seen."""
        centres = (np.arange(2 * self.half) - self.half + 0.5) * self.bin_s * 1e3
        return {name: (centres, _ratio(self.sums[name], self.counts[name])) for name in self.events}


class _Tally:
    """Sums of the potential by cycle and bin of phase."""

    def __init__(self, cycles: Cycles, n_bins: int, locks: _Locks) -> None:
        self.cycles, self.n_bins, self.locks = cycles, n_bins, locks
        shape = (cycles.n_cycles, n_bins)
        self.sums, self.counts = np.zeros(shape), np.zeros(shape)
        self.wide_sums, self.raw_sums = np.zeros(n_bins), np.zeros(n_bins)

    def add(self, part: Stretch) -> None:
        """Add one stretch of the low-rate potential."""
        low = np.searchsorted(self.cycles.end_s, part.times_s[0], side="right")
        high = np.searchsorted(self.cycles.onset_s, part.times_s[-1], side="right")
        if low >= high:
            return
        near = self.cycles.select(_between(self.cycles.n_cycles, int(low), int(high)))
        phased = to_phase(part.times_s, near)
        rows = np.flatnonzero(phased.cycle >= 0)
        column = np.minimum((phased.phase[rows] * (0.5 * self.n_bins)).astype(np.int64), self.n_bins - 1)
        cell = phased.cycle[rows] * self.n_bins + column
        n = (high - low) * self.n_bins
        shape = (high - low, self.n_bins)
        self.sums[low:high] += np.bincount(cell, part.bridged_mv[rows], minlength=n).reshape(shape)
        self.counts[low:high] += np.bincount(cell, minlength=n).reshape(shape)
        self.wide_sums += np.bincount(column, part.wide_mv[rows], minlength=self.n_bins)
        self.raw_sums += np.bincount(column, part.raw_mv[rows], minlength=self.n_bins)
        self.locks.add(part.times_s[rows], part.bridged_mv[rows])

    def covered(self) -> BoolArray:
        """Return which cycles have samples enough: at least half the bins, no long hole."""
        return np.asarray((self.counts > 0).mean(axis=1) >= 0.5) if self.counts.size else np.zeros(0, bool)

    def per_cycle(self, covered: BoolArray) -> _Means:
        """Return the bin means of the covered cycles; a bin too short for a sample is interpolated."""
        sums, counts = self.sums[covered], self.counts[covered]
        bridged = _ratio(sums, counts)
        for row in bridged:
            hole = np.isnan(row)
            if hole.any():
                row[hole] = np.interp(np.flatnonzero(hole), np.flatnonzero(~hole), row[~hole])
        return _Means(bridged, sums.sum(axis=1) / counts.sum(axis=1))


def _result(tally: _Tally, covered: BoolArray, membrane: Membrane, spikes: VmSpikes,
            settings: MembraneSettings) -> VmProfile:
    means = tally.per_cycle(covered)
    n = int(covered.sum())
    mean_mv = means.bridged.mean(axis=0)
    relative = means.bridged - means.own_mean[:, None]
    covariance = np.cov(relative, rowvar=False) if n > 1 else np.full((tally.n_bins, tally.n_bins), np.nan)
    rate_hz, busy = _busy_bins(tally, spikes)
    bias, raw = _removal(tally, busy)
    return VmProfile(
        mean_mv=mean_mv, sd_mv=np.sqrt(np.diag(covariance)), n_cycles=n, reference_mv=float(means.own_mean.mean()),
        swing_mv=float(mean_mv.max() - mean_mv.min()), locked=tally.locks.means(), plateau_bias_mv=bias,
        resting_mv=spikes.resting_mv, covariance_mv2=covariance,
        notes=(*_removal_notes(settings, rate_hz, bias, raw), *_level_notes(means, n),
               *_left_out(tally.cycles, covered), junction_note(membrane)))


def _busy_bins(tally: _Tally, spikes: VmSpikes) -> tuple[float, BoolArray]:
    """Return the firing rate where the cell fires most, and those bins: over half of the peak rate."""
    phased = to_phase(spikes.time_s, tally.cycles)
    column = (phased.phase[phased.cycle >= 0] * (0.5 * tally.n_bins)).astype(np.int64)
    counts = np.bincount(np.minimum(column, tally.n_bins - 1), minlength=tally.n_bins).astype(float)
    half = tally.n_bins // 2
    seconds = np.repeat([tally.cycles.ti_s.sum() / half, tally.cycles.te_s.sum() / half], half)
    rate = _ratio(counts, seconds)
    busy = rate >= 0.5 * rate.max() if counts.any() else np.zeros(tally.n_bins, bool)
    return (float(counts[busy].sum() / seconds[busy].sum()) if busy.any() else 0.0), busy


def _removal(tally: _Tally, busy: BoolArray) -> tuple[float, float]:
    """Return how the cut potential compares with the doubly cut and the uncut one where the cell fires."""
    counts = tally.counts.sum(axis=0)[busy].sum()
    if not counts:
        return 0.0, 0.0
    cut = tally.sums.sum(axis=0)[busy].sum()
    return (float((cut - tally.wide_sums[busy].sum()) / counts), float((tally.raw_sums[busy].sum() - cut) / counts))


def _removal_notes(settings: MembraneSettings, rate_hz: float, bias: float, raw: float) -> tuple[str, ...]:
    if rate_hz == 0.0:
        return ()
    return (f"spikes cut from -{settings.cut_before_ms:g} to +{settings.cut_after_ms:g} ms and bridged; where the "
            f"cell fires ({rate_hz:.0f} spikes/s) the uncut mean is {raw:+.1f} mV off, and cutting twice as much "
            f"would move the potential by {-bias:+.1f} mV",)


def _level_notes(means: _Means, n: int) -> tuple[str, ...]:
    if n < 2:
        return ("a single cycle: no spread between cycles",)
    spread = float(means.own_mean.std(ddof=1))
    return (f"the mean level varied between cycles (sd {spread:.1f} mV); the spread shown is around each "
            "cycle's own mean",) if spread >= 2.0 else ()


def _left_out(cycles: Cycles, covered: BoolArray) -> tuple[str, ...]:
    missing = int(np.sum(~covered))
    return (f"{missing} accepted cycles have no membrane potential",) if missing else ()


def junction_note(membrane: Membrane) -> str:
    """Say whether the liquid junction potential is corrected, as far as the file tells."""
    said = membrane.electrode.junction_potential.strip()
    if said:
        return f"liquid junction potential: {said}"
    return "whether the liquid junction potential is corrected is not stated; levels are as recorded"


def _empty(membrane: Membrane, spikes: VmSpikes) -> VmProfile:
    none = np.empty(0)
    return VmProfile(none, none, 0, float("nan"), float("nan"), {}, float("nan"), spikes.resting_mv,
                     ("no accepted cycle lies wholly in the usable membrane potential", junction_note(membrane)))


def _between(n: int, low: int, high: int) -> BoolArray:
    mask = np.zeros(n, bool)
    mask[low:high] = True
    return mask


def _ratio(sums: FloatArray, counts: FloatArray) -> FloatArray:
    with np.errstate(invalid="ignore", divide="ignore"):
        return np.where(counts > 0, sums / counts, np.nan)
