"""`unitclass report`: a page per session and one over all of them, with figures."""

from __future__ import annotations

import argparse
from dataclasses import dataclass, field
from typing import TYPE_CHECKING, Any

from unitclass.commands.options import add_crosswalk, add_paths, add_run_options, add_session_options

if TYPE_CHECKING:
    from collections.abc import Mapping

    from unitclass.analysis.changes import TypeChange
    from unitclass.batch import Plan
    from unitclass.commands.runs import Written
    from unitclass.records import SessionResult
    from unitclass.report.counts import TypedUnit
    from unitclass.report.document import SessionLine
    from unitclass.report.making import Session, Wanted

FORMATS = ("svg", "pdf", "png")
MOST_ANIMALS = 4  # whose bars stand side by side; with more, all animals count together


def add_arguments(parser: argparse.ArgumentParser) -> None:
    """Declare the options."""
    add_paths(parser)
    parser.add_argument("--out", required=True, metavar="DIR", help="folder for the pages, figures and tables")
    parser.add_argument("--unit", action="append", default=[], metavar="ID",
                        help="also a figure of this unit as papers show it; may be given again; \"all\" for every unit")
    parser.add_argument("--format", action="append", default=[], choices=FORMATS,
                        help="of the figure files; may be given again (default: all three)")
    parser.add_argument("--stretch", nargs=2, type=float, action="append", default=[], metavar=("START", "STOP"),
                        help="also a figure of cycle detection from START to STOP, s; may be given again")
    add_crosswalk(parser)
    add_session_options(parser)
    add_run_options(parser)


@dataclass
class _Collected:
    """What the page over all sessions needs, kept small."""

    told: Written
    lines: list[SessionLine] = field(default_factory=list)
    units: list[TypedUnit] = field(default_factory=list)
    changes: list[TypeChange] = field(default_factory=list)
    results: list[SessionResult] = field(default_factory=list)
    n_done: int = 0
    n_failed: int = 0
    has_membrane: bool = False

    def add(self, session: Session, page: str) -> None:
        """Take one session in."""
        from dataclasses import replace

        from unitclass.analysis.changes import type_changes
        from unitclass.report.document import SessionLine, has_membrane
        from unitclass.report.making import typed_units

        result = session.result
        units = list(typed_units(result, session.labels))
        self.n_done += 1
        self.has_membrane = self.has_membrane or has_membrane(result)
        self.units += units
        self.changes += type_changes(result, session.labels)
        self.results.append(replace(result, conditions=(), findings=(), notes=()))
        self.lines.append(SessionLine(page, result.session or result.path, result.animal or "not told",
                                      tuple(c.condition.name or "whole session" for c in result.conditions),
                                      len({unit.unit for unit in units}), sum(unit.is_decided for unit in units)))


def run(args: argparse.Namespace) -> int:
    """Classify, then write the pages, figures and tables."""
    from unitclass.commands.labels import words_of
    from unitclass.commands.options import plan_from
    from unitclass.commands.progress import say
    from unitclass.commands.runs import Written, exit_code, run_files
    from unitclass.errors import UnitclassError
    from unitclass.io.atomic import check_target, made_folder
    from unitclass.report.document import SessionLine
    from unitclass.report.making import Wanted
    from unitclass.report.saving import FIGURES

    folder = made_folder(args.out)
    made_folder(str(folder / FIGURES))
    for name in ("index.html", "animals.csv"):
        check_target(str(folder / name), force=args.force)
    plan, found = plan_from(args), _Collected(Written(args))
    words = words_of(args, plan)
    wanted = Wanted(folder, tuple(args.format) or FORMATS, tuple(args.unit), args.force, _stretches(args))
    for outcome in run_files(args, plan):
        problem = outcome.problem
        if outcome.result is not None:
            try:
                _one(outcome.result, plan, words, wanted, found)
            except UnitclassError as error:
                problem = str(error)
            except Exception as error:
                if args.debug:
                    raise
                problem = (f"{outcome.path}: could not be drawn ({type(error).__name__}: {error}); "
                           "run it alone with --debug and report what it prints")
            if problem:
                say(f"unitclass: {problem}")
        if problem:
            found.n_failed += 1
            found.lines.append(SessionLine("", outcome.path, "", (), 0, 0, problem=problem))
    if found.n_done:
        _write_index(found, plan, wanted)
    found.told.end()
    absent = [unit for unit in args.unit if unit != "all" and unit not in {u.unit for u in found.units}]
    if absent:
        say(f"unitclass: no unit {', '.join(absent)} in any session; the pages name every unit")
        found.n_failed += 1
    return exit_code(found.n_failed, found.n_done)


