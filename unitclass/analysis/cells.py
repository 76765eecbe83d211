"""The cells of a recording: sorted units, and impaled cells with the spikes of their membrane potential."""

from __future__ import annotations

import hashlib
from collections.abc import Mapping
from dataclasses import dataclass, field, replace

import numpy as np

from unitclass.errors import FileError, SignalError
from unitclass.records import ArraySpikes, FloatArray, Membrane, Recording, SpikeReader, Unit, VmSpikes
from unitclass.settings import Settings

CHLORIDE = ("kcl", "cscl", "chloride", "nacl")
INERT = ("acetate", "gluconate", "methylsulf", "methylsulph", "kac", "citrate", "sulfate", "sulphate")


@dataclass(frozen=True)
class Cell:
    """One cell to classify.

    `observed_s` is None for "always". `vote_problem` says why the membrane potential has no say.
    """

    id: str
    train: SpikeReader
    observed_s: FloatArray | None
    columns: Mapping[str, str] = field(default_factory=dict)
    notes: tuple[str, ...] = ()
    membrane: Membrane | None = None
    vm_spikes: VmSpikes | None = None
    vote_problem: str = ""
    is_held: bool = False


def cells_of(recording: Recording, settings: Settings) -> tuple[Cell, ...]:
    """Return the sorted units, then the impaled cells.

    Raises
    ------
    FileError
        When no cell at all is usable; one bad trace among others is left out with a note.
    """
    cells = [_unit_cell(unit) for unit in recording.units]
    problems = []
    for membrane in recording.membranes:
        try:
            cells.append(_membrane_cell(membrane, settings))
        except SignalError as error:
            problems.append(str(error))
    if problems and not cells:
        raise FileError(problems[0], where=recording.path)
    if problems:
        cells[0] = replace(cells[0], notes=(*cells[0].notes, *problems))
    return tuple(cells)


def train_digest(times_s: FloatArray) -> str:
    """Return what a spike train is recognised by: sorting again reuses ids, never this."""
    return hashlib.sha256(np.ascontiguousarray(times_s, dtype="<f8").tobytes()).hexdigest()[:16]


def overlap_problem(recording: Recording) -> str:
    """Return one line when the reference nerve and the spikes share no moment; else empty."""
    nerve = next((s for s in recording.nerves if s.name == recording.reference), None)
    if nerve is None:
        return ""
    spans = [_span(unit) for unit in recording.units]
    spans += [(m.signal.start_s, m.signal.stop_s) for m in recording.membranes]
    known = [(low, high) for low, high in spans if low <= high]
    if not known or any(low <= nerve.stop_s and high >= nerve.start_s for low, high in known):
        return ""
    low, high = min(low for low, _ in known), max(high for _, high in known)
    return (f"nerve {nerve.name} ({nerve.start_s:.1f} to {nerve.stop_s:.1f} s) and the cells "
            f"({low:.1f} to {high:.1f} s) do not overlap in time")


def _span(unit: Unit) -> tuple[float, float]:
    times_s = unit.train.read()
    return (float(times_s[0]), float(times_s[-1])) if times_s.size else (np.inf, -np.inf)


def _unit_cell(unit: Unit) -> Cell:
    observed = unit.observed_s if unit.is_observed_stated else None
    return Cell(unit.id, unit.train, observed, unit.columns, tuple(f"unit {unit.id}: {note}" for note in unit.notes))


def _membrane_cell(membrane: Membrane, settings: Settings) -> Cell:
    from unitclass.signals.vm_spikes import find_vm_spikes

    spikes = find_vm_spikes(membrane, settings.membrane)
    electrode = membrane.electrode
    held = abs(electrode.bias_current_pa) > settings.membrane.holding_pa
    return Cell(electrode.cell, ArraySpikes(spikes.time_s), spikes.observed_s, electrode.columns,
                tuple(f"cell {electrode.cell}: {note}" for note in (*membrane.notes, *spikes.notes)),
                membrane, spikes, _vote_problem(membrane, settings),
                is_held=bool(held and electrode.bias_current_pa < 0))


def _vote_problem(membrane: Membrane, settings: Settings) -> str:
    if settings.classify.membrane_vote == "always":
        return ""
    if settings.classify.membrane_vote == "never":
        return "the settings give the membrane potential no say"
    current = membrane.electrode.bias_current_pa
    if abs(current) > settings.membrane.holding_pa:
        return f"bias current of {current:.0f} pA holds the cell: its membrane potential has no say"
    fill = (settings.rig.electrode_fill or membrane.electrode.fill).lower()
    if any(word in fill for word in CHLORIDE):
        return "chloride in the electrode may reverse inhibition: the membrane potential has no say"
    if not any(word in fill for word in INERT):
        return "the electrode's fill is not known: the membrane potential has no say"
    return ""
