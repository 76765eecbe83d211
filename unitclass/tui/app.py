"""The review as a program in the terminal."""

from __future__ import annotations

import gc
import os

gc.disable()  # until the first unit is painted: collecting while importing costs a tenth of a second
os.environ.setdefault("TEXTUAL_FPS", "250")  # read once by the toolkit: a repaint waits 4 ms, not 16

import asyncio  # noqa: E402
import signal  # noqa: E402
from collections.abc import Callable, Iterator, Mapping, Sequence  # noqa: E402
from contextlib import suppress  # noqa: E402
from typing import Any  # noqa: E402

from textual.app import App  # noqa: E402
from textual.screen import Screen  # noqa: E402

from unitclass.errors import UnitclassError  # noqa: E402
from unitclass.review.session import ReviewSession  # noqa: E402
from unitclass.settings import Settings  # noqa: E402
from unitclass.tui.desk import Desk  # noqa: E402
from unitclass.tui.keys import KeyMap  # noqa: E402
from unitclass.tui.messages import ANALYSIS, EXPORT, GROUPING, LEARNING, WorkDone  # noqa: E402
from unitclass.tui.screens.base import BaseScreen  # noqa: E402
from unitclass.tui.screens.review import ReviewScreen  # noqa: E402
from unitclass.tui.terminal import check_terminal  # noqa: E402
from unitclass.tui.theme import Theme, background_of_terminal, look_of_terminal  # noqa: E402
from unitclass.tui.workers import Done, Work  # noqa: E402

LABELS_TO_LEARN = 3
EXISTS = "exists already"


