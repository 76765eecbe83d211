"""Rows of NWB tables as text and numbers, whatever columns a laboratory added."""

from __future__ import annotations

from collections.abc import Mapping, Sequence

import h5py
import numpy as np

from unitclass.io.hdf5 import child_of, neurodata_type, text
from unitclass.records import FloatArray

_NEVER = ("id", "spike_times", "obs_intervals", "electrodes", "electrode_group", "group", "timeseries",
          "waveform_mean", "waveform_sd", "waveforms")


def n_rows(table: h5py.Group) -> int:
    """Return the number of rows of a table."""
    ids = child_of(table, "id")
    return int(ids.shape[0]) if isinstance(ids, h5py.Dataset) else 0


def text_columns(table: h5py.Group, *, skip: Sequence[str] = ()) -> dict[str, list[str]]:
    """Return every column with one plain value (or a list of words) per row as text, in the table's order."""
    rows, found = n_rows(table), {}
    for name in _column_names(table):
        if name in _NEVER or name in skip:
            continue
        values = column_text(table, name, rows)
        if values is not None:
            found[name] = values
    return found


def column_text(table: h5py.Group, name: str, rows: int) -> list[str] | None:
    """Return one column as text; None when its cells are no plain values."""
    data, index = child_of(table, name), child_of(table, f"{name}_index")
    if not isinstance(data, h5py.Dataset) or data.dtype.kind == "V" or h5py.check_ref_dtype(data.dtype):
        return None
    if isinstance(index, h5py.Dataset):
        if data.ndim != 1 or data.dtype.kind not in "OSU":
            return None
        words = [text(v) for v in data[()]]
        stops = index[()].astype(int).tolist()
        starts = [0, *stops[:-1]]
        return [", ".join(words[a:b]) for a, b in zip(starts, stops, strict=True)]
    if data.ndim != 1 or data.shape[0] != rows:
        return None
    elements = _elements(table, name, data)
    if elements:
        return [elements[int(v)] if 0 <= int(v) < len(elements) else "" for v in data[()]]
    return [_shown(v) for v in data[()]]


def _elements(table: h5py.Group, name: str, data: h5py.Dataset) -> list[str]:
    """Return the words that the codes of an EnumData column stand for."""
    if neurodata_type(data) != "EnumData":
        return []
    reference = data.attrs.get("elements")
    found = table.file[reference] if isinstance(reference, h5py.Reference) else child_of(table, f"{name}_elements")
    return [text(v) for v in found[()]] if isinstance(found, h5py.Dataset) else []


def number_column(table: h5py.Group, name: str, rows: int) -> FloatArray:
    """Return one column as numbers, NaN where it holds none, shape (rows,)."""
    data = child_of(table, name)
    if not isinstance(data, h5py.Dataset) or data.shape != (rows,) or data.dtype.kind not in "iuf":
        return np.full(rows, np.nan)
    return np.asarray(data[()], dtype=float)


def region_rows(table: h5py.Group, name: str, rows: int) -> list[list[int]]:
    """Return the rows of another table that each row points at through the column `name`."""
    data, index = child_of(table, name), child_of(table, f"{name}_index")
    if not isinstance(data, h5py.Dataset) or data.dtype.kind not in "iu":
        return [[] for _ in range(rows)]
    values = data[()].astype(int).reshape(-1).tolist()
    if not isinstance(index, h5py.Dataset):
        return [[v] for v in values] if len(values) == rows else [[] for _ in range(rows)]
    stops = index[()].astype(int).tolist()
    return [values[a:b] for a, b in zip([0, *stops[:-1]], stops, strict=True)]


def joined_cells(columns: Mapping[str, list[str]], rows: Sequence[int]) -> dict[str, str]:
    """Return the columns' values in some rows: one where they agree, else all, parted by a slash."""
    return {name: "/".join(dict.fromkeys(values[r] for r in rows if 0 <= r < len(values) and values[r]))
            for name, values in columns.items()}


def _column_names(table: h5py.Group) -> list[str]:
    stored = table.attrs.get("colnames")
    listed = [text(v) for v in np.asarray(stored).reshape(-1)] if stored is not None else []
    others = [n for n in table if n not in listed and not n.endswith(("_index", "_elements")) and n != "id"]
    return listed + others


def _shown(value: object) -> str:
    if isinstance(value, float | np.floating):
        return "" if np.isnan(value) else f"{value:.10g}"
    return text(value)
