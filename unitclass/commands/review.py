"""`unitclass review`: label the units in the terminal."""

from __future__ import annotations

import argparse
from collections.abc import Sequence
from dataclasses import dataclass
from functools import partial
from typing import TYPE_CHECKING, Any

from unitclass.commands.options import add_paths, add_session_options

if TYPE_CHECKING:
    from unitclass.batch import Plan
    from unitclass.io.cached_session import CachedSession
    from unitclass.io.result_cache import CacheKey, ResultCache
    from unitclass.records import Labels, SessionResult, Suggestion
    from unitclass.review.entry import EntryKey
    from unitclass.review.teaching import Lesson
    from unitclass.settings import Settings


def add_arguments(parser: argparse.ArgumentParser) -> None:
    """Declare the options."""
    add_paths(parser)
    parser.add_argument("--reviewer", default="", metavar="NAME", help="who labels (default: the login name)")
    parser.add_argument("--blind", action="store_true", help="hide each suggestion until a label is given")
    parser.add_argument("--pictures", default="", metavar="DIR",
                        help="write every screen as SVG into a folder instead of opening the review")
    add_session_options(parser)


def run(args: argparse.Namespace) -> int:
    """Open the review on what is known already; analyse the rest behind it."""
    from unitclass.commands.options import settings_from
    from unitclass.io.paths import find_files
    from unitclass.io.store_place import open_store, store_path
    from unitclass.review.reviewer import reviewer_name
    from unitclass.review.session import ReviewSession
    from unitclass.tui.terminal import check_terminal

    if args.pictures:
        return _pictures(args)
    check_terminal()
    settings = settings_from(args)
    place = store_path(args.paths, args.store)
    store = open_store(place)
    args.store = str(place.path)
    work = _Work.of(args, settings)
    session = ReviewSession(store, reviewer_name(args.reviewer, settings.review.reviewer),
                            sure_probability=settings.classify.sure_probability, is_blind=args.blind)
    pending, key = [], work.key
    for path in find_files(args.paths):
        known = work.cache.find(path, key, edits_digest_of=store.edits_digest)
        if known is None:
            session.expect([path])
            pending.append(path)
        else:
            session.add_session(known)
    from unitclass.tui.app import ReviewApp, run_review

    app = ReviewApp(session, analyse=partial(analysed, args), take=partial(_taken, work, store), pending=pending,
                    relearn=partial(taught, args) if settings.review.learn else None,
                    group=partial(shape_groups, args), export=partial(exported, args), settings=settings,
                    library=work.library)
    code = run_review(app, mouse=settings.review.mouse)
    if place.message:
        print(place.message)
    print(f"decisions are kept in {place.path}")
    return code


def _pictures(args: argparse.Namespace) -> int:
    """Write the screens as SVG; the decisions on disk are neither read nor changed."""
    import tempfile
    from pathlib import Path

    from unitclass.batch import analyse_file
    from unitclass.commands.options import plan_from
    from unitclass.errors import FileError
    from unitclass.io.decisions import DecisionStore
    from unitclass.io.paths import find_files
    from unitclass.io.session_view import MemorySession
    from unitclass.io.store_place import STORE_NAME
    from unitclass.review.grouping import grouped
    from unitclass.review.session import ReviewSession
    from unitclass.tui.app import ReviewApp
    from unitclass.tui.pictures import save_pictures

    plan = plan_from(args)
    with tempfile.TemporaryDirectory() as folder, DecisionStore(Path(folder) / STORE_NAME) as store:
        store.path = Path(STORE_NAME)  # a picture names no folder of this machine
        session = ReviewSession(store, args.reviewer or "reviewer", is_blind=args.blind)
        views = []
        for outcome in (analyse_file(path, plan) for path in find_files(args.paths)):
            if outcome.result is None:
                raise FileError(outcome.problem)
            views.append(MemorySession(outcome.result))
        session.add_session(*views)
        session.update_groups(grouped(views))
        app = ReviewApp(session, settings=plan.settings, library=lambda: plan.library)
        for path in save_pictures(app, Path(args.pictures)):
            print(path)
    return 0


