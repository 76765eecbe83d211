"""Impaled cells: current-clamp series and the like, the sweeps of one electrode joined in time."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from itertools import pairwise

import h5py
import numpy as np

from unitclass.io.chunk_readers import JoinedChunks
from unitclass.io.electrodes import bias_currents_pa, electrode_name, electrode_of
from unitclass.io.hdf5 import child_of, scalar_text
from unitclass.io.roles import voltage_factor_mv
from unitclass.io.series import Series, peek
from unitclass.io.sweeps import stem
from unitclass.records import Electrode, Finding, Membrane, Signal
from unitclass.signals.vm_quality import scale_problem

CLIPPED_SHARE = 0.001  # of the samples looked at, on the largest or smallest value


@dataclass(frozen=True)
class Sweep:
    """One series (or one column of one) of one electrode, and why it is a membrane potential."""

    series: Series
    reason: str
    index: int = 0
    name: str = ""

    @property
    def label(self) -> str:
        """Return the name a user sees."""
        return self.name or self.series.name

    @property
    def factor_mv(self) -> float:
        """Return what turns the series' unit into mV; a current clamp without a unit is in volts (NWB)."""
        return voltage_factor_mv(self.series.unit) or (1e3 if self.series.kind == "current clamp" else 1.0)


@dataclass(frozen=True)
class FoundMembranes:
    """Membrane potentials, the inventory's lines, and why some could not be used."""

    membranes: tuple[Membrane, ...] = ()
    findings: tuple[Finding, ...] = ()
    missing: tuple[str, ...] = ()


def membranes_of(file: h5py.File, path: str, sweeps: Sequence[Sweep], cell: str = "", *, fill: str = "") -> FoundMembranes:
    """Return one membrane potential per cell, its sweeps in time order.

    Sweeps belong to one cell by the electrode's `cell_id`, else by the electrode itself.

    Parameters
    ----------
    cell : str
        Cell name from a plain table, where the file gives none and holds one cell.
    fill : str
        Electrode fill from the settings, where the file does not tell.
    """
    grouped: dict[str, list[Sweep]] = {}
    missing = []
    for sweep in sweeps:
        problem = _problem(file, sweep)
        if problem:
            missing.append(f"{sweep.label} [{sweep.series.location}]: {problem}")
        else:
            grouped.setdefault(_cell_key(file, sweep), []).append(sweep)
    cells = [part for key, group in grouped.items() for part in _apart(key, group)]
    made = [_joined(file, path, parts, cell if len(cells) == 1 else "", fill) for parts in cells]
    return FoundMembranes(tuple(m for m, _ in made), tuple(f for _, f in made), tuple(missing))


def _problem(file: h5py.File, sweep: Sweep) -> str:
    if sweep.series.gains[sweep.index] == 0:
        return "has a gain (conversion) of zero"
    return scale_problem(_looked_at(file, sweep), sweep.series.unit)


def _looked_at(file: h5py.File, sweep: Sweep) -> np.ndarray:
    """Return some samples from several places, mV."""
    return np.concatenate([part[:, sweep.index] for part in peek(file, sweep.series, n_places=5)]) * sweep.factor_mv


def _joined(file: h5py.File, path: str, sweeps: list[Sweep], cell: str, fill: str) -> tuple[Membrane, Finding]:
    ordered, notes = _without_overlap(sorted(sweeps, key=lambda s: s.series.times.start_s))
    first = ordered[0].series
    readers = tuple(s.series.reader(path, s.index, factor=s.factor_mv) for s in ordered)
    electrode = _electrode(file, ordered, cell, fill)
    signal = Signal(
        name=electrode.name, role="membrane", unit="mV", rate_hz=first.times.rate_hz, start_s=first.times.start_s,
        stop_s=max(s.series.times.stop_s for s in ordered),
        reader=readers[0] if len(readers) == 1 else JoinedChunks(readers), reason=ordered[0].reason,
        description=first.words, location=first.location)
    notes = (*notes, *_odd(file, ordered))
    joined = f"; {len(ordered)} sweeps joined in time" if len(ordered) > 1 else ""
    said = "".join(f"; {note}" for note in (*first.notes, *notes))
    finding = Finding("membrane potential", electrode.cell, first.location, f"{ordered[0].reason}{joined}{said}")
    return Membrane(signal, electrode, notes), finding


def _electrode(file: h5py.File, sweeps: list[Sweep], cell: str, fill: str) -> Electrode:
    electrode = electrode_of(file, _electrode_name(file, sweeps), [s.series.location for s in sweeps])
    return replace(electrode, cell_id=electrode.cell_id or cell, fill=electrode.fill or fill)


def _odd(file: h5py.File, sweeps: list[Sweep]) -> tuple[str, ...]:
    """Return what a user should know about the trace, in words."""
    values = _looked_at(file, sweeps[0])
    values = values[np.isfinite(values)]
    notes = []
    if values.size and np.ptp(values) == 0:
        notes.append(f"constant at {values[0]:.4g} mV wherever it was looked at")
    else:
        notes += [f"looks clipped at {edge:.4g} mV" for edge in (values.min(), values.max()) if _is_clipped(values, edge)]
    bias = bias_currents_pa(file, [s.series.location for s in sweeps])
    if bias and max(bias) - min(bias) > 1.0:
        notes.append(f"bias current differs between sweeps ({min(bias):.0f} to {max(bias):.0f} pA)")
    return tuple(notes)


def _is_clipped(values: np.ndarray, edge: float) -> bool:
    """Tell whether a trace rests on its extreme value: many samples there, several in a row."""
    at_edge = values == edge
    in_a_row = at_edge[:-2] & at_edge[1:-1] & at_edge[2:]
    return bool(at_edge.mean() > CLIPPED_SHARE and np.count_nonzero(in_a_row) > 3)


def _without_overlap(ordered: list[Sweep]) -> tuple[list[Sweep], tuple[str, ...]]:
    """Return sweeps of one rate that follow each other; what is left out is said."""
    kept, notes = [ordered[0]], []
    for sweep in ordered[1:]:
        before, now = kept[-1].series.times, sweep.series.times
        if abs(now.rate_hz - before.rate_hz) > 1e-6 * before.rate_hz:
            notes.append(f"sweep {sweep.label} left out: {now.rate_hz:g} Hz, the others {before.rate_hz:g} Hz")
        elif now.start_s < before.stop_s - 1.0 / before.rate_hz:
            notes.append(f"sweep {sweep.label} left out: it overlaps {kept[-1].label} in time")
        else:
            kept.append(sweep)
    return kept, tuple(notes)


def _cell_key(file: h5py.File, sweep: Sweep) -> str:
    group = child_of(file[sweep.series.location], "electrode")
    if not isinstance(group, h5py.Group):
        return f"series {stem(sweep.label)}"
    cell = scalar_text(group, "cell_id")
    return f"cell {cell}" if cell else f"electrode {electrode_name(file, sweep.series.location)}"


def _apart(key: str, sweeps: list[Sweep]) -> list[list[Sweep]]:
    """Return numbered series without an electrode as one cell, unless they were recorded together."""
    ordered = sorted(sweeps, key=lambda s: s.series.times.start_s)
    together = any(b.series.times.start_s < a.series.times.stop_s - 1.0 / a.series.times.rate_hz
                   for a, b in pairwise(ordered))
    return [[s] for s in sweeps] if key.startswith("series ") and together else [sweeps]


def _electrode_name(file: h5py.File, sweeps: list[Sweep]) -> str:
    named = electrode_name(file, sweeps[0].series.location)
    return named or (sweeps[0].label if len(sweeps) == 1 else stem(sweeps[0].label))
