"""Where decisions and cached results are kept."""

from __future__ import annotations

import glob
import hashlib
import os
import tempfile
from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path

from unitclass.errors import TargetError, UsageError
from unitclass.io.decisions import DecisionStore

STORE_NAME = "unitclass.sqlite"
CACHE_NAME = "results.sqlite"


@dataclass(frozen=True)
class StorePlace:
    """Where the store is, and what the user must be told about it (empty: nothing).

    `seed` is an existing store in a folder that cannot be written; its decisions are to be
    copied before the first one is added.
    """

    path: Path
    message: str = ""
    seed: Path | None = None


def store_path(paths: Sequence[str | Path], explicit: str | Path | None = None) -> StorePlace:
    """Return where the decisions of a review of `paths` are kept.

    The file named with --store; else ``unitclass.sqlite`` beside the data; else, where that
    folder cannot be written, a file in the user's data folder.

    Parameters
    ----------
    paths : sequence
        Files, folders and globs as on the command line.

    Raises
    ------
    UsageError
        If the inputs come from several folders and none is named.
    TargetError
        If the named file, or the user's data folder, cannot be written.
    """
    if explicit:
        return _named(Path(explicit))
    beside = _common_folder(paths) / STORE_NAME
    if _can_write(beside):
        return StorePlace(beside)
    return _in_data_folder(beside)


def open_store(place: StorePlace) -> DecisionStore:
    """Open the store at a place, with what is in its seed; raises TargetError, FileError."""
    if place.seed is None:
        return DecisionStore(place.path)
    with DecisionStore(place.seed, is_read_only=True) as seed:
        return seed.copy_to(place.path)


def existing_store(paths: Sequence[str | Path], explicit: str | Path | None = None) -> Path | None:
    """Return the store that a review of `paths` would have left, or None; writes nothing.

    Raises
    ------
    UsageError
        If the file named with --store is missing, or the inputs come from several folders and
        at least one of these holds a store.
    """
    if explicit:
        if not Path(explicit).is_file():
            raise UsageError("there is no such store", where=str(explicit), remedy="check --store")
        return Path(explicit)
    folders = _folders(paths)
    if len(folders) == 1:
        beside = folders[0] / STORE_NAME
        places = (beside,) if _can_write(beside) else (_fallback(beside), beside)
        return next((place for place in places if place.is_file()), None)
    found = [folder / STORE_NAME for folder in folders if (folder / STORE_NAME).is_file()]
    if found:
        raise UsageError("the inputs come from several folders, with decisions in more than one place",
                         where=str(found[0]), remedy="name the store with --store")
    return None


def cache_path() -> Path:
    """Return the file of the result cache, in the user's cache folder."""
    import platformdirs

    return platformdirs.user_cache_path("unitclass") / CACHE_NAME


def _named(path: Path) -> StorePlace:
    if not _can_write(path):
        raise TargetError("the store cannot be written there", where=str(path),
                          remedy="name another file with --store")
    return StorePlace(path)


def _in_data_folder(beside: Path) -> StorePlace:
    path = _fallback(beside)
    try:
        path.parent.mkdir(parents=True, exist_ok=True)
    except OSError as error:
        raise TargetError(f"neither this folder nor {path.parent} can be written ({error.strerror})",
                          where=str(beside.parent), remedy="name a file with --store") from error
    if not _can_write(path):
        raise TargetError(f"neither this folder nor {path.parent} can be written", where=str(beside.parent),
                          remedy="name a file with --store")
    seed = beside if beside.is_file() and not path.exists() else None
    return StorePlace(path, f"{beside.parent} cannot be written; decisions are kept in {path}", seed)


def _fallback(beside: Path) -> Path:
    """Return a file in the user's data folder whose name tells the data's folder."""
    import platformdirs

    folder = beside.parent.resolve()
    mark = hashlib.sha256(os.fsencode(folder)).hexdigest()[:8]
    return platformdirs.user_data_path("unitclass") / f"{folder.name or 'root'}-{mark}.sqlite"


def _common_folder(paths: Sequence[str | Path]) -> Path:
    folders = _folders(paths)
    if not folders:
        raise UsageError("no input to keep decisions for", remedy="name a file or a folder")
    if len(folders) > 1:
        raise UsageError(f"the inputs come from {len(folders)} folders",
                         remedy="name a file for the decisions with --store")
    return folders[0]


def _folders(paths: Sequence[str | Path]) -> list[Path]:
    """Return the folders that hold the inputs; a folder that is an input covers what is in it."""
    given = [Path(path) for path in paths]
    homes = {home.resolve(): home for home in (p if p.is_dir() else _home(p) for p in given)}
    covers = {path.resolve() for path in given if path.is_dir()}
    return [home for place, home in homes.items() if not covers.intersection(place.parents)]


def _home(path: Path) -> Path:
    """Return the folder of a file, or the part of a glob before its first wildcard."""
    if not glob.has_magic(str(path)) or path.exists():
        return path.parent
    first = next(i for i, part in enumerate(path.parts) if glob.has_magic(part))
    return Path(*path.parts[:first])


def _can_write(path: Path) -> bool:
    """Try it: permissions alone do not tell on network shares, nor for the superuser."""
    try:
        if path.exists():
            with open(path, "r+b"):
                pass
        with tempfile.TemporaryFile(dir=path.parent):
            return True
    except OSError:
        return False
