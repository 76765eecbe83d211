"""One NWB file as a `Recording`: structure and words now, samples and spikes when asked for."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field, replace
from typing import Any

import h5py

from unitclass.errors import FileError
from unitclass.io.condition_table import ConditionRow, ConditionTable
from unitclass.io.conditions import Timeline, timeline, timeline_from_rows
from unitclass.io.hdf5 import attribute, child_of, opened, scalar_text
from unitclass.io.interval_tables import read_interval_table
from unitclass.io.intracellular import FoundMembranes, Sweep, membranes_of
from unitclass.io.nwb_discover import Contents, checked_version, discover
from unitclass.io.nwb_types import type_parents
from unitclass.io.reference import Lost, choose_reference, named_signal
from unitclass.io.series import Series, read_series
from unitclass.io.signals import signals_of
from unitclass.io.stimuli import stimulus_windows
from unitclass.io.sweeps import joined_sweeps, uniquely_named
from unitclass.io.timebase import TimeBase, UnusableSeriesError
from unitclass.io.unit_table import read_units
from unitclass.records import Finding, Membrane, Recording, Signal, Unit
from unitclass.settings import RigSettings


@dataclass
class _Traces:
    """What the file's series turned out to be, gathered one by one."""

    signals: list[Signal] = field(default_factory=list)
    sweeps: list[Sweep] = field(default_factory=list)
    stimuli: list[Series] = field(default_factory=list)
    findings: list[Finding] = field(default_factory=list)
    missing: list[str] = field(default_factory=list)
    lost: list[Lost] = field(default_factory=list)
    strengths: dict[str, int] = field(default_factory=dict)


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
        found = membranes_of(file, path, traces.sweeps, next((r.cell for r in rows if r.cell), ""),
                             fill=rig.electrode_fill)
        span = _span(traces.signals, found)
        units = _units(file, path, contents, span)
        lined = _timeline(file, path, contents, span, rig, condition_column, rows,
                          condition_table.path if condition_table else "")
        pulses = stimulus_windows(file, path, traces.stimuli, rig)
        animal = next((r.animal for r in rows if r.animal), "") or _animal(file)
        head = _head(file)
    lined = replace(lined, exclusions=(*lined.exclusions, *pulses))
    return _recording(path, head, animal, traces, found, units, lined, span, rig, nerve, version_note)


def _traces(file: h5py.File, path: str, contents: Contents, rig: RigSettings) -> _Traces:
    parents, traces = type_parents(file), _Traces()
    known: dict[Any, TimeBase] = {}
    for link in contents.broken:
        _lose(traces, link.name, link.location, f"leads to {link.target}, which is not there")
    for location in contents.series:
        try:
            series = read_series(file, location, parents, known)
        except UnusableSeriesError as problem:
            _lose(traces, location.rsplit("/", 1)[-1], location, str(problem))
            continue
        if series is not None:
            _sort_in(traces, file, path, series, rig)
    traces.signals = list(joined_sweeps(uniquely_named(sorted(traces.signals, key=_copy_rank))))
    return traces


def _lose(traces: _Traces, name: str, location: str, problem: str) -> None:
    traces.lost.append(Lost(name, problem))
    traces.missing.append(f"{name} [{location}] {problem}")


def _copy_rank(signal: Signal) -> tuple[bool, bool]:
    """Put the raw, acquired copy of a nerve before its others: the first of a role speaks for it."""
    return not signal.location.startswith("/acquisition"), signal.is_integrated


def _sort_in(traces: _Traces, file: h5py.File, path: str, series: Series, rig: RigSettings) -> None:
    if series.kind == "voltage clamp":
        traces.findings.append(Finding("voltage clamp", series.name, series.location, "left out: currents, not potentials"))
        return
    if series.kind == "position":
        traces.findings.append(Finding("left out", series.name, series.location, "a position in space"))
        return
    if series.kind == "stimulus":
        traces.stimuli.append(series)
    found = signals_of(file, path, series, rig)
    traces.signals.extend(found.signals)
    traces.findings.extend(found.findings)
    traces.missing.extend(found.missing)
    traces.lost.extend(Lost(line.split(" [")[0], "has a gain of zero") for line in found.missing)
    traces.strengths.update(found.strengths)
    traces.sweeps.extend(Sweep(c.series, c.guess.reason, c.index, c.name) for c in found.membranes)


