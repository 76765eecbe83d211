"""One NWB file as a `Recording`: structure and words now, samples and spikes when asked for."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field
from typing import Any

import h5py

from unitclass.errors import FileError
from unitclass.io.condition_table import ConditionTable
from unitclass.io.conditions import Timeline, read_interval_table, timeline, timeline_from_rows
from unitclass.io.hdf5 import attribute, child_of, opened, scalar_text
from unitclass.io.intracellular import FoundMembranes, Sweep, membranes_of
from unitclass.io.nwb_discover import Contents, checked_version, discover
from unitclass.io.nwb_types import type_parents
from unitclass.io.reference import choose_reference
from unitclass.io.series import Series, read_series
from unitclass.io.signals import FoundSignals, membrane_reason, signals_of
from unitclass.io.timebase import TimeBase, UnusableSeriesError
from unitclass.io.unit_table import read_units
from unitclass.records import Finding, Recording, Signal, Unit
from unitclass.settings import RigSettings


@dataclass
class _Traces:
    """What the file's series turned out to be, gathered one by one."""

    signals: list[Signal] = field(default_factory=list)
    sweeps: list[Sweep] = field(default_factory=list)
    findings: list[Finding] = field(default_factory=list)
    missing: list[str] = field(default_factory=list)


def read_recording(path: str, *, rig: RigSettings, nerve: str = "", condition_column: str = "",
                   condition_table: ConditionTable | None = None) -> Recording:
    """Return what an NWB file offers; nothing large is loaded.

    Parameters
    ----------
    path : str
    rig : RigSettings
        What the laboratory's files call things.
    nerve : str
        Name of the reference nerve; empty lets the program choose.
    condition_column : str
        Column that names the condition.
    condition_table : ConditionTable, optional
        Conditions, animal and cell from a plain table; its rows for this file replace the file's own.

    Raises
    ------
    FileError
        When the file is no NWB 2 file, or is damaged, locked, or holds no signal at all.
    """
    with opened(path) as file:
        version_note = checked_version(file, path)
        contents = discover(file)
        traces = _traces(file, path, contents, rig)
        rows = condition_table.rows_for(path) if condition_table else ()
        found = membranes_of(file, path, traces.sweeps, next((r.cell for r in rows if r.cell), ""))
        span = _span(traces.signals, found)
        units = _units(file, path, contents, span)
        lined = (timeline_from_rows(rows, *span, condition_table.path, rig) if rows and condition_table
                 else _timeline(file, contents, span[1], rig, condition_column))
        animal = next((r.animal for r in rows if r.animal), "") or _animal(file)
        head = _head(file)
    return _recording(path, head, animal, traces, found, units, lined, span, rig, nerve,
                      _broken(contents), version_note)


def _traces(file: h5py.File, path: str, contents: Contents, rig: RigSettings) -> _Traces:
    parents, known, traces = type_parents(file), {}, _Traces()
    times: dict[Any, TimeBase] = known
    for location in contents.series:
        try:
            series = read_series(file, location, parents, times)
        except UnusableSeriesError as problem:
            traces.missing.append(f"{location.rsplit('/', 1)[-1]} [{location}] {problem}")
            continue
        if series is not None:
            _sort_in(traces, file, path, series, rig)
    return traces


def _sort_in(traces: _Traces, file: h5py.File, path: str, series: Series, rig: RigSettings) -> None:
    if series.kind == "voltage clamp":
        traces.findings.append(Finding("voltage clamp", series.name, series.location, "left out: currents, not potentials"))
        return
    reason = membrane_reason(series)
    stated = rig.roles.get(series.name, "")
    if stated == "membrane" or (reason and not stated):
        traces.sweeps.append(Sweep(series, reason or "named in the settings (rig.roles)"))
        return
    if series.kind == "position":
        return
    found: FoundSignals = signals_of(file, path, series, rig)
    traces.signals.extend(found.signals)
    traces.findings.extend(found.findings)


