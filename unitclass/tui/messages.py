"""What workers and widgets post to the screens: frozen results, never callbacks."""

from __future__ import annotations

from textual.message import Message

from unitclass.tui.workers import Done


class WorkDone(Message):
    """A piece of work in the background came to an end; `task` is ANALYSIS, GROUPING, LEARNING or EXPORT.

    `done` is None when the task has nothing left to do.
    """

    def __init__(self, task: str, done: Done | None) -> None:
        super().__init__()
        self.task, self.done = task, done


class Picked(Message):
    """The mouse chose entry `index` of the list that posted this."""

    def __init__(self, index: int) -> None:
        super().__init__()
        self.index = index


class Stepped(Message):
    """The mouse wheel asks for `steps` units on (negative: back)."""

    def __init__(self, steps: int) -> None:
        super().__init__()
        self.steps = steps


ANALYSIS, GROUPING, LEARNING, EXPORT = "analysis", "grouping", "learning", "export"
