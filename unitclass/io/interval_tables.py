"""Tables of intervals as an NWB file holds them: epochs, trials, invalid times, a laboratory's own."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field

import h5py
import numpy as np

from unitclass.io.dynamic_tables import n_rows, number_column, text_columns
from unitclass.io.hdf5 import attribute
from unitclass.records import FloatArray

# A column that names conditions, the plainest first. Common practice.
LABEL_COLUMNS = ("condition", "conditions", "label", "state", "treatment", "manipulation", "drug", "gas", "epoch",
                 "epoch_name", "period", "protocol", "phase", "stage", "block", "name", "tags", "tag", "description")


@dataclass(frozen=True)
class IntervalTable:
    """One table of intervals: its rows' times in seconds, and its columns as text."""

    name: str
    location: str
    start_s: FloatArray
    stop_s: FloatArray
    columns: Mapping[str, list[str]] = field(default_factory=dict)
    description: str = ""

    @property
    def n_rows(self) -> int:
        """Return the number of rows."""
        return int(self.start_s.size)

    @property
    def label_column(self) -> str:
        """Return the column that names the rows; empty when none does."""
        by_name = {name.lower(): name for name in self.columns}
        for known in LABEL_COLUMNS:
            if known in by_name and any(self.columns[by_name[known]]):
                return by_name[known]
        wordy = [name for name, values in self.columns.items() if any(v and not _is_number(v) for v in values)]
        return wordy[0] if len(wordy) == 1 else ""

    def words(self, row: int) -> list[str]:
        """Return every word of a row that could name it, each tag on its own."""
        return [word for values in self.columns.values() for word in (values[row], *values[row].split(", ")) if word]


def read_interval_table(file: h5py.File, location: str) -> IntervalTable:
    """Return an interval table; rows without a start are left out.

    A row without a stop reaches to the next row's start, the last one to infinity.
    """
    group = file[location]
    rows = n_rows(group) or int(group["start_time"].shape[0])
    start, stop = number_column(group, "start_time", rows), number_column(group, "stop_time", rows)
    columns = text_columns(group, skip=("start_time", "stop_time"))
    order = np.argsort(start, kind="stable")
    known = order[np.isfinite(start[order])]
    start, stop = start[known], stop[known]
    following = np.append(start[1:], np.inf) if known.size else start
    stop = np.where(np.isfinite(stop), stop, following)
    kept = {name: [values[i] for i in known] for name, values in columns.items() if len(values) == rows}
    return IntervalTable(location.rsplit("/", 1)[-1], location, start, stop, kept, attribute(group, "description"))


def _is_number(value: str) -> bool:
    try:
        float(value)
    except ValueError:
        return False
    return True
