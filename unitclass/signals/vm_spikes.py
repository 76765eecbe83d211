"""From a membrane potential to its action potentials."""

from __future__ import annotations

from math import inf

import numpy as np

from unitclass.errors import SignalError
from unitclass.records import FloatArray, Membrane, VmSpikes
from unitclass.settings import MembraneSettings
from unitclass.signals.vm_bumps import Grid
from unitclass.signals.vm_detector import Detector, Events, events_in
from unitclass.signals.vm_heights import Sorted, sort_events
from unitclass.signals.vm_learning import learn_detector
from unitclass.signals.vm_looks import BlockLook, look_at
from unitclass.signals.vm_quality import Verdict, inside, judge
from unitclass.signals.vm_sample import plan_for, sample_blocks
from unitclass.signals.vm_stream import blocks


def find_vm_spikes(membrane: Membrane, settings: MembraneSettings, *, start_s: float = -inf,
                   stop_s: float = inf) -> VmSpikes:
    """Find a cell's action potentials, measure them, and judge the recording stretch by stretch.

    Sixteen windows spread over the recording show how the cell's spikes and its noise look; one pass
    in blocks then finds every event, so memory does not grow with the recording (but for the spikes
    themselves). Spikes are the dominant height; smaller all-or-none events are spikelets. What rises
    and falls within `min_width_ms` (stimulus pops) and what does not fall (bridge steps) is neither.

    Parameters
    ----------
    membrane : Membrane
        One cell's potential in mV, with gaps or without, 5 to 50 kHz.
    settings : MembraneSettings
        Limits; 0 derives them from the trace.
    start_s, stop_s : float
        Part of the session to search.

    Returns
    -------
    VmSpikes
        `time_s` is the moment of steepest rise between samples.

    Raises
    ------
    SignalError
        If there are no samples, none is finite, all are equal, or the sampling rate is below 2 kHz.
    """
    grid = _checked_grid(membrane)
    low, high = max(start_s, membrane.signal.start_s), min(stop_s, membrane.signal.stop_s)
    reader = membrane.signal.reader
    sample = sample_blocks(reader, grid, low, high + 1.0 / grid.rate_hz)
    if not sample.blocks:
        raise SignalError("no samples in this part of the session", where=membrane.signal.name,
                          remedy="check the times of the series")
    detector = learn_detector(sample, grid, settings)
    del sample
    events, looks = _one_pass(membrane, detector, start_s, stop_s)
    _check_changes(looks, membrane)
    seconds = sum(b - a for a, b in (look.span_s for look in looks))
    kinds = sort_events(events, detector, settings, seconds)
    verdict = judge(looks, events.time_s[kinds.is_spike], events.size_mv[kinds.is_spike])
    return _result(events, kinds, verdict, detector)


def _checked_grid(membrane: Membrane) -> Grid:
    rate = membrane.signal.rate_hz
    if not rate >= 2000.0:
        raise SignalError(f"sampled at {rate:g} Hz, too slow for action potentials", where=membrane.signal.name,
                          remedy="give a membrane potential of at least 2 kHz")
    return Grid(rate)


def _one_pass(membrane: Membrane, detector: Detector, start_s: float, stop_s: float) -> tuple[Events, list[BlockLook]]:
    events, looks = [], []
    for block in blocks(membrane.signal.reader, plan_for(detector.grid), start_s, stop_s):
        coarse = detector.grid.means(block.values)
        events.append(events_in(block, coarse, detector))
        looks.append(look_at(block, coarse, detector.grid))
    return Events.joined(events), looks


def _check_changes(looks: list[BlockLook], membrane: Membrane) -> None:
    name = membrane.signal.name
    missing = sum(b - a for look in looks for a, b in look.missing_s)
    if missing >= 0.999 * sum(b - a for a, b in (look.span_s for look in looks)):
        raise SignalError("no finite values", where=name, remedy="check the series' conversion")
    low, high = min(look.low_mv for look in looks), max(look.high_mv for look in looks)
    if high - low <= 1e-9 * (1.0 + abs(high)):
        raise SignalError(f"constant at {high:g} mV throughout", where=name,
                          remedy="check the series' conversion (a gain of 0?) and the channel")


def _result(events: Events, kinds: Sorted, verdict: Verdict, detector: Detector) -> VmSpikes:
    kept = inside(events.time_s, verdict.observed_s)
    spikes = events.select(kinds.is_spike & kept)
    levels = verdict.seconds.level_mv[verdict.usable]
    resting = float(np.median(levels)) if levels.size else float("nan")
    notes = (*_detection_notes(kinds, detector, int(np.sum(kinds.is_spike & ~kept))), *verdict.notes,
             *_drift_notes(levels))
    return VmSpikes(time_s=spikes.time_s, threshold_mv=spikes.threshold_mv, height_mv=spikes.height_mv,
                    half_width_ms=spikes.half_width_ms, ahp_mv=spikes.ahp_mv, max_dvdt_mv_ms=spikes.max_dvdt_mv_ms,
                    n_spikelets=int(np.sum(kinds.is_spikelet & kept)), observed_s=verdict.observed_s,
                    problems=verdict.problems, resting_mv=resting, drift_mv=drift_mv(levels), notes=notes)


def drift_mv(levels: FloatArray) -> float:
    """Return how far the level moved: median of the last tenth minus that of the first; NaN if empty."""
    if levels.size == 0:
        return float("nan")
    n = max(1, round(0.1 * levels.size))
    return float(np.median(levels[-n:]) - np.median(levels[:n]))


def _drift_notes(levels: FloatArray) -> tuple[str, ...]:
    """Name the range of the level where it moved by over 10 mV, even when it came back."""
    if levels.size < 20:
        return ()
    n = max(1, levels.size // 20)
    slow = np.array([np.median(levels[i : i + n]) for i in range(0, levels.size - n + 1, n)])
    if np.ptp(slow) < 10.0:
        return ()
    return (f"the level drifted between {slow.min():.0f} and {slow.max():.0f} mV",)


def _detection_notes(kinds: Sorted, detector: Detector, n_left_out: int) -> tuple[str, ...]:
    how = "matched to the mean spike" if detector.kernel is not None else "of the bump over both sides"
    m = detector.lens.slope_samples
    notes = [f"spikes found by a filter {how}, dV/dt over {1e3 * m / detector.lens.rate_hz:.2f} ms (noise "
             f"{detector.slope_noise_mv_ms:.1f} mV/ms), at {kinds.least_z:.1f} times the noise"]
    if kinds.n_artefacts:
        remedy = "" if kinds.is_spike.any() else "; if they are spikes, lower membrane.min_width_ms"
        notes.append(f"{kinds.n_artefacts} events too brief for spikes were taken for artefacts{remedy}")
    if n_left_out:
        notes.append(f"{n_left_out} spikes in stretches that are left out")
    notes += [f"the spikes' height changed for good at {t:.1f} s" for t in kinds.new_heights_s]
    return tuple(notes)
