"""The labelled NWB: a copy of the session with the firing types in it."""

from __future__ import annotations

import errno
import os
import re
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

from unitclass.errors import TargetError, UnitclassError
from unitclass.io.atomic import check_target, written_whole
from unitclass.io.labelled_units import labelled_condition
from unitclass.io.labelling import Labelling, add_labels
from unitclass.io.nwb_check import check_written
from unitclass.io.nwb_copy import copy_bytes, relocate
from unitclass.io.nwb_linked_copy import copy_with_links
from unitclass.io.provenance import run_in_words
from unitclass.io.unit_rows import units_tables
from unitclass.records import Labels, Recording, SessionResult
from unitclass.settings import Settings


def write_labelled(source: str, target: str, recording: Recording, result: SessionResult, labels: Labels, *,
                   only: str = "", link_raw: bool = False, force: bool = False,
                   settings: Settings | None = None) -> None:
    """Write a copy of `source` to `target` with cycles, firing types and histograms in it.

    The source is never opened for writing. The copy grows under a temporary name beside the
    target, is read back and validated, flushed to disk and renamed.

    Parameters
    ----------
    source, target : str
        The session's file, and the file to make.
    recording, result, labels
        What was read from the source, what the method made of it, and what people decided.
    only : str
        Condition whose labels stand in the units table; needed when there are several.
    link_raw : bool
        Link to the raw data below /acquisition instead of copying it.
    force : bool
        Whether a file that is already at `target` may be replaced.
    settings : Settings, optional
        The settings of the run, so that the file can name those that are not at their defaults.

    Raises
    ------
    TargetError
        If the target exists and `force` is false, is the source, cannot be written, or would not
        be valid. Nothing half-written is left.
    FileError
        If the source cannot be read.
    UsageError
        If `only` names no condition.
    """
    _check_apart(source, target)
    check_target(target, force=force)
    condition = labelled_condition(result, only, source)
    labelling = Labelling(recording, result, labels, condition, units_tables(source),
                          run_in_words(result, settings), source)
    with written_whole(target, force=force) as temporary, _failures_named(target):
        _copy(source, temporary, link_raw=link_raw)
        written = add_labels(temporary, labelling)
        check_written(temporary, source, written, target)


def labelled_name(source: str) -> str:
    """Return the file name of the labelled copy of `source`: STEM.labelled.nwb."""
    stem = re.sub(r"\.(nwb\.h5|nwb|h5|hdf5)$", "", os.path.basename(source), flags=re.IGNORECASE)
    return f"{stem}.labelled.nwb"


def _check_apart(source: str, target: str) -> None:
    if os.path.exists(target) and os.path.exists(source) and os.path.samefile(source, target):
        raise TargetError("is the source itself, which is never changed", where=target,
                          remedy="name another file or folder")


def _copy(source: str, temporary: Path, *, link_raw: bool) -> None:
    if link_raw:
        copy_with_links(source, temporary)
    else:
        copy_bytes(source, temporary)
    relocate(temporary, source, links=not link_raw)


@contextmanager
def _failures_named(target: str) -> Iterator[None]:
    """Turn what h5py raises into an OSError with its true number, or one clear line."""
    try:
        yield
    except UnitclassError:
        raise
    except (OSError, RuntimeError, KeyError, ValueError, TypeError) as problem:
        number = _system_error(problem)
        if number:
            raise OSError(number, os.strerror(number)) from problem
        line = (str(problem).strip().splitlines() or [type(problem).__name__])[0][:160]
        raise TargetError(f"could not be written ({line})", where=target,
                          remedy="check the source with the NWB validator") from problem


def _system_error(problem: Exception) -> int:
    if isinstance(problem, OSError) and problem.errno:
        return problem.errno
    found = re.search(r"errno = (\d+)", str(problem))
    return int(found[1]) if found and int(found[1]) in errno.errorcode else 0
