"""NWB tables and columns in an open HDF5 file: add the program's own, take them out again.

Written with h5py, not pynwb, because files of other laboratories hold much that pynwb cannot
read back (extensions, old namespaces, broken links) and that must stay as it is.
"""

from __future__ import annotations

import re
import uuid
from typing import Any

import h5py
import numpy as np

from unitclass.io.hdf5 import attribute, child_of
from unitclass.io.hdf5 import text as text_of
from unitclass.io.provenance import is_own
from unitclass.io.table_columns import Column, Table

_TEXT = h5py.string_dtype()
_COMPRESSED_FROM = 100_000
_CORE_TYPES = ("TimeIntervals", "Units")


Placed = dict[str, Column]
"""Name under which a column stands in the file to the column."""


def add_table(parent: h5py.Group, table: Table) -> tuple[str, Placed]:
    """Write `table` into `parent`; return its path and its columns.

    A table of that name that is not the program's own is kept; the new one then gets the
    program's name in front.
    """
    group = parent.create_group(_free_name(parent, table.name))
    _mark(group, table.kind)
    group.attrs["description"] = table.description
    _mark(group.create_dataset("id", data=np.arange(table.n_rows)), "ElementIdentifiers")
    return str(group.name), add_columns(group, table.filled)


def add_columns(group: h5py.Group, columns: tuple[Column, ...]) -> Placed:
    """Add columns to a table, each under its name, or with the program's name in front if that is taken.

    References to objects that the file lacks are left out.
    """
    placed: Placed = {}
    for column in columns:
        if column.points_to == "objects" and not all(path in group.file for path in column.values):
            continue
        name = _free_name(group, column.name)
        _write_column(group, name, column)
        placed[name] = column
    _set_column_names(group, [*column_names(group), *placed])
    return placed


def column_names(group: h5py.Group) -> list[str]:
    """Return the names of a table's columns, in order."""
    given = group.attrs.get("colnames")
    return [] if given is None or isinstance(given, h5py.Empty) else [text_of(n) for n in np.atleast_1d(given)]


def row_ids(group: h5py.Group) -> list[str]:
    """Return the ids of a table's rows as text; row numbers where the table has none."""
    ids = child_of(group, "id")
    if isinstance(ids, h5py.Dataset) and ids.ndim == 1:
        return [text_of(value) for value in ids[:]]
    lengths = [len(child) for name in column_names(group)
               if (child := child_of(group, f"{name}_index") or child_of(group, name)) is not None]
    return [str(i) for i in range(lengths[0] if lengths else 0)]


def remove_own_tables(parent: h5py.Group | None) -> None:
    """Remove every table in `parent` that the program wrote."""
    if parent is None:
        return
    for name in list(parent):
        child = own_child(parent, name)
        if isinstance(child, h5py.Group) and is_own(attribute(child, "description")):
            del parent[name]


def remove_own_columns(group: h5py.Group) -> None:
    """Remove every column of a table that the program wrote."""
    own = {name for name in column_names(group)
           if (child := child_of(group, name)) is not None and is_own(attribute(child, "description"))}
    for name in own:
        del group[name]
        if f"{name}_index" in group:
            del group[f"{name}_index"]
    if own:
        _set_column_names(group, [name for name in column_names(group) if name not in own])


def own_child(group: h5py.Group, name: str) -> Any:
    """Return the object called `name` if it lives in this very file, else None.

    Following a link to another file that is open for writing would open that file for writing.
    """
    return child_of(group, name) if isinstance(group.get(name, getlink=True), h5py.HardLink) else None


def _write_column(group: h5py.Group, name: str, column: Column) -> None:
    data = _stored(group.file, column)
    dataset = group.create_dataset(name, data=data, dtype=data.dtype,
                                   compression="gzip" if data.nbytes > _COMPRESSED_FROM else None)
    is_region = column.points_to not in ("", "objects")
    _mark(dataset, "DynamicTableRegion" if is_region else "VectorData")
    dataset.attrs["description"] = column.description
    if is_region:
        dataset.attrs["table"] = group.file[column.points_to].ref
    if np.isfinite(column.resolution_s):
        dataset.attrs["resolution"] = column.resolution_s
    if column.lengths is not None:
        index = group.create_dataset(f"{name}_index", data=np.cumsum(column.lengths).astype(np.uint64))
        _mark(index, "VectorIndex")
        index.attrs["description"] = f"where each row's cell of {name} ends"
        index.attrs["target"] = dataset.ref


def _stored(file: h5py.File, column: Column) -> np.ndarray[Any, Any]:
    values = column.values
    if column.points_to == "objects":
        return np.array([file[path].ref for path in values], dtype=h5py.ref_dtype)
    if values.dtype == object:
        return values.astype(_TEXT)
    if column.points_to:
        return values
    if not column.points_to and values.dtype.kind in "if" and values.size and set(np.unique(values)) == {0, 1}:
        return values.astype(np.int8)  # wider, readers take such a column for a mistaken yes/no
    return values


def _mark(thing: Any, kind: str) -> None:
    thing.attrs["neurodata_type"] = kind
    thing.attrs["namespace"] = "core" if kind in _CORE_TYPES else _table_namespace(thing.file)
    thing.attrs["object_id"] = str(uuid.uuid4())
    if _version(thing.file) == (2, 0):
        thing.attrs["help"] = "see description"


def _set_column_names(group: h5py.Group, names: list[str]) -> None:
    # Until 2.2 the standard wants ASCII, which readers tell by a fixed length.
    wants_ascii = _version(group.file) <= (2, 2) and all(name.isascii() for name in names)
    kind = h5py.string_dtype("ascii", max(map(len, names), default=1)) if wants_ascii else _TEXT
    group.attrs.create("colnames", names, shape=(len(names),), dtype=kind)


def _free_name(group: h5py.Group, name: str) -> str:
    candidates = [name, f"unitclass_{name}", *(f"unitclass_{name}_{i}" for i in range(2, 1000))]
    return next(c for c in candidates if c not in group)


def _table_namespace(file: h5py.File) -> str:
    """Return the namespace that holds tables: hdmf-common since NWB 2.2, core before."""
    has_own = "hdmf-common" in (child_of(file, "specifications") or ())
    return "core" if _version(file) < (2, 2) and not has_own else "hdmf-common"


def _version(file: h5py.File) -> tuple[int, int]:
    found = re.match(r"(\d+)\.(\d+)", attribute(file, "nwb_version"))
    return (int(found[1]), int(found[2])) if found else (2, 99)
