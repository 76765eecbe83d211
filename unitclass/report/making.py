"""One session's page and figures, from its results to files."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from hashlib import sha256
from pathlib import Path, PurePath

from unitclass.analysis.changes import TypeChange, type_changes, type_of
from unitclass.classify.templates import TypeLibrary
from unitclass.io.atomic import written_whole
from unitclass.records import ConditionResult, Labels, Recording, SessionResult
from unitclass.report.counts import TypedUnit
from unitclass.report.cycles_figure import cycles_figure
from unitclass.report.document import SessionPage, session_html
from unitclass.report.population_figure import population_figure
from unitclass.report.saving import FIGURES, Drawn, Picture, links, picture, save
from unitclass.report.session_figures import changes_figure, conditions_figure
from unitclass.report.unit_figure import Shown, unit_figure
from unitclass.settings import Settings


@dataclass(frozen=True)
class Wanted:
    """What to make: where, in which formats, and which units at full size ("all" for every one)."""

    folder: Path
    formats: tuple[str, ...]
    units: tuple[str, ...] = ()
    force: bool = False
    stretches_s: tuple[tuple[float, float], ...] = ()
    """Start and stop of stretches whose cycle detection is shown, session clock."""

    def wants(self, unit: str) -> bool:
        """Return whether a unit gets its own figure."""
        return unit in self.units or "all" in self.units


@dataclass(frozen=True)
class Session:
    """One session with all that its page needs."""

    recording: Recording
    result: SessionResult
    labels: Labels

    @property
    def stem(self) -> str:
        """Return the name of its files."""
        return PurePath(self.result.path).name.removesuffix(".nwb")


def write_session(session: Session, wanted: Wanted, library: TypeLibrary, settings: Settings) -> Iterator[Path]:
    """Write the page and the figures of one session; yield each file as it is there.

    Raises
    ------
    TargetError
        When a file exists (without `force`) or cannot be written.
    """
    order = type_order(library)
    pictures: dict[str, tuple[Picture, ...]] = {}
    for condition in session.result.conditions:
        kept = []
        for name, drawn in _condition_figures(session, condition, order, wanted.stretches_s):
            files = save(drawn, _stem(session, wanted, condition, name), wanted.formats, force=wanted.force)
            yield from files
            kept.append(picture(drawn, files))
        pictures[condition.condition.name] = tuple(kept)
    whole = []
    for name, drawn in _session_figures(session, order, wanted):
        files = save(drawn, wanted.folder / FIGURES / f"{session.stem}-{name}", wanted.formats, force=wanted.force)
        yield from files
        whole.append(picture(drawn, files))
    unit_files: dict[tuple[str, str], tuple[str, ...]] = {}
    for key, files in _unit_figures(session, wanted):
        yield from files
        unit_files[key] = links(files)
    page = wanted.folder / f"{session.stem}.html"
    text = session_html(SessionPage(session.recording, session.result, session.labels, pictures, tuple(whole), unit_files),
                        library, settings)
    write_page(page, text, force=wanted.force)
    yield page


def write_page(target: Path, text: str, *, force: bool) -> None:
    """Write a page whole, or not at all."""
    with written_whole(str(target), force=force) as path:
        path.write_text(text, encoding="utf-8")


def type_order(library: TypeLibrary) -> tuple[str, ...]:
    """Return the order in which types are listed."""
    return tuple(family.id for family in library.families)


def typed_units(result: SessionResult, labels: Labels) -> Iterator[TypedUnit]:
    """Yield every unit of every condition with its type."""
    for _, unit in result.units():
        label = labels.get(unit.key)
        yield TypedUnit(result.animal or result.session, result.session, unit.condition, unit.unit, type_of(unit, labels),
                        is_decided=label is not None and bool(label.type))


def _condition_figures(session: Session, condition: ConditionResult, order: Sequence[str],
                       stretches_s: Sequence[tuple[float, float]]) -> Iterator[tuple[str, Drawn]]:
    cycles = condition.nerve_cycles.cycles
    if cycles.n_cycles:
        yield "cycles", cycles_figure(session.recording, condition)
        for start, stop in stretches_s:
            if start < float(cycles.end_s[-1]) and stop > float(cycles.onset_s[0]):
                yield f"cycles-{start:g}-{stop:g}", cycles_figure(session.recording, condition, (start, stop))
    if any(unit.n_spikes for unit in condition.units):
        yield "population", population_figure(condition, session.labels, order)


def _session_figures(session: Session, order: Sequence[str], wanted: Wanted) -> Iterator[tuple[str, Drawn]]:
    changes = type_changes(session.result, session.labels)
    for i, (before, after) in enumerate(steps_of(changes)):
        yield f"changes-{i + 1}", changes_figure(changes, before, after, order)
    if len(session.result.conditions) > 1:
        for name in dict.fromkeys(unit.unit for _, unit in session.result.units()):
            if wanted.wants(name):
                mine = [unit for _, unit in session.result.units() if unit.unit == name]
                yield f"unit-{safe_name(name)}-conditions", conditions_figure(mine, session.labels)


def steps_of(changes: Sequence[TypeChange]) -> tuple[tuple[str, str], ...]:
    """Return the pairs of conditions that follow each other."""
    return tuple(dict.fromkeys((c.condition_before, c.condition_after) for c in changes))


def _unit_figures(session: Session, wanted: Wanted) -> Iterator[tuple[tuple[str, str], list[Path]]]:
    """Draw the units asked for; yield each one's key with its files."""
    for condition in session.result.conditions:
        for unit in condition.units:
            if wanted.wants(unit.unit):
                drawn = unit_figure(Shown(session.recording, condition, unit, session.labels.get(unit.key)))
                stem = _stem(session, wanted, condition, f"unit-{safe_name(unit.unit)}")
                yield unit.key, save(drawn, stem, wanted.formats, force=wanted.force)


def _stem(session: Session, wanted: Wanted, condition: ConditionResult, name: str) -> Path:
    where = f"-{safe_name(condition.condition.name)}" if condition.condition.name else ""
    return wanted.folder / FIGURES / f"{session.stem}{where}-{name}"


def safe_name(name: str) -> str:
    """Return a name that any file system takes; one that had to be changed ends in a digest, so that none meet."""
    plain = "".join(c if c.isalnum() or c in "-_." else "_" for c in name)[:60]
    if plain == name.replace(" ", "_"):
        return plain
    return f"{plain}-{sha256(name.encode(errors='surrogatepass')).hexdigest()[:6]}"
