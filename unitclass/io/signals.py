"""Every continuous signal of a file, with a guess at what it is."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from typing import Any

import h5py
from numpy.typing import NDArray

from unitclass.io.column_names import column_names, electrode_words
from unitclass.io.forms import form_of
from unitclass.io.roles import Guess, is_membrane, role_of
from unitclass.io.series import Series, peek
from unitclass.records import Finding, Signal
from unitclass.settings import RigSettings

WIDE = 16  # more columns than this without a nerve among them are a probe's


@dataclass(frozen=True)
class ColumnOf:
    """One column of a series, its name as the user sees it, and what it is taken for."""

    series: Series
    index: int
    name: str
    own_name: str
    guess: Guess


@dataclass(frozen=True)
class FoundSignals:
    """The signals of one series, the lines of the inventory about them, and the columns that are cells."""

    signals: tuple[Signal, ...] = ()
    findings: tuple[Finding, ...] = ()
    membranes: tuple[ColumnOf, ...] = ()
    strengths: Mapping[str, int] = field(default_factory=dict)
    missing: tuple[str, ...] = ()


def signals_of(file: h5py.File, path: str, series: Series, rig: RigSettings) -> FoundSignals:
    """Return every column of a series as a signal with its role and its form, and why.

    Columns that are a membrane potential come back as `membranes`, those with a gain of zero as
    lines in `missing`. A wide series without a single nerve's name is one line: a probe.
    """
    columns = _columns(file, series, rig)
    if len(columns) > WIDE and all(c.guess.role == "unknown" for c in columns):
        return FoundSignals(findings=(Finding(
            "left out", series.name, series.location, f"{len(columns)} channels and none named after a nerve: "
            "a probe; name a nerve's channel under [rig] roles to use it"),))
    cells = tuple(c for c in columns if c.guess.role == "membrane")
    dead = [c for c in columns if c.guess.role != "membrane" and series.gains[c.index] == 0]
    left = [c for c in columns if c not in cells and c not in dead]
    samples = peek(file, series) if left else []
    signals = [_signal(path, c, [s[:, c.index] for s in samples], rig) for c in left]
    findings = [_finding(c, s) for c, s in zip(left, signals, strict=True)]
    return FoundSignals(tuple(signals), tuple(findings), cells, {c.name: c.guess.strength for c in left},
                        tuple(f"{c.name} [{series.location}] has a gain of zero" for c in dead))


def _columns(file: h5py.File, series: Series, rig: RigSettings) -> list[ColumnOf]:
    words = electrode_words(file, series)
    own = column_names(file, series, words)
    found = []
    for j in range(series.n_columns):
        name = series.name if series.n_columns == 1 else f"{series.name}/{own[j] or j}"
        found.append(ColumnOf(series, j, name, own[j], _guess(series, name, own[j], words[j], rig)))
    return found


def _guess(series: Series, name: str, own_name: str, words: Mapping[str, str], rig: RigSettings) -> Guess:
    for key in (name, series.name, own_name, series.location):
        if key and key in rig.roles:
            return Guess(rig.roles[key], "named in the settings (rig.roles)", 4)
    if series.kind == "current clamp":
        return Guess("membrane", "a current-clamp series", 3)
    if series.kind == "stimulus":
        return Guess("stimulus", "a stimulus series", 3)
    is_one = series.n_columns == 1
    if series.kind == "plain":
        cell = is_membrane(own_name or series.name, series.words if is_one else "", series.unit)
        if cell:
            return Guess("membrane", cell, 3)
    return _role(series, own_name, words)


def _role(series: Series, own_name: str, words: Mapping[str, str]) -> Guess:
    """Return the role by the column's own name, its electrode, the series' name, then the description."""
    tries: list[tuple[str, Mapping[str, str], str, str]] = [(own_name, {}, "", "")] if own_name else []
    if series.n_columns > 1 and words:
        tries.append(("", {f"electrode {k}": v for k, v in words.items()}, "", ""))
        tries.append((series.name, {}, "", ""))
    else:
        tries.append((series.name, {f"electrode {k}": v for k, v in words.items()}, "", ""))
    described = "" if series.n_columns > 1 and (own_name or words) else series.words
    tries.append(("", {}, described, series.unit))
    guesses = [role_of(*t) for t in tries]
    return next((g for g in guesses if g.strength), guesses[-1])


def _signal(path: str, column: ColumnOf, samples: Sequence[NDArray[Any]], rig: RigSettings) -> Signal:
    series, times = column.series, column.series.times
    is_integrated, why = _form(column, samples, rig)
    return Signal(
        name=column.name, role=column.guess.role, unit=series.unit or "unknown unit", rate_hz=times.rate_hz,
        start_s=times.start_s, stop_s=times.stop_s, reader=series.reader(path, column.index),
        is_integrated=is_integrated, reason=column.guess.reason, form_reason=why, description=series.words,
        location=series.location)


def _form(column: ColumnOf, samples: Sequence[NDArray[Any]], rig: RigSettings) -> tuple[bool, str]:
    for key in (column.name, column.series.name, column.own_name):
        if key and key in rig.forms:
            return rig.forms[key] == "integrated", f"{rig.forms[key]}: named in the settings (rig.forms)"
    name = f"{column.series.name} {column.own_name}".strip()
    words = f"{column.series.words} {_module(column.series.location)}"
    return form_of(name, words, column.guess.role, column.series.times.rate_hz, samples)


def _module(location: str) -> str:
    """Return the words of the groups a series lies in, such as the processing module "integrated"."""
    return " ".join(location.split("/")[2:-1]).replace("_", " ")


def _finding(column: ColumnOf, signal: Signal) -> Finding:
    notes = "".join(f"; {note}" for note in column.series.notes)
    return Finding(column.guess.label or column.guess.role, signal.name, signal.location,
                   f"{signal.reason}; {signal.form_reason}{notes}")
