"""Odd cycles are named and left out, never deleted: sigh, apnoea, doublet, swallow, gap, edge."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from typing import Any

import numpy as np

from unitclass.records import BoolArray, CycleEdit, Cycles, Exclusion, FloatArray
from unitclass.settings import CycleSettings
from unitclass.signals.levels import running_median
from unitclass.signals.marks import Marks

NEIGHBOURS = 15
ARTEFACT_AMPLITUDE = 4.0
DOUBLET_GAP = 0.35
SWALLOW_LENGTH = 0.45
GAP_S = 0.02


@dataclass
class _Tags:
    """Kind, reason and acceptance while they are being decided; the first tag given stays."""

    kind: list[str]
    reason: list[str]
    accepted: BoolArray

    def put(self, i: int | np.integer[Any], kind: str, reason: str, *, accepted: bool = False) -> None:
        if self.reason[i]:
            return
        self.kind[i], self.reason[i], self.accepted[i] = kind, reason, accepted


@dataclass(frozen=True)
class Draft:
    """Cycles before they are judged; arrays of shape (n_cycles,).

    `swallow` marks cycles with a short extra burst in expiration, `burst` the index into the marks.
    """

    onset_s: FloatArray
    offset_s: FloatArray
    end_s: FloatArray
    height: FloatArray
    swallow: BoolArray
    cut_before: BoolArray
    last: BoolArray
    missing_s: FloatArray


def drafted(marks: Marks, stop_s: float) -> Draft:
    """Return cycles from onset to next onset; short bursts in expiration begin none."""
    length = marks.offset_s - marks.onset_s
    swallow = _swallows(marks, length)
    rows = np.flatnonzero(~swallow)
    onset = marks.onset_s[rows]
    end = np.append(onset[1:], min(stop_s, marks.fine.start_s + marks.fine.values.size / marks.fine.rate_hz))
    hosts = np.searchsorted(rows, np.flatnonzero(swallow)) - 1
    has_swallow = np.zeros(rows.size, bool)
    has_swallow[hosts[hosts >= 0]] = True
    offset = np.where(marks.is_cut_after[rows], np.nan, marks.offset_s[rows])
    return Draft(onset, offset, end, marks.height[rows], has_swallow, marks.is_cut_before[rows],
                 np.arange(rows.size) == rows.size - 1, _missing_seconds(marks, onset, end))


def _swallows(marks: Marks, length: FloatArray) -> BoolArray:
    usual = running_median(length, NEIGHBOURS)
    whole = ~marks.is_cut_before & ~marks.is_cut_after
    short = (length < SWALLOW_LENGTH * usual) & whole
    short[0] = short[0] and marks.n_bursts > 1
    return short


def _missing_seconds(marks: Marks, onset: FloatArray, end: FloatArray) -> FloatArray:
    missing = np.concatenate([[0.0], np.cumsum(~np.isfinite(marks.fine.values))])
    first = np.clip(np.round((onset - marks.fine.start_s) * marks.fine.rate_hz), 0, missing.size - 1).astype(int)
    last = np.clip(np.round((end - marks.fine.start_s) * marks.fine.rate_hz), 0, missing.size - 1).astype(int)
    return (missing[last] - missing[first]) / marks.fine.rate_hz


def tagged(draft: Draft, settings: CycleSettings, exclusions: Sequence[Exclusion], start_s: float) -> tuple[
        tuple[str, ...], tuple[str, ...], BoolArray]:
    """Return kind, reason and acceptance of every cycle, each of length n_cycles."""
    n = draft.onset_s.size
    tags = _Tags(["breath"] * n, [""] * n, np.ones(n, bool))
    _tag_edges(draft, tags)
    _tag_excluded(draft, tags, exclusions, start_s + settings.settling_s)
    _tag_artefacts(draft, tags)
    usual = _usual(draft, tags)
    _tag_sighs(draft, tags, usual, settings)
    _tag_doublets(draft, tags, usual)
    _tag_apnoeas(draft, tags, usual, settings)
    for i in np.flatnonzero(draft.swallow):
        tags.put(i, "artefact", "swallow-like: a short burst in expiration")
    return tuple(tags.kind), tuple(tags.reason), tags.accepted


def _tag_edges(draft: Draft, tags: _Tags) -> None:
    if not draft.onset_s.size:
        return
    if draft.cut_before[0]:
        tags.put(0, "edge", "truncated: its onset lies before the stretch")
    tags.put(draft.onset_s.size - 1, "edge", "truncated: its end lies beyond the stretch")
    for i in np.flatnonzero(draft.missing_s > GAP_S):
        tags.put(i, "artefact", f"gap: {draft.missing_s[i]:.2f} s of the recording are missing or dead")
    for i in np.flatnonzero(draft.cut_before | np.isnan(draft.offset_s)):
        tags.put(i, "artefact", "gap: the burst touches missing or dead recording")


def _tag_excluded(draft: Draft, tags: _Tags, exclusions: Sequence[Exclusion], settled_s: float) -> None:
    for i in np.flatnonzero(draft.onset_s < settled_s):
        tags.put(i, "breath", "settling time after the start of the condition")
    for window in exclusions:
        inside = (draft.onset_s < window.stop_s) & (draft.end_s > window.start_s)
        for i in np.flatnonzero(inside):
            tags.put(i, "breath", f"excluded: {window.reason}")


def _tag_artefacts(draft: Draft, tags: _Tags) -> None:
    usual = running_median(draft.height, NEIGHBOURS)
    for i in np.flatnonzero(draft.height > ARTEFACT_AMPLITUDE * usual):
        ratio = draft.height[i] / usual[i]
        tags.put(i, "artefact", f"movement or other artefact: {ratio:.0f} x the usual amplitude")
        if i:
            tags.put(i - 1, "artefact", "ends in an artefact")


@dataclass(frozen=True)
class _Usual:
    height: FloatArray
    height_cv: float
    te_s: FloatArray
    ttot_s: FloatArray
    ti_s: FloatArray


def _usual(draft: Draft, tags: _Tags) -> _Usual:
    """Return local medians over the cycles that are whole, shape (n_cycles,)."""
    plain = tags.accepted & np.isfinite(draft.offset_s)
    if not plain.any():
        plain = np.isfinite(draft.offset_s) | True
    at = np.flatnonzero(plain)

    def local(values: FloatArray) -> FloatArray:
        return np.interp(np.arange(values.size), at, running_median(values[at], NEIGHBOURS))

    height = local(draft.height)
    ratio = draft.height[at] / np.maximum(height[at], 1e-300)
    cv = 1.4826 * float(np.median(np.abs(ratio - 1)))
    return _Usual(height, cv, local(draft.end_s - draft.offset_s), local(draft.end_s - draft.onset_s),
                  local(draft.offset_s - draft.onset_s))


def _tag_sighs(draft: Draft, tags: _Tags, usual: _Usual, settings: CycleSettings) -> None:
    ratio = draft.height / np.maximum(usual.height, 1e-300)
    sighs = np.flatnonzero(ratio >= max(settings.sigh_amplitude, 1 + 3 * usual.height_cv))
    for i in sighs.tolist():
        tags.put(i, "sigh", f"sigh: {ratio[i]:.1f} x the usual amplitude")
    for i in sighs.tolist():
        for k in range(i + 1, min(i + 1 + settings.after_sigh, draft.onset_s.size)):
            tags.put(k, "breath", "after a sigh")


def _tag_doublets(draft: Draft, tags: _Tags, usual: _Usual) -> None:
    te = draft.end_s - draft.offset_s
    short = (te < DOUBLET_GAP * usual.te_s) & (draft.end_s - draft.onset_s < 0.7 * usual.ttot_s) & ~draft.last
    for i in np.flatnonzero(short):
        tags.put(i, "doublet", f"doublet: the next burst follows after {te[i]:.2f} s")
        tags.put(i + 1, "doublet", "doublet: second burst")


def _tag_apnoeas(draft: Draft, tags: _Tags, usual: _Usual, settings: CycleSettings) -> None:
    ratio = (draft.end_s - draft.offset_s) / np.maximum(usual.te_s, 1e-300)
    for i in np.flatnonzero((ratio >= settings.apnoea_te) & ~draft.last):
        tags.put(i, "breath", f"apnoea: expiration lasts {ratio[i]:.1f} x the usual")


def edited(cycles: Cycles, edits: Sequence[CycleEdit]) -> Cycles:
    """Return cycles with a person's drops and restores applied, in the order given.

    A truncated cycle, or one without an offset, cannot be restored: its end is not known.
    """
    accepted, reason = cycles.accepted.copy(), list(cycles.reason)
    for edit in edits:
        if edit.action not in ("drop", "restore"):
            continue
        rows = np.flatnonzero((cycles.onset_s <= edit.at_s) & (edit.at_s < cycles.end_s))
        for i in rows:
            if edit.action == "restore" and (cycles.kind[i] == "edge" or np.isnan(cycles.offset_s[i])):
                continue
            accepted[i] = edit.action == "restore"
            reason[i] = _edit_reason(edit, cycles.reason[i])
    return replace(cycles, accepted=accepted, reason=tuple(reason))


def _edit_reason(edit: CycleEdit, before: str) -> str:
    done = "dropped" if edit.action == "drop" else "restored"
    who = f" by {edit.reviewer}" if edit.reviewer else ""
    note = f": {edit.note}" if edit.note else ""
    was = f" (was {before})" if before else ""
    return f"{done}{who}{note}{was}"
