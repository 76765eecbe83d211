"""The pages: one for each session, one over all of them. Self-contained, text from files escaped."""

from __future__ import annotations

from collections import Counter
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from functools import lru_cache
from pathlib import Path
from typing import Any

import numpy as np

from unitclass import __version__
from unitclass.analysis.changes import type_of
from unitclass.classify.templates import TypeLibrary
from unitclass.io.safe_text import safe_text
from unitclass.records import ConditionResult, Cycles, Labels, Recording, SessionResult, UnitResult
from unitclass.report.glance import glance
from unitclass.report.methods import REFERENCES, methods_paragraph
from unitclass.report.saving import Picture
from unitclass.settings import Settings
from unitclass.signals.summary import MEASURES

PAGES = Path(__file__).parent / "pages"


@dataclass(frozen=True)
class SessionPage:
    """What the page of one session is made of."""

    recording: Recording
    result: SessionResult
    labels: Labels
    pictures: Mapping[str, tuple[Picture, ...]]
    """Condition to its figures."""
    whole: tuple[Picture, ...] = ()
    """Figures of the whole session."""
    unit_files: Mapping[tuple[str, str], tuple[str, ...]] = field(default_factory=dict)
    """Key of a unit to the files of its full figure."""


@dataclass(frozen=True)
class SessionLine:
    """One session in the page over all of them."""

    link: str
    session: str
    animal: str
    conditions: tuple[str, ...]
    n_units: int
    n_decided: int
    problem: str = ""


def session_html(page: SessionPage, library: TypeLibrary, settings: Settings) -> str:
    """Return the page of one session."""
    decided = sum(bool(label.type) for label in page.labels.values())
    return str(_environment().get_template("session.html").render(
        version=__version__, result=page.result, recording=page.recording, n_decided=decided,
        conditions=[_condition(c, page) for c in page.result.conditions], whole=page.whole,
        methods=methods_paragraph([page.result], library, settings, with_membrane=has_membrane(page.result)),
        references=REFERENCES,
        settings=list(settings.tunables()), templates=_template_rows(library)))


def index_html(lines: Sequence[SessionLine], *, pictures: Sequence[Picture], animals: Sequence[Mapping[str, Any]],
               agreement: Sequence[Mapping[str, Any]], reviewers: Sequence[str], methods: str,
               settings: Settings, library: TypeLibrary) -> str:
    """Return the page over all sessions."""
    return str(_environment().get_template("index.html").render(
        version=__version__, lines=lines, pictures=pictures, animals=animals, agreement=agreement, reviewers=reviewers,
        methods=methods, references=REFERENCES, settings=list(settings.tunables()),
        templates=_template_rows(library), n_decided=sum(line.n_decided for line in lines),
        n_units=sum(line.n_units for line in lines)))


def has_membrane(result: SessionResult) -> bool:
    """Return whether a unit of the session was read from a membrane potential."""
    return any(unit.vm is not None for _, unit in result.units())


@lru_cache(maxsize=1)
def _environment() -> Any:
    from jinja2 import Environment, FileSystemLoader, StrictUndefined

    made = Environment(loader=FileSystemLoader(PAGES), autoescape=True, undefined=StrictUndefined, trim_blocks=True,
                       lstrip_blocks=True, finalize=lambda value: safe_text(value) if isinstance(value, str) and not
                       hasattr(value, "__html__") else value)
    made.filters["p"] = lambda value: "" if value != value else f"{value:.2f}"
    made.filters["g"] = lambda value: "" if value is None or value != value else f"{value:.3g}"
    return made


def _condition(condition: ConditionResult, page: SessionPage) -> dict[str, Any]:
    cycles = condition.nerve_cycles.cycles
    nerve = condition.nerve_profiles[0] if condition.nerve_profiles else None
    name = condition.condition.name
    return {
        "it": condition, "name": name or "whole session", "n_used": int(cycles.accepted.sum()),
        "n_all": cycles.n_cycles, "left_out": _left_out(cycles), "pictures": page.pictures.get(name, ()),
        "summary": _summary(condition.nerve_cycles.summary),
        "units": [_unit(unit, page, glance(unit, nerve)) for unit in condition.units],
        "counts": Counter(type_of(unit, page.labels) for unit in condition.units).most_common()}


def _left_out(cycles: Cycles) -> list[tuple[str, int]]:
    """Return why cycles are not used, and how many for each reason."""
    told = zip(cycles.kind, cycles.reason, cycles.accepted, strict=True)
    return Counter((reason or kind).split(":")[0] for kind, reason, used in told if not used).most_common()


def _summary(summary: Mapping[str, float]) -> list[tuple[str, float, float, str]]:
    return [(words, summary.get(name, np.nan), summary.get(f"{name}_all", np.nan), unit)
            for name, words, unit in MEASURES if name in summary]


def _unit(unit: UnitResult, page: SessionPage, picture: str) -> dict[str, Any]:
    from markupsafe import Markup

    f = unit.features
    label = page.labels.get(unit.key)
    return {
        "it": unit, "label": label, "picture": Markup(picture), "files": page.unit_files.get(unit.key, ()),
        "peak_hz": float(np.nan_to_num(unit.histogram.rate_hz).max(initial=0.0)),
        "flags": [*unit.flags, *(label.flags if label else ())], "ranked": unit.suggestion.ranked[:3],
        "features": [("onset, peak, offset", f"phase {_g(f.onset_phase)}, {_g(f.peak_phase)}, {_g(f.offset_phase)}"),
                     ("rate in I, in E", f"{_g(f.rate_i_hz)}, {_g(f.rate_e_hz)} spikes/s"),
                     ("lead", f"{_g(f.lead_ms)} ms"), ("takes part in", f"{_g(100 * f.participation)} % of cycles"),
                     ("eta squared", f"{_g(unit.modulation.eta_squared)}, q {_g(unit.q_value)}"),
                     *((str(k), str(v)) for k, v in unit.columns.items())]}


def _g(value: float) -> str:
    return f"{value:.3g}" if value == value else "not told"


def _template_rows(library: TypeLibrary) -> list[tuple[str, str, str]]:
    return [(family.id, family.words, "; ".join(family.sources)) for family in library.families]
