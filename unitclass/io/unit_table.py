"""Sorted units: their spike times when asked for, their observation intervals, their columns."""

from __future__ import annotations

import os
from collections.abc import Sequence
from dataclasses import dataclass
from functools import lru_cache

import h5py
import numpy as np

from unitclass.errors import FileError
from unitclass.io.dynamic_tables import joined_cells, region_rows, text_columns
from unitclass.io.hdf5 import attribute, child_of, opened
from unitclass.io.hdf5_tables import row_ids
from unitclass.io.nwb_discover import is_own
from unitclass.records import FloatArray, IntArray, Unit

BLOCK = 2_000_000  # spike times checked at once


@dataclass(frozen=True)
class SpikeTimes:
    """Reads one unit's slice of the table's spike times.

    Units are asked for one after the other, so the block of the table that holds a unit is kept in
    the process for the next one: a compressed chunk is decompressed once, not once per unit.
    """

    path: str
    dataset: str
    first: int
    stop: int

    def read(self) -> FloatArray:
        """Return the finite spike times in seconds, ascending, shape (n_spikes,)."""
        if self.stop <= self.first:
            return np.zeros(0)
        stamp = os.stat(self.path) if os.path.exists(self.path) else None
        version = (stamp.st_mtime_ns, stamp.st_size) if stamp else (0, 0)
        places = range(self.first // BLOCK, (self.stop - 1) // BLOCK + 1)
        parts = [_block(self.path, version, self.dataset, place)[max(0, self.first - place * BLOCK):
                                                                self.stop - place * BLOCK] for place in places]
        times = parts[0] if len(parts) == 1 else np.concatenate(parts)
        times = times[np.isfinite(times)]
        return times if np.all(times[1:] >= times[:-1]) else np.sort(times)


@lru_cache(maxsize=2)
def _block(path: str, version: tuple[int, int], dataset: str, place: int) -> FloatArray:
    """Return spike times place × BLOCK onward; `version` makes a changed file another block."""
    with opened(path) as file:
        return np.asarray(file[dataset][place * BLOCK : (place + 1) * BLOCK], dtype=float)


def read_units(file: h5py.File, path: str, location: str, span_s: tuple[float, float]) -> tuple[Unit, ...]:
    """Return the units of a units table.

    Parameters
    ----------
    location : str
        Of the table in the file.
    span_s : tuple of float
        Start and stop of the recording: what is assumed observed when the table does not say.

    Raises
    ------
    FileError
        When the table's index of spike times contradicts its rows.
    """
    table = file[location]
    ids = row_ids(table)
    rows = len(ids)
    starts, stops = _slices(table, "spike_times", rows, path)
    odd = _notes(table["spike_times"], starts, stops, span_s)
    observed = _observed(table, rows, path)
    columns = _columns(file, table, rows)
    assumed = np.array([span_s], dtype=float)
    units = []
    for i, (unit_id, note) in enumerate(_distinct(ids)):
        stated = observed[i]
        notes = (*odd[i], *note, *(("no observation interval of its own: the whole recording is assumed",)
                                   if stated is None and any(o is not None for o in observed) else ()))
        train = SpikeTimes(os.path.abspath(path), f"{location}/spike_times", int(starts[i]), int(stops[i]))
        units.append(Unit(unit_id, train, assumed if stated is None else stated, stated is not None,
                          {name: values[i] for name, values in columns.items()}, notes))
    return tuple(units)


def _distinct(ids: Sequence[str]) -> list[tuple[str, tuple[str, ...]]]:
    """Return each id and what is odd about it: an id that was there before gets a number."""
    seen: dict[str, int] = {}
    found: list[tuple[str, tuple[str, ...]]] = []
    for unit_id in ids:
        seen[unit_id] = seen.get(unit_id, 0) + 1
        again = seen[unit_id] > 1
        found.append((f"{unit_id} ({seen[unit_id]})", (f"the id {unit_id} is in the table more than once",))
                     if again else (unit_id, ()))
    return found


def _slices(table: h5py.Group, name: str, rows: int, path: str) -> tuple[IntArray, IntArray]:
    """Return where each row's part of a ragged column starts and stops."""
    index, length = child_of(table, f"{name}_index"), table[name].shape[0]
    if not isinstance(index, h5py.Dataset):
        each = 1 if length == rows else 0
        if rows == 1:
            return np.zeros(1, np.int64), np.full(1, length)
        return np.arange(rows) * each, (np.arange(rows) + 1) * each
    stops = np.minimum(index[()].astype(np.int64), length)
    if stops.size != rows or np.any(np.diff(stops) < 0):
        raise FileError(f"its units table is inconsistent ({name}_index has {stops.size} entries for {rows} units)",
                        where=path, remedy="write the units again")
    return np.concatenate([[0], stops[:-1]]), stops


def _observed(table: h5py.Group, rows: int, path: str) -> list[FloatArray | None]:
    """Return each unit's observation intervals, sorted and merged; None where none is given."""
    data = child_of(table, "obs_intervals")
    if not isinstance(data, h5py.Dataset) or data.ndim != 2 or not data.size:
        return [None] * rows
    starts, stops = _slices(table, "obs_intervals", rows, path)
    pairs = np.asarray(data[()], dtype=float)
    return [_merged(pairs[a:b]) for a, b in zip(starts, stops, strict=True)]


def _merged(pairs: FloatArray) -> FloatArray | None:
    good = pairs[np.isfinite(pairs).all(axis=1) & (pairs[:, 1] > pairs[:, 0])]
    merged: list[list[float]] = []
    for start, stop in good[np.argsort(good[:, 0])].tolist():
        if merged and start <= merged[-1][1]:
            merged[-1][1] = max(merged[-1][1], stop)
        else:
            merged.append([start, stop])
    return np.array(merged) if merged else None


def _columns(file: h5py.File, table: h5py.Group, rows: int) -> dict[str, list[str]]:
    """Return the table's own plain columns, then those of the electrodes its units point at."""
    columns = text_columns(table, skip=_own_columns(table)) | _group_columns(file, table, rows)
    electrodes = child_of(file, "general/extracellular_ephys/electrodes")
    if not isinstance(electrodes, h5py.Group) or child_of(table, "electrodes") is None:
        return columns
    there = text_columns(electrodes)
    cells = [joined_cells(there, picked) for picked in region_rows(table, "electrodes", rows)]
    for name in there:
        values = [cell[name] for cell in cells]
        if any(values) and values != columns.get(name):
            columns[name if name not in columns else f"electrode_{name}"] = values
    return {name: values for name, values in columns.items() if any(values)}


def _own_columns(table: h5py.Group) -> list[str]:
    """Return the columns that this program wrote on an earlier export; a laboratory's own stay."""
    return [name for name in table if is_own(table[name])]


def _group_columns(file: h5py.File, table: h5py.Group, rows: int) -> dict[str, list[str]]:
    """Return name and location of each unit's electrode group, where the units point at one."""
    data = child_of(table, "electrode_group")
    if not isinstance(data, h5py.Dataset) or data.shape != (rows,) or not h5py.check_ref_dtype(data.dtype):
        return {}
    groups = [file[ref] if ref else None for ref in data[()]]
    return {"electrode_group": [g.name.rsplit("/", 1)[-1] if g is not None else "" for g in groups],
            "group_location": [attribute(g, "location") if g is not None else "" for g in groups]}


def _notes(data: h5py.Dataset, starts: np.ndarray, stops: np.ndarray,
           span_s: tuple[float, float]) -> list[tuple[str, ...]]:
    """Return what is odd about each unit's times; read in blocks of whole units."""
    notes: list[tuple[str, ...]] = []
    first = 0
    while first < len(starts):
        last = first + 1
        while last < len(starts) and stops[last] - starts[first] <= BLOCK:
            last += 1
        block = np.asarray(data[starts[first] : stops[last - 1]], dtype=float)
        notes += [_odd(block[starts[i] - starts[first] : stops[i] - starts[first]], span_s) for i in range(first, last)]
        first = last
    return notes


def _odd(times_s: FloatArray, span_s: tuple[float, float]) -> tuple[str, ...]:
    finite = times_s[np.isfinite(times_s)]
    before, after = finite < span_s[0], finite > span_s[1]
    is_known = span_s[1] > span_s[0]
    found = [(times_s.size - finite.size, "spike times are not numbers: dropped"),
             (int(np.count_nonzero(np.diff(finite) < 0)), "spike times go backwards: sorted"),
             (int(np.count_nonzero(finite < 0)) if span_s[0] >= 0 else 0, "spike times are negative"),
             (int(np.count_nonzero(before & (finite >= 0))) if is_known else 0, "spike times lie before the recording"),
             (int(np.count_nonzero(after)) if is_known else 0, "spike times lie beyond the recording")]
    return tuple(f"{n} {words}" for n, words in found if n)
