"""What a file says about an intracellular electrode: cell, fill, access, bias current."""

from __future__ import annotations

import re
from collections.abc import Sequence

import h5py
import numpy as np

from unitclass.io.hdf5 import child_of, identity, scalar_number, scalar_text
from unitclass.records import Electrode

_FILL = re.compile(r"[^.;,]*\b(?:acetate|KAc|KCH3COO|gluconate|methane?sul\w+|methylsul\w+|KMeSO4|KCl|CsCl|NaCl|chloride|"
                   r"citrate|sulfate|sulphate|K2SO4)\b[^.;,]*", re.I)
_JUNCTION = re.compile(r"[^.;]*\b(?:junction|LJP)\b[^.;]*", re.I)
_RESISTANCE = re.compile(r"([-+]?\d*\.?\d+(?:e[-+]?\d+)?)\s*(G|M|k)?\s*(?:\u03a9|\u2126|ohms?)?", re.I)
_MEGOHM = {"g": 1e3, "m": 1.0, "k": 1e-3}
_FILL_FIELDS = ("filling", "fill", "filling_solution", "internal_solution", "intracellular_solution", "solution")
_CARRIED = ("location", "slice", "resistance", "seal", "depth", "hemisphere")


def electrode_of(file: h5py.File, name: str, series: Sequence[str]) -> Electrode:
    """Return the electrode that the series at these locations were recorded with.

    Parameters
    ----------
    name : str
        What to call it: the electrode's name where the file has one, else the series'.
    series : sequence of str
        Locations of its sweeps; the largest bias current (by size) of them counts.
    """
    first = file[series[0]]
    group = child_of(first, "electrode")
    words = " ".join(filter(None, (scalar_text(first, key) for key in ("description", "comments", "stimulus_description"))))
    if not isinstance(group, h5py.Group):
        return Electrode(name, fill=_said(_FILL, words), junction_potential=_said(_JUNCTION, words),
                         bias_current_pa=largest(bias_currents_pa(file, series)))
    about = " ".join(filter(None, (scalar_text(group, "description"), scalar_text(group, "filtering"), words)))
    stated = next((t for key in _FILL_FIELDS if (t := scalar_text(group, key))), "")
    return Electrode(
        name, cell_id=scalar_text(group, "cell_id"), fill=stated or _said(_FILL, about),
        description=scalar_text(group, "description"), bias_current_pa=largest(bias_currents_pa(file, series)),
        bridge_balance_mohm=scalar_number(first, "bridge_balance") / 1e6, access_mohm=_access(first, group),
        junction_potential=_said(_JUNCTION, about),
        columns={key: value for key in _CARRIED if (value := scalar_text(group, key))})


def electrode_name(file: h5py.File, series: str) -> str:
    """Return the name that the electrode of a series has in the file's own list; empty when it has none.

    A link shows the object under the series' own path, so the list is searched for the same object.
    """
    group = child_of(file[series], "electrode")
    listed = child_of(file, "general/intracellular_ephys")
    if not isinstance(group, h5py.Group):
        return ""
    for name in listed if isinstance(listed, h5py.Group) else ():
        other = child_of(listed, name)
        if isinstance(other, h5py.Group) and identity(other) == identity(group):
            return str(name)
    return str(group.name).rsplit("/", 1)[-1]


def bias_currents_pa(file: h5py.File, series: Sequence[str]) -> list[float]:
    """Return the bias current of every sweep that states one, pA."""
    said = [scalar_number(file[place], "bias_current") * 1e12 for place in series]
    return [value for value in said if np.isfinite(value)]


def largest(values: Sequence[float]) -> float:
    """Return the value largest in size; NaN when there is none."""
    return max(values, key=abs) if values else float("nan")


def megohm(said: str) -> float:
    """Return a resistance written in words ("45 MOhm", "2.5e7") in MOhm; NaN when it is none."""
    found = _RESISTANCE.match(said.strip().lstrip("~<>= "))
    if not found:
        return float("nan")
    value, prefix = float(found.group(1)), (found.group(2) or "").lower()
    if prefix:
        return value * _MEGOHM[prefix]
    return value / 1e6 if value >= 1e4 else value  # without a prefix: ohms when large, else megohms


def _access(series: h5py.Group, electrode: h5py.Group) -> float:
    said = scalar_text(electrode, "initial_access_resistance")
    return megohm(said) if said else scalar_number(series, "whole_cell_series_resistance_comp") / 1e6


def _said(pattern: re.Pattern[str], words: str) -> str:
    found = pattern.search(words)
    return found.group(0).strip() if found else ""
