"""Is a labelled file what it should be? Read back, and validated against the standard."""

from __future__ import annotations

import warnings
from collections.abc import Mapping
from pathlib import Path
from typing import Any

import h5py
import numpy as np

from unitclass.errors import TargetError
from unitclass.io.hdf5 import text as text_of
from unitclass.io.hdf5_tables import Placed, column_names
from unitclass.io.table_columns import Column

Written = Mapping[str, Placed]
"""Path of a table to the columns that were written into it."""


def check_written(temporary: Path, source: str, written: Written, target: str) -> None:
    """Read back what was written, and validate the whole file.

    What is wrong with the source already does not count.

    Raises
    ------
    TargetError
        If a value differs from what was meant, if NWB's own library cannot read the file, or if
        the validator finds something that it does not find in the source.
    """
    with h5py.File(temporary, "r") as file:
        for path, columns in written.items():
            for name, column in columns.items():
                if not _stands_in(file[path], name, column):
                    raise _broken(f"column {name} of {path} does not read back as written", target)
    _check_validity(temporary, source, target)
    _check_reading(temporary, source, target)


def _stands_in(group: h5py.Group, name: str, column: Column) -> bool:
    if name not in column_names(group):
        return False
    if column.points_to == "objects":
        return len(group[name]) == len(column.values)
    stored = group[name][()]
    if column.values.dtype == object:
        return [text_of(value) for value in stored] == [text_of(value) for value in column.values]
    return bool(np.array_equal(stored, column.values, equal_nan=column.values.dtype.kind == "f"))


def _check_validity(temporary: Path, source: str, target: str) -> None:
    found = _validation_errors(str(temporary))
    if not found:
        return
    new = found - _validation_errors(source)
    if new:
        raise _broken(f"it would not be valid NWB ({sorted(new)[0]})", target)


def _validation_errors(path: str) -> set[str]:
    import pynwb

    with warnings.catch_warnings():
        warnings.simplefilter("ignore")
        try:
            # Without the place, which differs when raw data is linked.
            return {f"{error.name}: {error.reason}" for error in pynwb.validate(path=path)}
        except Exception as problem:  # whatever an extension or an old file makes it raise
            return {_line(problem)}


def _check_reading(temporary: Path, source: str, target: str) -> None:
    problem = _reading_problem(str(temporary))
    if problem and not _reading_problem(source):
        raise _broken(f"NWB's own library would not read it ({problem})", target)


def _reading_problem(path: str) -> str:
    import pynwb

    with warnings.catch_warnings():
        warnings.simplefilter("ignore")
        try:
            with pynwb.NWBHDF5IO(path, "r", load_namespaces=True) as file:
                file.read()
        except Exception as problem:
            return _line(problem)
    return ""


def _line(thing: Any) -> str:
    return (str(thing).strip().splitlines() or [type(thing).__name__])[0][:200]


def _broken(what: str, target: str) -> TargetError:
    return TargetError(f"was not written, because {what}", where=target,
                       remedy="please report this with the file's inventory")


