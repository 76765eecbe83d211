"""Words that travel with a labelled file: who made it, with what, and how to repeat it."""

from __future__ import annotations

from collections.abc import Iterable

from unitclass.io.safe_text import safe_text
from unitclass.records import ConditionResult, SessionResult
from unitclass.settings import Settings

MARK = "unitclass"
"""Every description the program writes begins with this; nothing else tells its tables from a laboratory's."""


def is_own(description: str) -> bool:
    """Return whether a table or column with this description was written by this program."""
    return description.split(" ")[0].rstrip(":,") == MARK


def described(result: SessionResult, what: str) -> str:
    """Return the first words of a description: program, version, and `what` is described."""
    return f"{MARK} {safe_text(result.program_version)}: {what}"


def run_in_words(result: SessionResult, settings: Settings | None = None) -> str:
    """Return what is needed to repeat the run: source, digests, settings, nerves, conditions."""
    parts = [
        f"Source: session {result.session or result.identifier}, object id {result.object_id}.",
        f"Settings {result.settings_digest}{_changed(settings)}; templates {result.template_digest}.",
        f"Reference nerve {result.reference}.",
        *map(_condition_in_words, result.conditions),
        _listed("Left out", (f"{e.start_s:.3f} to {e.stop_s:.3f} s, {e.reason}" for e in result.exclusions)),
        _listed("Notes", result.notes),
        f"To repeat: {MARK} classify with the same version, settings and templates.",
    ]
    return " ".join(safe_text(part) for part in parts if part)


def _changed(settings: Settings | None) -> str:
    if settings is None:
        return ""
    usual = {t.name: t.value for t in Settings().tunables()}
    changed = [f"{t.name} = {t.value!r}" for t in settings.tunables()
               if t.value != usual[t.name] and not t.name.startswith("review.")]
    return f" ({', '.join(changed)})" if changed else " (all at their defaults)"


def _condition_in_words(condition: ConditionResult) -> str:
    cycles = condition.nerve_cycles.cycles
    spans = " and ".join(f"{start:.3f} to {stop:.3f} s" for start, stop in condition.condition.spans)
    regime = condition.regime
    return (f"Condition {condition.condition.name or '(the whole file)'}: {spans}, nerve {condition.nerve}, "
            f"{int(cycles.accepted.sum())} of {cycles.n_cycles} cycles used"
            + (f", {regime} rhythm with probability {condition.regime_probabilities[regime]:.2f}" if regime else "")
            + _listed("", condition.nerve_cycles.detection, start=": ") + ".")


def _listed(head: str, parts: Iterable[str], start: str = ": ") -> str:
    text = "; ".join(parts)
    return f"{head}{start}{text}{'.' if head else ''}" if text else ""