def _span(signals: Sequence[Signal], found: FoundMembranes) -> tuple[float, float]:
    all_signals = [*signals, *(m.signal for m in found.membranes)]
    if not all_signals:
        return 0.0, 0.0
    return min(s.start_s for s in all_signals), max(s.stop_s for s in all_signals)


def _units(file: h5py.File, path: str, contents: Contents, span: tuple[float, float]) -> tuple[Unit, ...]:
    own = [place for place in contents.units if place == "/units"] or list(contents.units[:1])
    return read_units(file, path, own[0], span) if own else ()


def _timeline(file: h5py.File, contents: Contents, stop_s: float, rig: RigSettings, column: str) -> Timeline:
    tables = [read_interval_table(file, place) for place in contents.tables]
    return timeline(tables, stop_s, rig, column=column)


def _animal(file: h5py.File) -> str:
    subject = child_of(file, "general/subject")
    return scalar_text(subject, "subject_id") if isinstance(subject, h5py.Group) else ""


def _head(file: h5py.File) -> dict[str, str]:
    general = child_of(file, "general")
    session = scalar_text(general, "session_id") if isinstance(general, h5py.Group) else ""
    identifier = scalar_text(file, "identifier")
    return {"session": session or identifier, "identifier": identifier, "object_id": attribute(file, "object_id")}


def _broken(contents: Contents) -> list[str]:
    return [f"{link.name} [{link.location}] leads to {link.target}, which is not there" for link in contents.broken]


def _recording(path: str, head: dict[str, str], animal: str, traces: _Traces, found: FoundMembranes,
               units: tuple[Unit, ...], lined: Timeline, span: tuple[float, float], rig: RigSettings, nerve: str,
               broken: list[str], version_note: str) -> Recording:
    choice = choose_reference(traces.signals, nerve, rig.nerve)
    missing = [*broken, *traces.missing, *found.missing, *_missing(choice.name, choice.reason, units, found, lined, animal)]
    if not traces.signals and not found.membranes and not units:
        raise FileError("offers nothing to work on", where=path, remedy=missing[0] if missing else "check the file")
    notes = [Finding("file", "version", "", version_note)] if version_note else []
    counted = [Finding("units", f"{len(units)} units", "/units", _units_reason(units))] if units else []
    return Recording(
        path=path, animal=animal, start_s=span[0], stop_s=span[1], nerves=tuple(traces.signals),
        reference=choice.name, reference_reason=choice.reason, references=dict(rig.references), units=units,
        membranes=found.membranes, conditions=lined.conditions, exclusions=lined.exclusions,
        findings=(*notes, *traces.findings, *found.findings, *counted, *lined.findings),
        missing=tuple(missing), **head)


def _units_reason(units: tuple[Unit, ...]) -> str:
    n_spikes = sum(getattr(u.train, "stop", 0) - getattr(u.train, "first", 0) for u in units)
    stated = sum(u.is_observed_stated for u in units)
    observed = ("observation intervals are given" if stated == len(units)
                else "no observation intervals: the whole recording is assumed observed")
    return f"a table with spike times, {n_spikes} spikes; {observed}"


def _missing(reference: str, reason: str, units: tuple[Unit, ...], found: FoundMembranes, lined: Timeline,
             animal: str) -> list[str]:
    lines = []
    if not reference:
        lines.append(f"reference nerve: {reason}; name one with --nerve")
    if not units and not found.membranes:
        lines.append("units or membrane potential: none")
    if not lined.conditions:
        lines.append("conditions: none, so the whole session is one; --conditions FILE.csv can give them")
    if not animal:
        lines.append("animal: no subject_id; --conditions FILE.csv can give it")
    return lines


def read_identity(path: str) -> tuple[str, str]:
    """Return a session's NWB identifier and object id, without reading anything else.

    Raises
    ------
    FileError
        As `read_recording`.
    """
    with opened(path) as file:
        checked_version(file, path)
        head = _head(file)
    return head["identifier"], head["object_id"]
