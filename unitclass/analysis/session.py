"""The whole method on one page."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

from unitclass.analysis.beats import Beats, beats_of
from unitclass.analysis.cells import Cell, cells_of, overlap_problem
from unitclass.analysis.rhythm import ConditionCycles, condition_cycles, conditions_of
from unitclass.analysis.units import judge_units
from unitclass.classify.templates import TypeLibrary
from unitclass.errors import FileError
from unitclass.records import ConditionResult, CycleEdit, Recording, SessionResult
from unitclass.settings import Settings


def analyse(recording: Recording, library: TypeLibrary, settings: Settings, *,
            edits: Sequence[CycleEdit] = (), program_version: str = "") -> SessionResult:
    """Return the cycles, the regime and every unit's suggestion, condition by condition.

    Parameters
    ----------
    recording : Recording
        What was read; spikes and traces are streamed from it as they are needed.
    library : TypeLibrary
        Template families.
    edits : sequence of CycleEdit
        What people changed about the cycles.

    Raises
    ------
    FileError
        When there is nothing to analyse: no nerve, no unit, no cycle in any condition, or
        nerve and spikes that do not overlap. The message says which.
    """
    _check_any_cell(recording)
    found = [condition_cycles(recording, condition, settings, edits) for condition in conditions_of(recording)]
    _check_any_cycle(recording, found)
    cells = cells_of(recording, settings)
    beats = beats_of(recording)
    judged = tuple(_judged(one, cells, library, settings, beats) for one in found)
    _check_overlap(recording, judged)
    return _session(recording, judged, library, settings, program_version,
                    notes=tuple(note for cell in cells for note in cell.notes))


def cycles_only(recording: Recording, library: TypeLibrary, settings: Settings, *,
                edits: Sequence[CycleEdit] = (), program_version: str = "") -> SessionResult:
    """Return the cycles and the regime as the nerves alone show it; no units.

    Raises
    ------
    FileError
        When there is no nerve, or no cycle in any condition.
    """
    found = [condition_cycles(recording, condition, settings, edits) for condition in conditions_of(recording)]
    _check_any_cycle(recording, found)
    judged = tuple(_judged(one, (), library, settings, ()) for one in found)
    return _session(recording, judged, library, settings, program_version, notes=())


def _check_any_cell(recording: Recording) -> None:
    if not recording.units and not recording.membranes:
        lost = [line for line in recording.missing if " [/" in line]  # traces that are there but cannot be used
        why = f": {lost[0]}" if lost else ""
        raise FileError(f"holds no units and no membrane potential{why}", where=recording.path,
                        remedy="`unitclass cycles` still gives its breathing cycles")


def _check_overlap(recording: Recording, judged: Sequence[ConditionResult]) -> None:
    """Refuse a session in which no cell has a spike in any cycle because the clocks disagree."""
    if any(unit.n_spikes for condition in judged for unit in condition.units):
        return
    problem = overlap_problem(recording)
    if problem:
        raise FileError(problem, where=recording.path, remedy="check the clocks of the two systems")


def _check_any_cycle(recording: Recording, found: Sequence[ConditionCycles]) -> None:
    if any(one.nerve_cycles.cycles.n_cycles for one in found):
        return
    problem = next((one.problem for one in found if one.problem), "no whole breathing cycle")
    raise FileError(problem, where=recording.path, remedy="try another nerve with --nerve")


def _judged(found: ConditionCycles, cells: Sequence[Cell], library: TypeLibrary,
            settings: Settings, beats: Sequence[Beats]) -> ConditionResult:
    units = judge_units(found, cells, library, settings, beats)
    return ConditionResult(
        condition=found.condition, nerve=found.nerve_cycles.cycles.nerve, nerve_cycles=found.nerve_cycles,
        nerve_profiles=found.profiles, regime_probabilities=units.regime.probabilities,
        regime_reasons=units.regime.reasons, units=units.results, problem=found.problem)


def _session(recording: Recording, judged: tuple[ConditionResult, ...], library: TypeLibrary, settings: Settings,
             program_version: str, *, notes: tuple[str, ...]) -> SessionResult:
    result = SessionResult(
        path=recording.path, session=recording.session, identifier=recording.identifier,
        object_id=recording.object_id, animal=recording.animal, reference=recording.reference,
        conditions=judged, findings=recording.findings, exclusions=recording.exclusions, notes=notes,
        settings_digest=settings.digest(), template_digest=library.digest(), program_version=program_version)
    problems = tuple(f"{c.condition.name or 'whole session'}: {c.problem}" for c in judged if c.problem)
    return replace(result, notes=(*result.notes, *problems))
