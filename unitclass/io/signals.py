"""Every continuous signal of a file, with a guess at what it is."""

from __future__ import annotations

import re
from collections.abc import Mapping
from dataclasses import dataclass

import h5py
import numpy as np

from unitclass.io.dynamic_tables import text_columns
from unitclass.io.forms import form_of
from unitclass.io.hdf5 import child_of, text
from unitclass.io.roles import Guess, is_membrane, role_of
from unitclass.io.series import Series, peek
from unitclass.records import Finding, Signal
from unitclass.settings import RigSettings

_LISTED = re.compile(r"(?:columns?|channels?|order)\b[^:=]{0,30}[:=]\s*(.+)", re.I | re.S)
_SEPARATOR = re.compile(r"\s*[,;|]\s*|\s+and\s+")
_NAMING_CHILDREN = ("channel_names", "column_names", "columns", "channels", "labels", "names")
_TELLING = ("label", "channel_name", "nerve", "name", "location", "group_name", "electrode_label")


@dataclass(frozen=True)
class FoundSignals:
    """The signals of one series, and the lines of the inventory about them."""

    signals: tuple[Signal, ...]
    findings: tuple[Finding, ...]


def signals_of(file: h5py.File, path: str, series: Series, rig: RigSettings) -> FoundSignals:
    """Return every column of a series as a signal with its role and its form, and why."""
    names = column_names(file[series.location], series)
    words = _electrode_words(file, series)
    samples = peek(file, series)
    signals, findings = [], []
    for j in range(series.n_columns):
        name = series.name if series.n_columns == 1 else f"{series.name}/{names[j] or j}"
        guess = _role(series, names[j], words[j], rig, name)
        form = _form(series, name, names[j], guess.role, [s[:, j] for s in samples], rig)
        notes = "".join(f"; {note}" for note in series.notes)
        signals.append(Signal(
            name=name, role=guess.role, unit=series.unit or "unknown unit", rate_hz=series.times.rate_hz,
            start_s=series.times.start_s, stop_s=series.times.stop_s, reader=series.reader(path, j),
            is_integrated=form[0], reason=guess.reason, form_reason=form[1], description=series.words,
            location=series.location))
        times = f"; {series.times.note}" if series.times.note else ""
        findings.append(Finding(guess.label or guess.role, name, series.location,
                                f"{guess.reason}; {form[1]}{times}{notes}"))
    return FoundSignals(tuple(signals), tuple(findings))


def column_names(group: h5py.Group, series: Series) -> list[str]:
    """Return the columns' own names where the file gives them; empty text where not."""
    n = series.n_columns
    if n == 1:
        return [""]
    for name in _NAMING_CHILDREN:
        child = child_of(group, name)
        if isinstance(child, h5py.Dataset) and child.shape == (n,) and child.dtype.kind in "OSU":
            return [text(v) for v in child[()]]
        stored = group["data"].attrs.get(name, group.attrs.get(name))
        if stored is not None and np.size(stored) == n:
            return [text(v) for v in np.asarray(stored).reshape(-1)]
    return _names_in_words(series.words, n) or [""] * n


def _names_in_words(words: str, n: int) -> list[str]:
    """Return the names a description lists ("columns: PNA, VNA, HNA"), when there are as many as columns."""
    listed = _LISTED.search(words)
    for candidate in ([listed.group(1)] if listed else []) + [words]:
        first_sentence = re.split(r"\.(?:\s|$)|\n", candidate.strip())[0]
        parts = [re.sub(r"^(?:ch(?:annel)?\s*)?\d+\s*[=:)]\s*", "", p).strip() for p in _SEPARATOR.split(first_sentence)]
        parts = [p for p in parts if p]
        if len(parts) == n and all(len(p) <= 40 for p in parts):
            return parts
    return []


def _role(series: Series, column: str, words: Mapping[str, str], rig: RigSettings, name: str) -> Guess:
    for key in (name, series.name if series.n_columns == 1 else "", column):
        if key and key in rig.roles:
            return Guess(rig.roles[key], "named in the settings (rig.roles)", 3)
    if series.kind in ("stimulus", "voltage clamp"):
        return Guess("stimulus", f"a {series.kind} series", 3)
    many = series.n_columns > 1
    fields = ({"series": series.name} | dict(words)) if column else dict(words)
    guess = role_of(column or ("" if many and words else series.name), fields,
                    "" if many and (column or words) else series.words, series.unit)
    if guess.strength == 0 and many:
        return role_of(series.name, {}, series.words, series.unit)
    return guess


def _form(series: Series, name: str, column: str, role: str, samples: list[np.ndarray],
          rig: RigSettings) -> tuple[bool, str]:
    for key in (name, series.name):
        if key in rig.forms:
            return rig.forms[key] == "integrated", f"{rig.forms[key]}: named in the settings (rig.forms)"
    said = f"{series.name} {column}".strip()
    return form_of(said, series.words, role, series.times.rate_hz, samples)


def _electrode_words(file: h5py.File, series: Series) -> list[dict[str, str]]:
    """Return what the electrodes table says of each column's electrode."""
    region = child_of(file[series.location], "electrodes")
    table = child_of(file, "general/extracellular_ephys/electrodes")
    nothing: list[dict[str, str]] = [{} for _ in range(series.n_columns)]
    if not isinstance(region, h5py.Dataset) or not isinstance(table, h5py.Group) or region.shape != (series.n_columns,):
        return nothing
    columns = {name: values for name, values in text_columns(table).items() if name.lower() in _TELLING}
    rows = [int(v) for v in region[()]]
    return [{f"electrode {name}": values[row] for name, values in columns.items()
             if row < len(values) and values[row] and values[row].lower() != "unknown"} for row in rows]


def membrane_reason(series: Series) -> str:
    """Return why a series is a membrane potential; empty when it is not one."""
    if series.kind == "current clamp":
        return "a current-clamp series"
    return is_membrane(series.name, series.words, series.unit) if series.kind == "plain" and series.n_columns == 1 else ""
