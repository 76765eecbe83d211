"""Impaled cells: current-clamp series and the like, the sweeps of one electrode joined in time."""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import dataclass, replace

import h5py
import numpy as np

from unitclass.io.chunk_readers import JoinedChunks
from unitclass.io.hdf5 import child_of, scalar_number, scalar_text
from unitclass.io.roles import voltage_factor_mv
from unitclass.io.series import Series, peek
from unitclass.records import Electrode, Finding, Membrane, Signal
from unitclass.signals.vm_quality import scale_problem

_FILL = re.compile(r"[^.;,]*\b(?:acetate|KAc|gluconate|methylsul\w+|KCl|CsCl|NaCl|chloride|citrate|sulfate|sulphate)\b[^.;,]*",
                   re.I)
_JUNCTION = re.compile(r"[^.;]*\b(?:junction|LJP)\b[^.;]*", re.I)


@dataclass(frozen=True)
class Sweep:
    """One series of one electrode."""

    series: Series
    reason: str


@dataclass(frozen=True)
class FoundMembranes:
    """Membrane potentials, the inventory's lines, and why some could not be used."""

    membranes: tuple[Membrane, ...] = ()
    findings: tuple[Finding, ...] = ()
    missing: tuple[str, ...] = ()


def membranes_of(file: h5py.File, path: str, sweeps: Sequence[Sweep], cell: str = "") -> FoundMembranes:
    """Return one membrane potential per electrode, its sweeps in time order.

    Parameters
    ----------
    cell : str
        Cell name from a plain table, where the file gives none.
    """
    grouped: dict[str, list[Sweep]] = {}
    for sweep in sweeps:
        problem = _problem(file, sweep.series)
        key = "" if problem else _electrode_name(file, sweep.series)
        if problem:
            grouped.setdefault(f"!{sweep.series.name}: {problem}", [])
        else:
            grouped.setdefault(key, []).append(sweep)
    missing = tuple(key[1:] for key in grouped if key.startswith("!"))
    made = [_joined(file, path, name, parts, cell) for name, parts in grouped.items() if parts]
    return FoundMembranes(tuple(m for m, _ in made), tuple(f for _, f in made), missing)


def _problem(file: h5py.File, series: Series) -> str:
    factor = voltage_factor_mv(series.unit) or 1.0
    values = np.concatenate([part.ravel() for part in peek(file, series)]) * factor
    return scale_problem(values, series.unit)


def _joined(file: h5py.File, path: str, name: str, sweeps: list[Sweep], cell: str) -> tuple[Membrane, Finding]:
    ordered, notes = _without_overlap(sorted(sweeps, key=lambda s: s.series.times.start_s))
    first = ordered[0].series
    readers = tuple(s.series.reader(path, 0, factor=voltage_factor_mv(s.series.unit) or 1.0) for s in ordered)
    signal = Signal(
        name=name, role="membrane", unit="mV", rate_hz=first.times.rate_hz, start_s=first.times.start_s,
        stop_s=max(s.series.times.stop_s for s in ordered), reader=readers[0] if len(readers) == 1 else JoinedChunks(readers),
        reason=ordered[0].reason, description=first.words, location=first.location)
    electrode = _electrode(file, name, ordered)
    if cell and not electrode.cell_id:
        electrode = replace(electrode, cell_id=cell)
    joined = f"; {len(ordered)} sweeps joined in time" if len(ordered) > 1 else ""
    finding = Finding("membrane potential", electrode.cell, first.location, f"{ordered[0].reason}{joined}")
    return Membrane(signal, electrode, notes), finding


def _without_overlap(ordered: list[Sweep]) -> tuple[list[Sweep], tuple[str, ...]]:
    """Return sweeps of one rate that follow each other; what is left out is said."""
    kept, notes = [ordered[0]], []
    for sweep in ordered[1:]:
        before, now = kept[-1].series.times, sweep.series.times
        if abs(now.rate_hz - before.rate_hz) > 1e-6 * before.rate_hz:
            notes.append(f"sweep {sweep.series.name} left out: {now.rate_hz:g} Hz, the others {before.rate_hz:g} Hz")
        elif now.start_s < before.stop_s - 1.0 / before.rate_hz:
            notes.append(f"sweep {sweep.series.name} left out: it overlaps {kept[-1].series.name}")
        else:
            kept.append(sweep)
    return kept, tuple(notes)


def _electrode_name(file: h5py.File, series: Series) -> str:
    group = child_of(file[series.location], "electrode")
    return str(group.name).rsplit("/", 1)[-1] if isinstance(group, h5py.Group) else series.name


def _electrode(file: h5py.File, name: str, sweeps: list[Sweep]) -> Electrode:
    series = file[sweeps[0].series.location]
    group = child_of(series, "electrode")
    words = sweeps[0].series.words
    if not isinstance(group, h5py.Group):
        return Electrode(name, fill=_said(_FILL, words), junction_potential=_said(_JUNCTION, words),
                         bias_current_pa=_bias_pa(file, sweeps))
    about = " ".join(filter(None, (scalar_text(group, "description"), scalar_text(group, "filtering"), words)))
    stated = next((t for key in ("filling", "fill", "filling_solution", "solution") if (t := scalar_text(group, key))), "")
    columns = {key: value for key in ("location", "slice") if (value := scalar_text(group, key))}
    resistance = scalar_number(series, "whole_cell_series_resistance_comp")
    return Electrode(
        name, cell_id=scalar_text(group, "cell_id"), fill=stated or _said(_FILL, about),
        description=scalar_text(group, "description"), bias_current_pa=_bias_pa(file, sweeps),
        bridge_balance_mohm=scalar_number(series, "bridge_balance") / 1e6, access_mohm=resistance / 1e6,
        junction_potential=_said(_JUNCTION, about), columns=columns)


def _bias_pa(file: h5py.File, sweeps: list[Sweep]) -> float:
    """Return the largest bias current (by size) of the sweeps, pA; NaN when none says."""
    said = [scalar_number(file[s.series.location], "bias_current") * 1e12 for s in sweeps]
    known = [value for value in said if np.isfinite(value)]
    return max(known, key=abs) if known else float("nan")


def _said(pattern: re.Pattern[str], words: str) -> str:
    found = pattern.search(words)
    return found.group(0).strip() if found else ""
