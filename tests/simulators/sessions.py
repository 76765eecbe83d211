"""Whole recordings in memory, from raw nerve to units, with known types.

`whole` puts units of one of the independent simulators beside nerves drawn by `nerves.py`; `in_memory`
turns a demo session of `unitclass.simulate` into a recording without a file.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

import numpy as np

from tests.simulators import nerves
from tests.simulators.common import SimUnits, preparation
from tests.simulators.oracle import SIMULATORS
from unitclass.records import (
    ArrayChunks,
    ArraySpikes,
    Cycles,
    Electrode,
    FloatArray,
    Membrane,
    Recording,
    Signal,
    Unit,
)
from unitclass.simulate import SimulatedSession
from unitclass.simulate.membrane import MV_PER_COUNT
from unitclass.simulate.nerves import NerveTrace

BURST = {"three-phase": "ramp", "two-phase": "square", "one-phase": "decrementing"}


def whole(simulator: str, regime: str, n_per_type: int, *, n_cycles: int, rng: np.random.Generator,
          raw_rate_hz: float = 4000.0, snr: float = 5.0, trouble: Sequence[str] = ("hum", "heart"),
          **asked: object) -> tuple[Recording, SimUnits]:
    """Return a recording with a raw reference nerve (and a vagus but in one-phase rhythm) and its units.

    `asked` goes to the simulator of units: `peak_hz`, `hardness`, `types`, `with_other`.
    """
    truth = drawn_nerve(regime, n_cycles, rng)
    cycles = true_cycles(truth)
    units = SIMULATORS[simulator].simulate(n_per_type, regime=regime, rng=rng, cycles=cycles, **asked)
    rig = nerves.Rig(rate_hz=raw_rate_hz, snr=snr, trouble=tuple(trouble))
    if regime == "one-phase":
        found = [nerves.raw(truth, rig, rng, name="HN", role="hypoglossal")]
    else:
        vagal = replace(truth, envelope=vagal_envelope(truth, cycles, regime, rng))
        found = [nerves.raw(truth, rig, rng, name="PNA", role="phrenic"),
                 nerves.raw(vagal, rig, rng, name="VNA", role="vagus")]
    return _recording(f"{simulator} {regime}", found, units.trains, truth.duration_s), units


def drawn_nerve(regime: str, n_cycles: int, rng: np.random.Generator) -> nerves.Truth:
    """Draw the reference nerve of a preparation of this regime."""
    prep = preparation(regime, rng)
    ttot = prep.ti_s + prep.te_s
    events = {int(k): "sigh" for k in rng.choice(np.arange(2, n_cycles), n_cycles // 30, replace=False)}
    return nerves.draw(nerves.Plan(shape=BURST[regime], n_cycles=n_cycles, ttot_s=ttot, duty=prep.ti_s / ttot,
                                   cv=max(prep.te_cv, prep.ti_cv), events=events), rng)


def true_cycles(truth: nerves.Truth) -> Cycles:
    """Return the cycles between the true onsets of the bursts."""
    return Cycles.plain(truth.onset_s[:-1], truth.offset_s[:-1], truth.onset_s[1:])


def vagal_envelope(truth: nerves.Truth, cycles: Cycles, regime: str, rng: np.random.Generator) -> FloatArray:
    """Return a vagus that fires with the phrenic and, in three-phase rhythm, on into expiration."""
    envelope = rng.uniform(0.4, 0.8) * truth.envelope
    if regime != "three-phase":
        return envelope
    times = np.arange(envelope.size) / nerves.FINE_HZ
    tau_s = rng.uniform(0.15, 0.3) * float(np.median(cycles.te_s))
    for offset, end in zip(cycles.offset_s, cycles.end_s, strict=True):
        part = slice(int(offset * nerves.FINE_HZ), int(end * nerves.FINE_HZ))
        envelope[part] += np.exp(-(times[part] - offset) / tau_s)
    return envelope


def in_memory(session: SimulatedSession) -> Recording:
    """Return a demo session as a recording; its first nerve is the reference."""
    signals = [_signal(trace) for trace in session.nerves]
    made = _recording(session.stem, signals, [u.spike_times_s for u in session.units], session.stop_s)
    labelled = session.conditions if session.scenario.is_labelled else ()
    return replace(made, conditions=labelled, exclusions=session.exclusions, membranes=_membranes(session))


def _membranes(session: SimulatedSession) -> tuple[Membrane, ...]:
    cell = session.membrane
    if cell is None:
        return ()
    reader = ArrayChunks(cell.counts * MV_PER_COUNT, cell.rate_hz)
    signal = Signal("Vm", "membrane", "mV", cell.rate_hz, 0.0, session.stop_s, reader)
    return (Membrane(signal, Electrode("sharp electrode", cell.cell_id, fill="potassium acetate")),)


def _signal(trace: NerveTrace) -> Signal:
    wire = trace.wire
    roles = ("phrenic", "vagus", "hypoglossal", "abdominal")
    role = next(role for role in roles if role in wire.nerve)
    return Signal(wire.name, role, "V", wire.rate_hz, 0.0, trace.counts.size / wire.rate_hz,
                  ArrayChunks(trace.counts * trace.conversion, wire.rate_hz), is_integrated=wire.is_integrated)


def _recording(name: str, signals: Sequence[Signal], trains: Sequence[FloatArray], stop_s: float) -> Recording:
    observed = np.array([[0.0, stop_s]])
    units = tuple(Unit(str(i), ArraySpikes(train), observed, is_observed_stated=True)
                  for i, train in enumerate(trains))
    return Recording(path=f"{name}.nwb", session=name, identifier=name, object_id=name, animal="invented",
                     start_s=0.0, stop_s=stop_s, nerves=tuple(signals), reference=signals[0].name, units=units)