def _stretches(args: argparse.Namespace) -> tuple[tuple[float, float], ...]:
    from unitclass.errors import UsageError

    for start, stop in args.stretch:
        if not 0 < stop - start < float("inf"):
            raise UsageError(f"--stretch {start:g} {stop:g} does not end after it starts",
                             remedy="give START and STOP in seconds")
    return tuple((start, stop) for start, stop in args.stretch)


def _one(result: SessionResult, plan: Plan, words: Mapping[str, str], wanted: Wanted, found: _Collected) -> None:
    from unitclass.batch import read_planned
    from unitclass.commands.labels import in_words
    from unitclass.errors import TargetError
    from unitclass.report.making import Session, write_session

    result, labels = in_words(result, plan, words)
    session = Session(read_planned(result.path, plan), result, labels)
    page = f"{session.stem}.html"
    if page in {line.link for line in found.lines}:
        raise TargetError(f"another session of this run has the page {page}", where=result.path,
                          remedy="report it into another folder")
    for file in write_session(session, wanted, plan.library, plan.settings):
        if file.name == page or "unit-" in file.name:
            found.told.add(file)
    found.add(session, page)


def _write_index(found: _Collected, plan: Plan, wanted: Wanted) -> None:
    from unitclass.io.table_files import write_table
    from unitclass.report.counts import animal_rows, type_counts
    from unitclass.report.document import index_html
    from unitclass.report.making import steps_of, type_order, write_page
    from unitclass.report.methods import methods_paragraph
    from unitclass.report.saving import FIGURES, picture, save
    from unitclass.report.session_figures import changes_figure, counts_figure

    order = type_order(plan.library)
    is_by_animal = len({unit.animal for unit in found.units}) <= MOST_ANIMALS
    figures = [("counts", counts_figure(type_counts(found.units, order, by_animal=is_by_animal), order))]
    figures += [(f"changes-{i + 1}", changes_figure(found.changes, *step, order))
                for i, step in enumerate(steps_of(found.changes))]
    pictures = []
    for name, drawn in figures:
        files = save(drawn, wanted.folder / FIGURES / f"all-{name}", wanted.formats, force=wanted.force)
        pictures.append(picture(drawn, files))
    animals = animal_rows(found.units, order)
    write_table(str(wanted.folder / "animals.csv"), animals, force=wanted.force)
    reviewers, agreement = _agreement(plan, found.results)
    write_page(wanted.folder / "index.html", index_html(
        found.lines, pictures=pictures, animals=animals, agreement=agreement, reviewers=reviewers,
        methods=methods_paragraph(found.results, plan.library, plan.settings, with_membrane=found.has_membrane),
        settings=plan.settings, library=plan.library), force=wanted.force)
    found.told.add(wanted.folder / "animals.csv")
    found.told.add(wanted.folder / "index.html")


def _agreement(plan: Plan, results: list[SessionResult]) -> tuple[tuple[str, ...], list[dict[str, Any]]]:
    """Return who labelled, and how far each pair agrees; nothing without a store."""
    if not plan.store:
        return (), []
    from unitclass.io.decisions import DecisionStore
    from unitclass.review.agreement import StoredSession, agreement, rated_units

    with DecisionStore(plan.store, is_read_only=True) as store:
        report = agreement(rated_units(store, [StoredSession(r.path, r.identifier, r.object_id) for r in results]))
    return report.reviewers, [
        {"condition": pair.condition, "first": pair.confusion.first, "second": pair.confusion.second,
         "kappa": pair.kappa.value, "se": pair.kappa.se, "n_units": pair.kappa.n_units, "n_blind": pair.n_blind}
        for pair in report.pairs]
