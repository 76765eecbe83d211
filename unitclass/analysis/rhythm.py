"""The cycles of each condition, and the nerves' mean course over them."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from itertools import pairwise

import numpy as np

from unitclass.errors import FileError, SignalError
from unitclass.phase.nerve_profile import nerve_profile
from unitclass.records import (
    Condition,
    CycleEdit,
    Cycles,
    Exclusion,
    NerveCycles,
    NerveProfile,
    Recording,
    RhythmEvidence,
    Signal,
)
from unitclass.settings import Settings
from unitclass.signals.cycles import find_cycles

BESIDE = ("phrenic", "vagus", "hypoglossal", "abdominal", "laryngeal", "cervical", "muscle")
NONE = np.zeros(0)


@dataclass(frozen=True)
class ConditionCycles:
    """One condition's cycles; `problem` says why there are none."""

    condition: Condition
    nerve_cycles: NerveCycles
    profiles: tuple[NerveProfile, ...]
    problem: str = ""

    def brainstem_cycles(self, settings: Settings) -> Cycles:
        """Return the cycles in use, moved by the conduction delay from brainstem to electrode."""
        delay_s = settings.classify.conduction_delay_ms / 1e3
        used = self.nerve_cycles.cycles.used()
        whole = used.select(np.isfinite(used.offset_s))
        return replace(whole, onset_s=whole.onset_s - delay_s, offset_s=whole.offset_s - delay_s,
                       end_s=whole.end_s - delay_s, post_i_end_s=whole.post_i_end_s - delay_s)


def conditions_of(recording: Recording) -> tuple[Condition, ...]:
    """Return the recording's conditions; the whole session, unnamed, when it has none."""
    return recording.conditions or (Condition("", recording.start_s, recording.stop_s),)


def condition_cycles(recording: Recording, condition: Condition, settings: Settings,
                     edits: Sequence[CycleEdit]) -> ConditionCycles:
    """Return the cycles of one condition; what fails there is its problem, not the session's.

    Raises
    ------
    FileError
        When the recording has no reference nerve.
    """
    reference, others = _nerves(recording, condition)
    mine = [edit for edit in edits if edit.condition == condition.name]
    try:
        found = find_cycles(reference, others, start_s=condition.start_s + settings.cycles.settling_s,
                            stop_s=condition.stop_s, settings=settings,
                            exclusions=_exclusions(recording, condition), edits=mine)
    except SignalError as error:
        return ConditionCycles(condition, _nothing(reference.name), (), problem=str(error))
    used = found.cycles.used()
    profiles = tuple(nerve_profile(e, used, n_bins=settings.phase.n_bins) for e in found.envelopes)
    return ConditionCycles(condition, found, profiles)


def _exclusions(recording: Recording, condition: Condition) -> tuple[Exclusion, ...]:
    between = tuple(Exclusion(start, stop, "another condition")
                    for (_, start), (stop, _) in pairwise(condition.spans))
    return (*recording.exclusions, *between)


def _nerves(recording: Recording, condition: Condition) -> tuple[Signal, tuple[Signal, ...]]:
    name = recording.references.get(condition.name, recording.references.get(condition.label, recording.reference))
    try:
        reference = recording.nerve(name)
    except KeyError:
        names = ", ".join(signal.name for signal in recording.nerves) or "none"
        what = f"no nerve called {name!r}" if name else recording.reference_reason or "no nerve was recognised"
        raise FileError(what, where=recording.path, remedy=f"name one with --nerve; the file has: {names}") from None
    seen = {reference.role}
    others = []
    for signal in recording.nerves:
        if signal.role in BESIDE and signal.role not in seen:
            seen.add(signal.role)
            others.append(signal)
    return reference, tuple(others)


def _nothing(nerve: str) -> NerveCycles:
    return NerveCycles(Cycles.plain(NONE, NONE, NONE, nerve), (), (), RhythmEvidence({}, ()))