class ReviewApp(App[int], inherit_bindings=False):
    """One review session on the screen.

    Parameters
    ----------
    session : ReviewSession
        What is ready already; `pending` files come in while it runs.
    analyse : callable, optional
        analyse(path) -> SessionResult, or anything that `take` understands; run in a process of
        its own: a module-level function or a partial of one. Called for `pending`, and again when
        cycles were edited; it reads the edits from the store itself.
    take : callable, optional
        take(path, what analyse returned) -> SessionView, in this process: opens results that
        the analysis left in the cache, so that nothing large travels.
    pending : sequence of str
        Files still to be analysed.
    relearn : callable, optional
        relearn(lessons) -> {(path, unit, condition): Suggestion}, run in a process too.
    group : callable, optional
        group() -> {(path, unit, condition): shape group}, run in a process too.
    export : callable, optional
        export(path, SessionResult, Labels, target, is_replacing) -> where it was written, run in a
        process too.
    library : callable, optional
        Returns the TypeLibrary; called when it is first needed.
    """

    ENABLE_COMMAND_PALETTE = False

    def __init__(self, session: ReviewSession, *, analyse: Callable[[str], Any] | None = None,
                 pending: Sequence[str] = (), relearn: Callable[..., Mapping[Any, Any]] | None = None,
                 group: Callable[[], Mapping[Any, str]] | None = None,
                 export: Callable[..., str] | None = None, settings: Settings | None = None,
                 library: Callable[[], Any] | None = None,
                 take: Callable[[str, Any], Any] | None = None) -> None:
        for name in ("COLUMNS", "LINES"):  # would hide a resize of the terminal
            os.environ.pop(name, None)
        super().__init__(ansi_color=True)
        self.animation_level = "none"
        review = (settings or Settings()).review
        self.keys = KeyMap.of(review.keys)
        self.desk = Desk(session, library)
        self.inks = Theme(look_of_terminal(), background_of_terminal(review.background))
        self._analyse, self._take, self._export = analyse, take, export
        self._relearn, self._group = relearn, group
        self._pending = list(pending)
        self._works: dict[str, Work] = {}
        self._n_unlearned = 0
        self._has_begun = self._is_group_due = False

    def get_default_screen(self) -> Screen[Any]:
        """Return the review screen."""
        return ReviewScreen(self.desk, self.inks, self.keys)

    @property
    def _review_screen(self) -> ReviewScreen:
        screen = self.screen_stack[0]
        assert isinstance(screen, ReviewScreen)
        return screen

    def other_screen(self, name: str) -> BaseScreen:
        """Return another screen; its module is imported when it is first wanted."""
        from importlib import import_module

        module = import_module(f"unitclass.tui.screens.{name}")
        screen: BaseScreen = getattr(module, f"{name.capitalize()}Screen")(self.desk, self.inks, self.keys)
        return screen

    def begin(self) -> None:
        """Begin with what can wait until the first unit is on the screen, once."""
        if self._has_begun:
            return
        self._has_begun = True
        gc.freeze()
        gc.enable()
        self._leave_on_request()
        if self.desk.library is not None:
            self._review_screen.repaint_soon()
        self._start_analysis()
        self._start_over_all()

    def _leave_on_request(self) -> None:
        """Give the terminal back when the program is asked to end."""
        with suppress(NotImplementedError, ValueError, RuntimeError):  # not the main thread, or Windows
            asyncio.get_running_loop().add_signal_handler(signal.SIGTERM, self.exit, 143, 143)

    def on_unmount(self) -> None:
        """End the processes with the program."""
        for work in self._works.values():
            work.stop()

    # ------------------------------------------------------------------ background work

    def analyse_again(self, paths: Sequence[str]) -> bool:
        """Have files analysed anew; return whether this program can."""
        if self._analyse is None:
            return False
        self._pending += [path for path in paths if path not in self._pending]
        self._start_analysis()
        return True

    def _start_analysis(self) -> None:
        if self._analyse is not None and self._pending and ANALYSIS not in self._works:
            pieces = [(path, (path,)) for path in self._pending]
            self._pending = []
            self._start(ANALYSIS, self._analyse, pieces)

    def _start_over_all(self) -> None:
        """Begin with what looks at all sessions together."""
        self._is_group_due = True
        self._start_grouping()
        self._learn_what_is_there()

    def _start_grouping(self) -> None:
        """Group the units once all sessions are there."""
        if self._group is not None and self._is_group_due and not {ANALYSIS, GROUPING} & self._works.keys():
            self._is_group_due = False
            self._start(GROUPING, self._group, [("shape groups", ())])

    def labels_changed(self) -> None:
        """Count what was decided; after a few decisions the suggestions are made afresh."""
        self._n_unlearned += 1
        self._learn()

    def _learn_what_is_there(self) -> None:
        """Take in labels of an earlier sitting, and new results that labels have not reached."""
        if self.desk.session.lessons():
            self._n_unlearned = LABELS_TO_LEARN
        self._learn()

    def _learn(self) -> None:
        if self._relearn is not None and self._n_unlearned >= LABELS_TO_LEARN and LEARNING not in self._works:
            self._n_unlearned = 0
            self._start(LEARNING, self._relearn, [("labels", (self.desk.session.lessons(),))])

    def start_export(self, is_replacing: bool = False) -> bool:
        """Write every labelled file that can be written; return whether there is one."""
        plan = [item for item in self.desk.session.export_plan()
                if not item.problem or (is_replacing and item.problem == EXISTS)]
        if self._export is None or not plan or EXPORT in self._works:
            return False
        session = self.desk.session

        def pieces() -> Iterator[tuple[str, tuple[Any, ...]]]:
            for item in plan:
                yield item.path, (item.path, session.session_result(item.path), session.labels(item.path),
                                  item.target, is_replacing)

        self._start(EXPORT, self._export, pieces())
        return True

    def _start(self, task: str, function: Callable[..., Any], pieces: Any) -> None:
        self._works[task] = Work(function, pieces, lambda done: self._post(task, done)).start()

    def _post(self, task: str, done: Done | None) -> None:
        if self.is_running:
            self.post_message(WorkDone(task, done))

    def on_work_done(self, message: WorkDone) -> None:
        """Take in what came out of the background."""
        if message.done is None:
            self._works.pop(message.task, None)
            self._start_analysis()
            if message.task == ANALYSIS:
                self._start_over_all()
            self._start_grouping()
            self._learn()
        elif message.task == ANALYSIS:
            self._take_analysis(message.done)
        elif message.task == LEARNING:
            self._take_learned(message.done)
        elif message.task == GROUPING:
            self._take_groups(message.done)
        if message.task == EXPORT:
            self._show_export(message.done)
        for screen in self.screen_stack:
            if isinstance(screen, BaseScreen) and (screen is self._review_screen or message.task == ANALYSIS):
                screen.repaint_soon()

    def _take_analysis(self, done: Done) -> None:
        session, problem = self.desk.session, done.problem
        try:
            if not problem and self._take is not None:
                session.add_session(self._take(done.name, done.result))
            elif not problem:
                session.add_result(done.result)
        except UnitclassError as error:
            problem = str(error)
        if problem:
            session.add_failure(done.name, problem)
            return
        self.desk.forget()
        self._tell_screens(done.name)

    def _tell_screens(self, path: str) -> None:
        """Let screens take in new results: of one file, or, with an empty path, over all of them."""
        for screen in self.screen_stack:
            if hasattr(screen, "results_changed"):
                screen.results_changed(path)

    def _take_learned(self, done: Done) -> None:
        if done.problem:
            self._review_screen.say(f"suggestions stay as they were: {done.problem}", "warn")
        else:
            self.desk.session.update_suggestions(done.result)

    def _take_groups(self, done: Done) -> None:
        if done.problem:
            self._review_screen.say(f"no shape groups: {done.problem}", "warn")
            return
        self.desk.session.update_groups(done.result)
        self._tell_screens("")

    def _show_export(self, done: Done | None) -> None:
        from unitclass.tui.screens.finish import FinishScreen

        for screen in self.screen_stack:
            if isinstance(screen, FinishScreen):
                screen.show_written(done)
                return
        if done is not None:
            self._review_screen.say(f"not written: {done.problem}" if done.problem else f"written: {done.result}",
                                    "warn" if done.problem else "")


def run_review(app: ReviewApp, *, mouse: bool = True) -> int:
    """Show the review until the user leaves; return the exit code.

    Raises
    ------
    UsageError
        Where there is no terminal that could show it.
    """
    check_terminal()
    app.run(mouse=mouse)
    return app.return_code or 0
