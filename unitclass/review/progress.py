"""How far the review is, and what an export would write."""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, field
from pathlib import Path

from unitclass.io.store_records import ASKS_AGAIN, BATCH, DISAGREEMENT, STALE
from unitclass.review.entry import QueueEntry
from unitclass.review.shelf import FAILED, WAITING, FileState


@dataclass(frozen=True)
class Progress:
    """Counts over units × conditions, of this reviewer except where said.

    `n_reviewed` includes `n_batch` (accepted without looking). `n_later` are part of `n_left`.
    `n_labelled` counts standing labels of anybody; `types` this reviewer's labels by type.
    """

    n_entries: int
    n_reviewed: int
    n_left: int
    n_batch: int
    n_later: int
    n_labelled: int
    n_disagreements: int
    n_stale: int
    n_asks_again: int
    n_files: int
    n_waiting: int
    n_failed: int
    types: Mapping[str, int] = field(default_factory=dict)


def progress_of(rows: Sequence[QueueEntry], files: Sequence[FileState]) -> Progress:
    """Count."""
    states = Counter(f.state for f in files)
    flags = Counter(flag for row in rows for flag in row.label_flags)
    n_reviewed = sum(row.is_reviewed for row in rows)
    return Progress(
        n_entries=len(rows), n_reviewed=n_reviewed, n_left=len(rows) - n_reviewed,
        n_batch=sum(row.own_how == BATCH for row in rows),
        n_later=sum(row.is_later and not row.is_reviewed for row in rows),
        n_labelled=sum(row.is_labelled for row in rows), n_disagreements=flags[DISAGREEMENT],
        n_stale=flags[STALE], n_asks_again=flags[ASKS_AGAIN], n_files=len(files),
        n_waiting=states[WAITING], n_failed=states[FAILED],
        types=dict(sorted(Counter(row.own_type for row in rows if row.own_type).items())))


@dataclass(frozen=True)
class ExportItem:
    """One labelled copy that an export would write, and what it would hold.

    `problem` says why it cannot be written as it stands; empty otherwise.
    """

    path: str
    target: str
    n_entries: int
    n_labelled: int
    n_batch: int
    n_disagreements: int
    n_asks_again: int
    n_stale: int
    problem: str = ""

    @property
    def n_left(self) -> int:
        """Return the units × conditions that would be exported without a label."""
        return self.n_entries - self.n_labelled


def export_plan(rows: Iterable[QueueEntry], files: Sequence[FileState],
                out_dir: str | Path | None = None) -> tuple[ExportItem, ...]:
    """Return what an export would write, file by file.

    The target is ``STEM.labelled.nwb`` beside the source, or directly in `out_dir`.
    """
    by_path: dict[str, list[QueueEntry]] = {f.path: [] for f in files}
    for row in rows:
        by_path.setdefault(row.path, []).append(row)
    targets = {path: _target(path, out_dir) for path in by_path}
    twice = {t for t, n in Counter(targets.values()).items() if n > 1}
    reasons = {f.path: f.reason for f in files if f.state == FAILED}
    waiting = {f.path for f in files if f.state == WAITING}
    return tuple(_item(path, targets[path], listed, _problem(path, targets[path], twice, reasons, waiting))
                 for path, listed in by_path.items())


def _target(path: str, out_dir: str | Path | None) -> str:
    source = Path(path)
    stem = source.stem.removesuffix(".labelled")
    return str((source.parent if out_dir is None else Path(out_dir)) / f"{stem}.labelled.nwb")


def _problem(path: str, target: str, twice: set[str], reasons: Mapping[str, str], waiting: set[str]) -> str:
    if path in reasons:
        return reasons[path]
    if path in waiting:
        return "its analysis has not ended"
    if target in twice:
        return "another file of the same name would be written there"
    return "exists already" if Path(target).exists() else ""


def _item(path: str, target: str, rows: Sequence[QueueEntry], problem: str) -> ExportItem:
    flags = Counter(flag for row in rows for flag in row.label_flags)
    return ExportItem(path, target, len(rows), sum(row.is_labelled for row in rows),
                      sum(row.label is not None and row.label.how == BATCH for row in rows),
                      flags[DISAGREEMENT], flags[ASKS_AGAIN], flags[STALE], problem)
