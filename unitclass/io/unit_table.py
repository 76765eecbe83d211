"""Sorted units: their spike times when asked for, their observation intervals, their columns."""

from __future__ import annotations

from dataclasses import dataclass

import h5py
import numpy as np

from unitclass.io.dynamic_tables import joined_cells, n_rows, region_rows, text_columns
from unitclass.io.hdf5 import child_of, opened
from unitclass.io.hdf5_tables import row_ids
from unitclass.records import FloatArray, Unit

BLOCK = 2_000_000  # spike times checked at once
OWN_COLUMNS = ("firing_type", "suggested_firing_type", "firing_type_probability")


@dataclass(frozen=True)
class SpikeTimes:
    """Reads one unit's slice of the table's spike times."""

    path: str
    dataset: str
    first: int
    stop: int

    def read(self) -> FloatArray:
        """Return the finite spike times in seconds, ascending, shape (n_spikes,)."""
        if self.stop <= self.first:
            return np.zeros(0)
        with opened(self.path) as file:
            times = np.asarray(file[self.dataset][self.first : self.stop], dtype=float)
        times = times[np.isfinite(times)]
        return times if np.all(times[1:] >= times[:-1]) else np.sort(times)


def read_units(file: h5py.File, path: str, location: str, span_s: tuple[float, float]) -> tuple[Unit, ...]:
    """Return the units of a units table.

    Parameters
    ----------
    location : str
        Of the table in the file.
    span_s : tuple of float
        Start and stop of the recording: what is assumed observed when the table does not say.
    """
    table = file[location]
    rows, ids = n_rows(table), row_ids(table)
    starts, stops = _slices(table, "spike_times", rows)
    notes = _notes(table["spike_times"], starts, stops, span_s)
    observed = _observed(table, rows)
    columns = _columns(file, table, rows)
    assumed = np.array([span_s], dtype=float)
    return tuple(Unit(ids[i], SpikeTimes(path, f"{location}/spike_times", int(starts[i]), int(stops[i])),
                      assumed if observed is None else observed[i], observed is not None,
                      {name: values[i] for name, values in columns.items()}, notes[i]) for i in range(rows))


def _slices(table: h5py.Group, name: str, rows: int) -> tuple[np.ndarray, np.ndarray]:
    index = child_of(table, f"{name}_index")
    if isinstance(index, h5py.Dataset):
        stops = np.minimum(index[()].astype(np.int64), table[name].shape[0])
        return np.concatenate([[0], stops[:-1]]), stops
    n = table[name].shape[0] if rows else 0
    return np.zeros(rows, np.int64), np.full(rows, n if rows == 1 else 0)


def _observed(table: h5py.Group, rows: int) -> list[FloatArray] | None:
    data = child_of(table, "obs_intervals")
    if not isinstance(data, h5py.Dataset) or data.ndim != 2 or not data.size:
        return None
    starts, stops = _slices(table, "obs_intervals", rows)
    pairs = np.asarray(data[()], dtype=float)
    return [pairs[a:b][np.isfinite(pairs[a:b]).all(axis=1)] for a, b in zip(starts, stops, strict=True)]


def _columns(file: h5py.File, table: h5py.Group, rows: int) -> dict[str, list[str]]:
    """Return the table's own plain columns, then those of the electrodes its units point at."""
    columns = text_columns(table, skip=OWN_COLUMNS)
    electrodes = child_of(file, "general/extracellular_ephys/electrodes")
    if not isinstance(electrodes, h5py.Group) or child_of(table, "electrodes") is None:
        return columns
    there = text_columns(electrodes)
    cells = [joined_cells(there, picked) for picked in region_rows(table, "electrodes", rows)]
    for name in there:
        values = [cell[name] for cell in cells]
        if name not in columns and any(values):
            columns[name] = values
    return columns


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
    found = [(times_s.size - finite.size, "spike times are not numbers: dropped"),
             (int(np.count_nonzero(np.diff(finite) < 0)), "spike times go backwards: sorted"),
             (int(np.count_nonzero(finite < min(0.0, span_s[0]))), "spike times lie before the recording"),
             (int(np.count_nonzero(finite > span_s[1])), "spike times lie beyond the recording")]
    return tuple(f"{n} {words}" for n, words in found if n)
