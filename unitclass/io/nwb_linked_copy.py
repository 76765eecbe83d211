"""A copy of an NWB file that leaves the raw acquisition data where it is and links to it."""

from __future__ import annotations

import os
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

import h5py
import numpy as np

from unitclass.errors import TargetError
from unitclass.io.atomic import claim_space
from unitclass.io.nwb_copy import groups_of, moved_path

_RAW = ("data", "timestamps")
_MARGIN_BYTES = 1 << 20


def copy_with_links(source: str, temporary: Path) -> None:
    """Copy `source` over `temporary`, but for the data and timestamps below /acquisition.

    Those become external links to `source` by relative path.

    Raises
    ------
    TargetError
        If the source holds region references, which cannot be carried over.
    OSError
        If the target's disk fills up.
    """
    folder, old_folder = str(temporary.parent), os.path.dirname(os.path.abspath(source))
    linked = moved_path(os.path.basename(source), old_folder, folder)
    with h5py.File(temporary, "w"):
        pass
    with h5py.File(source, "r") as old:
        claim_space(temporary, os.path.getsize(source) - _raw_bytes(old) + _MARGIN_BYTES)
    with h5py.File(source, "r") as old, h5py.File(temporary, "r+") as new:
        copy = _Copy(source, old, new, linked, old_folder, folder)
        copy.group(old, new)
        copy.finish()


@dataclass
class _Copy:
    """One copy under way; `made` maps an object's address in the source to its path in the copy."""

    source: str
    old: h5py.File
    new: h5py.File
    linked: str
    old_folder: str
    new_folder: str
    made: dict[int, str] = field(default_factory=dict)
    waiting: list[tuple[str, str]] = field(default_factory=list)

    def group(self, old: h5py.Group, new: h5py.Group) -> None:
        self._remember(old, new)
        for name in old:
            link = old.get(name, getlink=True)
            if isinstance(link, h5py.ExternalLink):
                path = moved_path(link.filename, self.old_folder, self.new_folder)
                new[name] = h5py.ExternalLink(path, link.path)
            elif isinstance(link, h5py.SoftLink):
                new[name] = h5py.SoftLink(link.path)
            else:
                self._object(old[name], new, name)

    def finish(self) -> None:
        """Copy what may refer to other objects, now that all of them are there."""
        for old_path, new_path in self.waiting:
            old, new = self.old[old_path], self.new[new_path]
            if isinstance(old, h5py.Dataset) and _holds_references(old.dtype):
                new[...] = self._translated(old[()], old.dtype)
            for name in old.attrs:
                self._attribute(old, new, name)

    def _object(self, old: Any, new: h5py.Group, name: str) -> None:
        address = h5py.h5o.get_info(old.id).addr
        if address in self.made:
            new[name] = self.new[self.made[address]]
        elif isinstance(old, h5py.Group):
            self.group(old, new.create_group(name, track_order=_keeps_order(old)))
        elif _is_raw(old, name):
            new[name] = h5py.ExternalLink(self.linked, old.name)
        elif isinstance(old, h5py.Dataset):
            self._dataset(old, new, name)
        else:
            self.old.copy(old, new, name)

    def _dataset(self, old: h5py.Dataset, new: h5py.Group, name: str) -> None:
        if _holds_references(old.dtype):
            new.create_dataset(name, shape=old.shape, dtype=old.dtype, maxshape=old.maxshape, chunks=old.chunks)
        else:
            self.old.copy(old, new, name, without_attrs=True)
        self._remember(old, new[name])

    def _remember(self, old: Any, new: Any) -> None:
        self.made[h5py.h5o.get_info(old.id).addr] = new.name
        self.waiting.append((old.name, new.name))

    def _attribute(self, old: Any, new: Any, name: str) -> None:
        kind = old.attrs.get_id(name).dtype
        value = old.attrs[name]
        if isinstance(value, h5py.Empty):
            new.attrs[name] = value
            return
        if _holds_references(kind):
            value = self._translated(value, kind)
        new.attrs.create(name, value, shape=old.attrs.get_id(name).shape, dtype=kind)

    def _translated(self, value: Any, kind: np.dtype[Any]) -> Any:
        if isinstance(value, h5py.Reference):
            return self._reference(value)
        values = np.array(value, dtype=kind)
        for name in kind.names or ():
            if _holds_references(kind[name]):
                values[name] = self._translated(values[name], kind[name])
        if kind.names is None:
            flat = [self._reference(item) for item in values.reshape(-1)]
            values = np.array([*flat, None], dtype=object)[:-1].reshape(values.shape)
        return values

    def _reference(self, reference: Any) -> Any:
        if isinstance(reference, h5py.RegionReference):
            raise TargetError("holds region references, which a linked copy cannot carry", where=self.source,
                              remedy="export without --link-raw")
        if not reference:
            return h5py.Reference()
        address = h5py.h5o.get_info(self.old[reference].id).addr
        return self.new[self.made[address]].ref if address in self.made else h5py.Reference()


def _raw_bytes(file: h5py.File) -> int:
    return sum(group[name].id.get_storage_size() for group in groups_of(file) for name in _RAW
               if isinstance(group.get(name, getlink=True), h5py.HardLink) and _is_raw(group[name], name))


def _is_raw(thing: Any, name: str) -> bool:
    return (isinstance(thing, h5py.Dataset) and name in _RAW and thing.ndim > 0
            and str(thing.name).startswith("/acquisition/"))


def _holds_references(kind: np.dtype[Any]) -> bool:
    if kind.names:
        return any(_holds_references(kind[name]) for name in kind.names)
    return h5py.check_ref_dtype(kind) is not None


def _keeps_order(group: h5py.Group) -> bool:
    return bool(group.id.get_create_plist().get_link_creation_order())
