"""A copy of an NWB file in another place, with everything it points to still found."""

from __future__ import annotations

import os
import shutil
from collections.abc import Iterator
from pathlib import Path

import h5py

from unitclass.errors import TargetError
from unitclass.io.hdf5 import child_of
from unitclass.io.hdf5 import text as text_of

_TEXT = h5py.string_dtype()


def copy_bytes(source: str, temporary: Path) -> None:
    """Copy `source` byte for byte over `temporary`.

    Raises
    ------
    TargetError
        If the source changes meanwhile.
    OSError
        If the target's disk fills up.
    """
    before = os.stat(source)
    shutil.copyfile(source, temporary)
    after = os.stat(source)
    if (before.st_size, before.st_mtime_ns) != (after.st_size, after.st_mtime_ns):
        raise TargetError("changed while it was being copied", where=source,
                          remedy="wait until the recording has ended")


def relocate_links(path: Path, old_folder: str) -> None:
    """Rewrite what the file at `path` points to by relative path, as it came from `old_folder`.

    That is external links, and the files that image series name.
    """
    new_folder = str(path.parent)
    if os.path.realpath(old_folder) == os.path.realpath(new_folder):
        return
    with h5py.File(path, "r+") as file:
        for group in list(groups_of(file)):
            _relocate_external_links(group, old_folder, new_folder)
            _relocate_image_files(group, old_folder, new_folder)


def _relocate_external_links(group: h5py.Group, old_folder: str, new_folder: str) -> None:
    for name in list(group):
        link = group.get(name, getlink=True)
        if isinstance(link, h5py.ExternalLink):
            del group[name]
            group[name] = h5py.ExternalLink(moved_path(link.filename, old_folder, new_folder), link.path)


def moved_path(path: str, old_folder: str, new_folder: str) -> str:
    """Return how `path`, relative to `old_folder`, is written from `new_folder`; absolute ones stay."""
    if os.path.isabs(path) or "://" in path:
        return path
    found = os.path.join(os.path.realpath(old_folder), path)
    try:
        return Path(os.path.relpath(found, os.path.realpath(new_folder))).as_posix()
    except ValueError:  # another drive
        return found


def groups_of(group: h5py.Group) -> Iterator[h5py.Group]:
    """Yield `group` and every group below it that belongs to this file, each once."""
    seen: set[object] = set()
    waiting = [group]
    while waiting:
        current = waiting.pop()
        key = h5py.h5o.get_info(current.id).addr
        if key in seen:
            continue
        seen.add(key)
        yield current
        waiting += [child for name in current if isinstance(current.get(name, getlink=True), h5py.HardLink)
                    and isinstance(child := child_of(current, name), h5py.Group)]


def _relocate_image_files(group: h5py.Group, old_folder: str, new_folder: str) -> None:
    if not isinstance(group.get("external_file", getlink=True), h5py.HardLink):
        return
    dataset = group["external_file"]
    if not isinstance(dataset, h5py.Dataset) or h5py.check_string_dtype(dataset.dtype) is None or not dataset.size:
        return
    moved = [moved_path(text_of(name), old_folder, new_folder) for name in dataset[()].reshape(-1)]
    attributes = dict(dataset.attrs)
    shape = dataset.shape
    del group["external_file"]
    group.create_dataset("external_file", shape=shape, dtype=_TEXT)[...] = moved if shape else moved[0]
    group["external_file"].attrs.update(attributes)
