"""A copy of an NWB file in another place, with everything it points to still found."""

from __future__ import annotations

import os
import shutil
from collections.abc import Iterator
from pathlib import Path

import h5py
import numpy as np

from unitclass.errors import TargetError
from unitclass.io.atomic import claim_space
from unitclass.io.hdf5 import child_of
from unitclass.io.hdf5 import text as text_of

_MARGIN_BYTES = 1 << 20
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


def relocate(path: Path, source: str, *, links: bool = True) -> None:
    """Make good what the file at `path` points to by relative path, as it came from `source`.

    The files that image series name and, if `links`, external links are rewritten; data that
    HDF5 gathers from other files (virtual and externally stored datasets) is copied, since from
    another folder it would read as fill values without an error.
    """
    old_folder, new_folder = os.path.dirname(os.path.abspath(source)), str(path.parent)
    if os.path.realpath(old_folder) == os.path.realpath(new_folder):
        return
    with h5py.File(source, "r") as original:
        claim_space(path, _gathered_bytes(original) + _MARGIN_BYTES)
    with h5py.File(path, "r+") as file, h5py.File(source, "r") as original:
        for group in list(groups_of(file)):
            if links:
                _relocate_external_links(group, old_folder, new_folder)
            _relocate_image_files(group, old_folder, new_folder)
            for name in list(group):
                _gather(group, name, original)


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
    names = [text_of(name) for name in np.atleast_1d(dataset[()]).reshape(-1)]
    moved = [moved_path(name, old_folder, new_folder) if os.path.exists(os.path.join(old_folder, name)) else name
             for name in names]
    if moved == names:
        return
    attributes = dict(dataset.attrs)
    shape = dataset.shape
    del group["external_file"]
    group.create_dataset("external_file", shape=shape, dtype=_TEXT)[...] = moved if shape else moved[0]
    group["external_file"].attrs.update(attributes)


def _gathered_bytes(file: h5py.File) -> int:
    found = [_scattered(group, name) for group in groups_of(file) for name in group]
    return sum(2 * dataset.size * dataset.dtype.itemsize for dataset in found if dataset is not None)


def _scattered(group: h5py.Group, name: str) -> h5py.Dataset | None:
    """Return the dataset called `name` if its values lie in other files, else None."""
    dataset = child_of(group, name) if isinstance(group.get(name, getlink=True), h5py.HardLink) else None
    if isinstance(dataset, h5py.Dataset) and (dataset.is_virtual or dataset.external):
        return dataset
    return None


def _gather(group: h5py.Group, name: str, original: h5py.File) -> None:
    """Replace a dataset whose values lie in other files by one that holds them."""
    dataset = _scattered(group, name)
    if dataset is None:
        return
    values, attributes = original[dataset.name], dict(dataset.attrs)
    del group[name]
    whole = group.create_dataset(name, shape=values.shape, dtype=values.dtype, chunks=True)
    for chunk in whole.iter_chunks():
        whole[chunk] = values[chunk]
    whole.attrs.update(attributes)
