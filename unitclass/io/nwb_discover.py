"""Finding what an NWB file holds, by the shape of its groups: series, interval tables, units.

A group with `data` and a sampling rate or time stamps is a series, one with `start_time` and
`stop_time` an interval table, one with `spike_times` a units table, whatever extension made it.
"""

from __future__ import annotations

import os
from collections.abc import Iterator
from dataclasses import dataclass
from typing import Any

import h5py

from unitclass.errors import FileError
from unitclass.io.hdf5 import attribute, child_of, identity, text
from unitclass.io.provenance import is_own as described_as_own

_ROOTS = ("units", "intervals", "acquisition", "processing", "stimulus/presentation", "analysis", "scratch")
_MAX_DEPTH = 8


@dataclass(frozen=True)
class BrokenLink:
    """A place in the file whose content is somewhere else and cannot be reached."""

    location: str
    target: str

    @property
    def name(self) -> str:
        """Return the name of the object the link stands for."""
        return self.location.removesuffix("/data").removesuffix("/timestamps").rsplit("/", 1)[-1]


@dataclass(frozen=True)
class Contents:
    """Locations of what was found, in the order of the file's sections."""

    series: tuple[str, ...] = ()
    tables: tuple[str, ...] = ()
    units: tuple[str, ...] = ()
    broken: tuple[BrokenLink, ...] = ()


def discover(file: h5py.File) -> Contents:
    """Walk the file and return the locations of its series, interval tables and units tables.

    An object that two paths lead to is found once, under the first one.
    """
    found: dict[str, list[Any]] = {"series": [], "tables": [], "units": [], "broken": []}
    seen: set[tuple[int, str]] = set()
    for root in _ROOTS:
        if child_of(file, root) is None and file.get(root, getlink=True) is not None:
            found["broken"].append(BrokenLink(f"/{root}", _target(file.get(root, getlink=True))))
        _visit(file, root, 0, seen, found)
    return Contents(**{kind: tuple(places) for kind, places in found.items()})


def _visit(file: h5py.File, location: str, depth: int, seen: set[tuple[int, str]],
           found: dict[str, list[Any]]) -> None:
    group = child_of(file, location)
    if not isinstance(group, h5py.Group) or depth > _MAX_DEPTH or identity(group) in seen:
        return
    seen.add(identity(group))
    names = list(group)
    broken = list(_broken_links(group, f"/{location}", names))
    found["broken"].extend(broken)
    kind = "" if is_own(group) else _kind(group, names, broken)
    if kind:
        found[kind].append(f"/{location}")
        return
    for name in names:
        _visit(file, f"{location}/{name}", depth + 1, seen, found)


def _kind(group: h5py.Group, names: list[str], broken: list[BrokenLink]) -> str:
    """Return which list of `Contents` a group belongs to; empty when it is a mere container."""
    lost = {link.location.rsplit("/", 1)[-1] for link in broken}
    if "spike_times" in names and "spike_times" not in lost:
        return "units"
    if "start_time" in names and "stop_time" in names:
        return "tables"
    is_timed = "starting_time" in names or ("timestamps" in names and "timestamps" not in lost)
    return "series" if "data" in names and "data" not in lost and is_timed else ""


def is_own(group: Any) -> bool:
    """Tell whether this program made a group or a column: its description says so."""
    return described_as_own(attribute(group, "description"))


def _broken_links(group: h5py.Group, location: str, names: list[str]) -> Iterator[BrokenLink]:
    for name in names:
        link = group.get(name, getlink=True)
        child = child_of(group, name)
        if child is None:
            yield BrokenLink(f"{location}/{name}", _target(link))
        elif name in ("data", "timestamps", "spike_times") and isinstance(child, h5py.Dataset):
            missing = _missing_sources(child)
            if missing:
                yield BrokenLink(f"{location}/{name}", missing)


def _target(link: Any) -> str:
    if isinstance(link, h5py.ExternalLink):
        return f"{link.filename}:{link.path}"
    return str(getattr(link, "path", "an object that is gone"))


def _missing_sources(dataset: h5py.Dataset) -> str:
    """Return a file that a virtual or externally stored dataset needs and that is not there.

    HDF5 reads such data as fill values or nothing without an error, so it must be checked.
    """
    folder = os.path.dirname(os.path.abspath(dataset.file.filename))
    if dataset.is_virtual:
        names = {source.file_name for source in dataset.virtual_sources()} - {"."}
    else:
        names = {text(entry[0]) for entry in dataset.external or ()}
    missing = [n for n in sorted(names) if not any(os.path.exists(os.path.join(d, n)) for d in (folder, "."))]
    return missing[0] if missing else ""


# ------------------------------------------------------------------------------- version

def checked_version(file: h5py.File, path: str) -> str:
    """Return a remark on an oddly stored NWB version; empty for a plain NWB 2 file.

    Raises
    ------
    FileError
        If the file is HDF5 but not NWB, is NWB 1, or has a version that cannot be read.
    """
    stored = file.attrs.get("nwb_version")
    if stored is None and isinstance(child_of(file, "nwb_version"), h5py.Dataset):
        stored = text(file["nwb_version"][()])  # NWB 1 kept it as a dataset
    version = text(stored)
    if not version:
        return _without_version(file, path)
    major = _major(version)
    if major == 1 or major == 0:
        raise FileError(f"is NWB {version.removeprefix('NWB-')}; this program reads NWB 2", where=path,
                        remedy="convert it to NWB 2")
    if major is None:
        raise FileError(f"has an NWB version that cannot be understood ({version!r})", where=path,
                        remedy="set the attribute nwb_version to text such as '2.7.0'")
    if isinstance(stored, str | bytes):
        return ""
    return f"the NWB version is stored oddly (as {_stored_as(stored)}): read as {version}"


def _stored_as(value: Any) -> str:
    return "an array" if getattr(value, "ndim", 0) else "a number"


def _without_version(file: h5py.File, path: str) -> str:
    if attribute(file, "neurodata_type") != "NWBFile" and not {"acquisition", "general"} <= set(file):
        raise FileError("is an HDF5 file but not NWB (it has no nwb_version)", where=path,
                        remedy="convert it to NWB first")
    return "the file does not say its NWB version: read as NWB 2"


def _major(version: str) -> int | None:
    digits = version.strip().removeprefix("NWB-").removeprefix("v").split(".")[0]
    return int(digits) if digits.isdigit() else None
