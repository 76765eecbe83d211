"""Which files a command works on: files, folders searched for .nwb, and globs."""

from __future__ import annotations

import glob
import os
from collections.abc import Iterator, Sequence

import h5py

from unitclass.errors import UsageError
from unitclass.io.nwb_discover import is_own

LABELLED = ".labelled.nwb"


def find_files(paths: Sequence[str]) -> tuple[str, ...]:
    """Return the files to work on, each once, in the order named; folders and globs sorted.

    A file that is named is taken whatever it is. In folders and globs the program's own labelled
    copies are passed over, known by their provenance or by their name.

    Raises
    ------
    UsageError
        When a path matches nothing.
    """
    found: dict[str, None] = {}
    for path in paths:
        matches = list(_matches(path))
        if not matches:
            raise UsageError("no NWB file there", where=path,
                             remedy="name a .nwb file, a folder that holds some, or a glob")
        found.update(dict.fromkeys(matches))
    return tuple(found)


def _matches(path: str) -> Iterator[str]:
    if os.path.isdir(path):
        yield from (p for p in _below(path) if not is_labelled_copy(p))
    elif os.path.exists(path):
        yield path
    elif glob.has_magic(path):
        for match in sorted(glob.glob(path, recursive=True)):
            yield from _matches(match) if os.path.isdir(match) else _kept([match])
    elif not os.path.splitext(path)[1]:
        return
    else:
        yield path  # reading it will say that it is not there, and the other files go on


def _below(folder: str) -> Iterator[str]:
    for parent, folders, names in os.walk(folder):
        folders.sort()
        yield from (os.path.join(parent, name) for name in sorted(names)
                    if name.lower().endswith(".nwb") and not name.startswith("."))


def _kept(paths: Sequence[str]) -> Iterator[str]:
    yield from (p for p in paths if p.lower().endswith(".nwb") and not is_labelled_copy(p))


def is_labelled_copy(path: str) -> bool:
    """Tell whether this program wrote the file; a file that cannot be opened is none of ours."""
    if path.lower().endswith(LABELLED):
        return True
    try:
        with h5py.File(path, "r") as file:
            table = file.get("analysis/firing_types")
            return table is not None and is_own(table)
    except (OSError, KeyError, RuntimeError):
        return False
