"""Opening HDF5 files and reading small values from them, with one clear line for each failure.

Reading goes through h5py and not pynwb: it starts in a fraction of the time, streams, and a file
that is broken in one place stays readable in the others.
"""

from __future__ import annotations

import os
from collections.abc import Iterator
from contextlib import contextmanager
from typing import Any

import h5py
import numpy as np

from unitclass.errors import FileError, UnitclassError

_LOCK_REMEDY = "wait until the recording has ended, or work on a copy"


@contextmanager
def opened(path: str) -> Iterator[h5py.File]:
    """Open `path` for reading; every failure to open or to read becomes one line.

    File locking stays as HDF5 does it: a file that is still being recorded is refused.

    Raises
    ------
    FileError
        Naming the file, what is wrong with it and what to do.
    """
    file = _opened_file(path)
    with file, failures_named(path):
        yield file


@contextmanager
def failures_named(path: str) -> Iterator[None]:
    """Turn what h5py raises on damaged content into a FileError that names `path`."""
    try:
        yield
    except UnitclassError:
        raise
    except OSError as error:
        raise _read_error(path, error) from error
    except (KeyError, RuntimeError, ValueError, TypeError, AttributeError, IndexError) as error:
        raise FileError(f"cannot be understood ({_first_line(error)})", where=path,
                        remedy="check it with the NWB validator, or export it again") from error


def _opened_file(path: str) -> h5py.File:
    _check_before_opening(path)
    try:
        return h5py.File(path, "r")
    except OSError as error:
        raise _open_error(path, error) from error


def _check_before_opening(path: str) -> None:
    if not os.path.exists(path):
        raise FileError("there is no such file", where=path, remedy="check the path")
    if os.path.isdir(path):
        raise FileError("is a folder", where=path, remedy="name a file in it")
    if not os.access(path, os.R_OK):
        raise FileError("may not be read by this user", where=path, remedy="change its permissions")
    if os.path.getsize(path) == 0:
        raise FileError("is empty (0 bytes)", where=path, remedy="copy it again from the rig")


def _open_error(path: str, error: OSError) -> FileError:
    said = str(error).lower()
    if isinstance(error, BlockingIOError) or "unable to lock" in said:
        return FileError("is locked: another program is recording it or has it open for writing", where=path,
                         remedy=_LOCK_REMEDY)
    if "already open for write" in said or "consistency flags" in said:
        return FileError("is still being written, or its writer ended without closing it", where=path,
                         remedy=_LOCK_REMEDY)
    if "truncated" in said:
        return FileError("is cut off: it is shorter than its own header says", where=path,
                         remedy="copy it again from the rig")
    if "signature not found" in said:
        return FileError("is not an HDF5 file, so it is not NWB", where=path, remedy="convert it first")
    return FileError(f"cannot be opened ({_first_line(error)})", where=path,
                     remedy="it may be damaged: copy it again from the rig")


def _read_error(path: str, error: OSError) -> FileError:
    said = str(error).lower()
    if "filter" in said or "plugin" in said:
        return FileError(f"is compressed with a filter that is not installed ({_first_line(error)})",
                         where=path, remedy="install the hdf5plugin package, or re-save with gzip")
    if "external" in said:
        return FileError(f"links to a file that cannot be read ({_first_line(error)})", where=path,
                         remedy="put the linked file back beside it")
    return FileError(f"cannot be read in one place ({_first_line(error)})", where=path,
                     remedy="it may be damaged: copy it again from the rig")


def _first_line(error: BaseException) -> str:
    text_ = str(error.args[0]) if isinstance(error, KeyError) and error.args else str(error)
    return (text_.strip().splitlines() or [type(error).__name__])[0][:160]


# --------------------------------------------------------------------------- small values

def text(value: Any) -> str:
    """Return a string attribute or scalar as text, whatever type it was stored with."""
    if value is None or isinstance(value, h5py.Empty):
        return ""
    if isinstance(value, np.ndarray):
        return ", ".join(text(v) for v in value.reshape(-1))
    if isinstance(value, bytes):
        return value.decode("utf-8", errors="replace").strip("\x00").strip()
    return str(value).strip()


def attribute(thing: Any, name: str) -> str:
    """Return an attribute as text; empty when it is absent or cannot be read."""
    try:
        return text(thing.attrs.get(name))
    except (OSError, RuntimeError, TypeError, ValueError, KeyError):
        return ""


def scalar_text(group: h5py.Group, name: str) -> str:
    """Return a scalar dataset or an attribute called `name` as text; empty when neither is there."""
    child = child_of(group, name)
    if isinstance(child, h5py.Dataset):
        return text(child[()]) if child.size else ""
    return attribute(group, name)


def number(value: Any, default: float = np.nan) -> float:
    """Return a scalar or one-element array as a float, `default` when it is neither."""
    try:
        values = np.asarray(value, dtype=float).reshape(-1)
    except (TypeError, ValueError):
        return default
    return float(values[0]) if values.size == 1 else default


def scalar_number(group: h5py.Group, name: str) -> float:
    """Return a scalar dataset or an attribute called `name` as a float; NaN when neither is there."""
    child = child_of(group, name)
    value = child[()] if isinstance(child, h5py.Dataset) and child.size else group.attrs.get(name)
    return np.nan if value is None else number(value)


def child_of(group: h5py.Group, name: str) -> Any:
    """Return the object called `name`, or None when it is absent or its link is broken."""
    try:
        return group.get(name)
    except (KeyError, OSError, RuntimeError):
        return None


def neurodata_type(thing: Any) -> str:
    """Return the NWB type an object says it is; empty when it says nothing."""
    return attribute(thing, "neurodata_type")


def identity(thing: Any) -> tuple[int, str]:
    """Return what is the same for two paths that lead to one object, and differs otherwise."""
    info = h5py.h5o.get_info(thing.id)
    return int(info.fileno), str(info.addr)
