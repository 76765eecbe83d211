"""What workers and widgets post to the screens: frozen results, never callbacks."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

from textual.message import Message


@dataclass
class Analysed(Message):
    """One session is analysed; `result` is what the analysis returned."""

    path: str
    result: Any


@dataclass
class AnalysisFailed(Message):
    """One session could not be analysed; `reason` is one line for the user."""

    path: str
    reason: str


@dataclass
class AnalysisEnded(Message):
    """Nothing is being analysed any more."""


@dataclass
class Learned(Message):
    """Suggestions were made afresh from the labels; `result` is what the learner returned."""

    result: Any


@dataclass
class Exported(Message):
    """Labelled files are written; `paths` says where, `problems` what went wrong with others."""

    paths: tuple[str, ...]
    problems: tuple[str, ...]


@dataclass
class Picked(Message):
    """The mouse chose entry `index` of the list that posted this."""

    index: int