def _span(signals: Sequence[Signal], found: FoundMembranes) -> tuple[float, float]:
    all_signals = [*signals, *(m.signal for m in found.membranes)]
    if not all_signals:
        return 0.0, 0.0
    return min(s.start_s for s in all_signals), max(s.stop_s for s in all_signals)


def _units(file: h5py.File, path: str, contents: Contents, span: tuple[float, float]) -> tuple[Unit, ...]:
    own = [place for place in contents.units if place == "/units"] or list(contents.units[:1])
    return read_units(file, path, own[0], span) if own else ()


def _timeline(file: h5py.File, path: str, contents: Contents, span: tuple[float, float], rig: RigSettings,
              column: str, rows: Sequence[ConditionRow], where: str) -> Timeline:
    """Return what the file's tables say; rows of a plain table replace its conditions, not its exclusions."""
    tables = [read_interval_table(file, place) for place in contents.tables]
    lined = timeline(tables, span[1], rig, column="" if rows else column, path=path)
    if not any(row.condition for row in rows):
        return lined
    plain = timeline_from_rows(rows, *span, where, rig)
    kept = tuple(f for f in lined.findings if f.kind == "exclusions")
    return Timeline(plain.conditions, lined.exclusions, (*plain.findings, *kept))


def _animal(file: h5py.File) -> str:
    subject = child_of(file, "general/subject")
    return scalar_text(subject, "subject_id") if isinstance(subject, h5py.Group) else ""


def _head(file: h5py.File) -> dict[str, str]:
    general = child_of(file, "general")
    session = scalar_text(general, "session_id") if isinstance(general, h5py.Group) else ""
    identifier = scalar_text(file, "identifier")
    return {"session": session or identifier, "identifier": identifier, "object_id": attribute(file, "object_id")}


def _recording(path: str, head: dict[str, str], animal: str, traces: _Traces, found: FoundMembranes,
               units: tuple[Unit, ...], lined: Timeline, span: tuple[float, float], rig: RigSettings, nerve: str,
               version_note: str) -> Recording:
    choice = choose_reference(traces.signals, nerve, rig.nerve, strengths=traces.strengths, lost=traces.lost)
    missing = [*traces.missing, *found.missing, *_missing(choice.name, choice.reason, units, found, lined, animal)]
    if not traces.signals and not found.membranes and not units:
        gone = [*traces.missing, *found.missing]
        raise FileError("offers nothing to work on" + (f": {gone[0]}" if gone else " (no nerve, no units, no "
                        "membrane potential)"), where=path, remedy="check what was recorded with `unitclass inventory`"
                        if gone else "name a file with a nerve and units")
    notes = [Finding("file", "version", "", version_note)] if version_note else []
    counted = [Finding("units", f"{len(units)} units", "/units", _units_reason(units))] if units else []
    return Recording(
        path=path, animal=animal, start_s=span[0], stop_s=span[1], nerves=tuple(traces.signals),
        reference=choice.name, reference_reason=choice.reason, references=_references(traces.signals, rig), units=units,
        membranes=_against_reference(found.membranes, traces.signals, choice.name), conditions=lined.conditions,
        exclusions=lined.exclusions, findings=(*notes, *traces.findings, *found.findings, *counted, *lined.findings),
        missing=tuple(missing), **head)


def _references(signals: Sequence[Signal], rig: RigSettings) -> dict[str, str]:
    """Return condition to reference nerve, each by the name the signal has in this file."""
    meant = {condition: named_signal(signals, name) for condition, name in rig.references.items()}
    return {condition: signal.name if signal else rig.references[condition] for condition, signal in meant.items()}


def _against_reference(membranes: Sequence[Membrane], signals: Sequence[Signal], reference: str) -> tuple[Membrane, ...]:
    """Note on every membrane potential that shares no time with the reference nerve."""
    nerve = next((s for s in signals if s.name == reference), None)
    if nerve is None:
        return tuple(membranes)
    return tuple(m if m.signal.start_s < nerve.stop_s and nerve.start_s < m.signal.stop_s else replace(m, notes=(
        *m.notes, f"covers {m.signal.start_s:.1f} to {m.signal.stop_s:.1f} s, the nerve {nerve.name} "
        f"{nerve.start_s:.1f} to {nerve.stop_s:.1f} s: they share no time")) for m in membranes)


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
