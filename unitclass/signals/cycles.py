"""Respiratory cycles of one condition from its nerves: the whole path on one page."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from unitclass.errors import SignalError
from unitclass.records import CycleEdit, Cycles, Envelope, Exclusion, NerveCycles, Signal
from unitclass.settings import Settings
from unitclass.signals.levels import restored
from unitclass.signals.marks import Marks, find_marks, peak_and_area, span_indices
from unitclass.signals.nerves import OtherNerve, measured, read_other
from unitclass.signals.neurogram import Activity, displayed
from unitclass.signals.rhythm import burst_shape, rhythm_evidence
from unitclass.signals.summary import summarised
from unitclass.signals.tags import Draft, drafted, edited, tagged


def find_cycles(reference: Signal, others: Sequence[Signal], *, start_s: float, stop_s: float, settings: Settings,
                exclusions: Sequence[Exclusion] = (), edits: Sequence[CycleEdit] = ()) -> NerveCycles:
    """Return the respiratory cycles of one stretch, each with all that its nerves tell.

    Parameters
    ----------
    reference : Signal
        The nerve whose bursts are inspiration: raw or integrated nerve or muscle, airflow or
        tracheal pressure.
    others : sequence of Signal
        Further nerves: a vagus gives the end of post-inspiration, an abdominal nerve late
        expiration, any of them its lead over the reference.
    start_s, stop_s : float
        One condition on the session clock; nothing outside it is used.
    settings : Settings
        `nerve` and `cycles` apply.
    exclusions : sequence of Exclusion
        Cycles that touch one of these windows are left out.
    edits : sequence of CycleEdit
        A person's decisions for this condition, oldest first.

    Returns
    -------
    NerveCycles
        All cycles, those left out included, with envelopes (reference first), what was assumed
        in words, and what the nerves say of the rhythm regime.

    Raises
    ------
    SignalError
        When the nerve holds no usable sample here or no burst stands clear of its floor.
    """
    # One nerve after the other, the reference last: its traces stay, those of the others are let go.
    nerves, notes = _seen([_read_other(signal, settings, start_s, stop_s) for signal in others])
    marks = find_marks(reference, settings, start_s=start_s, stop_s=stop_s, threshold_scale=_threshold_scale(edits))
    draft = drafted(marks, stop_s)
    cycles = _judged(draft, marks, settings, exclusions, start_s)
    for nerve in nerves:
        cycles = measured(cycles, nerve, settings)
    cycles = edited(cycles, edits)
    has_vagus = any(nerve.fine.role == "vagus" for nerve in nerves)
    rhythm = rhythm_evidence(burst_shape(marks, cycles), cycles, reference.role, has_vagus=has_vagus)
    return NerveCycles(cycles, _envelopes(reference, marks.fine, others, nerves, settings), _words(marks), rhythm,
                       threshold=_threshold(marks), notes=tuple(notes), summary=summarised(cycles, nerves))


def _threshold_scale(edits: Sequence[CycleEdit]) -> float:
    values = [e.value for e in edits if e.action == "threshold" and np.isfinite(e.value) and e.value > 0]
    return values[-1] if values else 1.0


def _judged(draft: Draft, marks: Marks, settings: Settings, exclusions: Sequence[Exclusion], start_s: float) -> Cycles:
    kind, reason, accepted = tagged(draft, settings.cycles, exclusions, start_s)
    stop = np.where(np.isnan(draft.offset_s), draft.end_s, draft.offset_s)
    spans = span_indices(marks.fine, draft.onset_s, stop)
    peak, area = peak_and_area(marks.fine, marks.bursts.floor, spans, settings.nerve.tau_ms / 1000)
    n = draft.onset_s.size
    return Cycles(nerve=marks.fine.name, onset_s=draft.onset_s, offset_s=draft.offset_s, end_s=draft.end_s,
                  accepted=accepted, kind=kind, reason=reason, post_i_end_s=np.full(n, np.nan),
                  late_e=np.full(n, -1), peak=peak, area=area)


def _read_other(signal: Signal, settings: Settings, start_s: float, stop_s: float) -> OtherNerve | str:
    """Return what another nerve shows, or one line that says why it shows nothing."""
    try:
        return read_other(signal, settings, start_s, stop_s)
    except SignalError as error:
        return str(error)


def _seen(found: Sequence[OtherNerve | str]) -> tuple[list[OtherNerve], list[str]]:
    nerves = [nerve for nerve in found if not isinstance(nerve, str)]
    return nerves, [f if isinstance(f, str) else f.note for f in found if isinstance(f, str) or f.note]


def _envelopes(reference: Signal, fine: Activity, others: Sequence[Signal], nerves: Sequence[OtherNerve],
               settings: Settings) -> tuple[Envelope, ...]:
    forms = {signal.name: signal.is_integrated for signal in others}
    first = displayed(fine, settings.nerve, reference.is_integrated)
    return (first, *(displayed(n.fine, settings.nerve, forms[n.fine.name]) for n in nerves))


def _threshold(marks: Marks) -> float:
    bursts = marks.bursts
    level = restored(bursts.fraction * bursts.level, bursts.floor, marks.fine.is_power)
    return float(np.nanmedian(level))


def _words(marks: Marks) -> tuple[str, ...]:
    b = marks.bursts
    return (*marks.fine.words,
            f"bursts found under a centred smoother of {1000 * b.width_s:.0f} ms, "
            f"{b.contrast:.0f} standard deviations above the floor",
            f"a burst counts above {100 * b.fraction:.0f} % of the local burst height",
            "onset and offset where the burst passes a tenth of its peak, without the smoother's lag")