@dataclass
class _Work:
    """What the review needs of the analysis; the template files are read when first wanted."""

    args: argparse.Namespace
    cache: ResultCache
    settings_digest: str

    @classmethod
    def of(cls, args: argparse.Namespace, settings: Settings) -> _Work:
        from unitclass.io.result_cache import ResultCache
        from unitclass.io.store_place import cache_path

        return cls(args, ResultCache(cache_path()), settings.digest())

    def views(self) -> list[CachedSession]:
        """Return all files' results that are in the cache, with people's cycle edits."""
        from unitclass.io.decisions import DecisionStore
        from unitclass.io.paths import find_files

        key = self.key
        with DecisionStore(self.args.store, is_read_only=True) as store:
            found = [self.cache.find(path, key, edits_digest_of=store.edits_digest)
                     for path in find_files(self.args.paths)]
        return [view for view in found if view is not None]

    def library(self) -> Any:
        from unitclass.io.template_files import read_library

        return read_library(self.args.templates)

    @property
    def key(self) -> CacheKey:
        return cache_key(self.args, self.settings_digest, self.library().digest())


def cache_key(args: argparse.Namespace, settings_digest: str, template_digest: str) -> CacheKey:
    """Return what besides the file shapes its results."""
    from unitclass.commands.options import condition_table
    from unitclass.io.result_cache import CacheKey, cache_options

    options = cache_options(args.nerve, args.condition_column, args.only, condition_table(args))
    return CacheKey(settings_digest, template_digest, options)


def analysed(args: argparse.Namespace, path: str) -> SessionResult | None:
    """Analyse one file and leave the result in the cache; runs in a process of its own.

    Returns the result itself only where the cache cannot be written.

    Raises
    ------
    FileError
        When the file cannot be used.
    """
    from unitclass.batch import analyse_file
    from unitclass.commands.options import plan_from
    from unitclass.errors import FileError
    from unitclass.io.result_cache import FileStamp, ResultCache
    from unitclass.io.store_place import cache_path

    plan: Plan = plan_from(args)
    try:
        stamp = FileStamp.of(path)
    except OSError as error:
        raise FileError("cannot be read", where=path, remedy=error.strerror or str(error)) from error
    outcome = analyse_file(path, plan)
    if outcome.result is None:
        raise FileError(outcome.problem)
    is_kept = ResultCache(cache_path()).put(outcome.result, stamp, plan.key, edits_digest=outcome.edits_digest)
    return None if is_kept else outcome.result


def _taken(work: _Work, store: Any, path: str, result: SessionResult | None) -> Any:
    from unitclass.io.session_view import MemorySession

    if result is not None:
        return MemorySession(result)
    known = work.cache.find(path, work.key, edits_digest_of=store.edits_digest)
    if known is None:
        from unitclass.errors import FileError

        raise FileError("its results were lost from the cache", where=path, remedy="open the review again")
    return known


def taught(args: argparse.Namespace, lessons: Sequence[Lesson]) -> dict[EntryKey, Suggestion]:
    """Return the suggestions that labels change; runs in a process of its own, on cached results."""
    from unitclass.commands.options import settings_from
    from unitclass.review.relearning import relearned

    settings = settings_from(args)
    work = _Work.of(args, settings)
    return relearned(work.views(), lessons, work.library(), settings)


def shape_groups(args: argparse.Namespace) -> dict[EntryKey, str]:
    """Return the units that fire alike; runs in a process of its own, on cached results."""
    from unitclass.commands.options import settings_from
    from unitclass.review.grouping import grouped

    return grouped(_Work.of(args, settings_from(args)).views())


def exported(args: argparse.Namespace, path: str, result: SessionResult, labels: Labels, target: str,
             is_replacing: bool) -> str:
    """Write one labelled copy and return its path; runs in a process of its own."""
    from unitclass.batch import read_planned
    from unitclass.commands.options import plan_from
    from unitclass.io.nwb_write import write_labelled

    plan = plan_from(args)
    write_labelled(path, target, read_planned(path, plan), result, labels, only=args.only, force=is_replacing,
                   settings=plan.settings)
    return target
