"""Which row of the units table each unit of a result stands in, and its spikes."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field

import numpy as np

from unitclass.errors import TargetError
from unitclass.io.hdf5 import opened
from unitclass.io.hdf5_tables import row_ids
from unitclass.io.nwb_discover import discover
from unitclass.io.table_columns import Column, text_column
from unitclass.records import FloatArray, Recording, UnitResult


@dataclass(frozen=True)
class UnitRows:
    """The table at `path` has `n_rows` rows; `row` maps a unit's id to its row there.

    `path` is empty when the file has no units table at all.
    """

    path: str
    n_rows: int
    row: Mapping[str, int] = field(default_factory=dict)

    def columns_for(self, units: list[UnitResult]) -> tuple[Column, ...]:
        """Return the columns that say which unit each row is about.

        Where a unit stands in no table (a cell known from its membrane potential, in a file
        that has sorted units too) the reference is ragged and its cell empty.
        """
        name = text_column("unit_id", "id of the unit, or name of the cell", [u.unit for u in units])
        rows = [self.row.get(u.unit, -1) for u in units]
        if not self.path or max(rows, default=-1) < 0:
            return (name,)
        found = np.array([row for row in rows if row >= 0])
        lengths = None if found.size == len(rows) else np.array([int(row >= 0) for row in rows])
        return Column("unit", "the unit, as a row of the units table", found, lengths, points_to=self.path), name


def units_tables(source: str) -> dict[str, list[str]]:
    """Return the path and the row ids of every units table that lies in the file itself."""
    with opened(source) as file:
        groups = [file[path] for path in discover(file).units]
        return {str(group.name): row_ids(group) for group in groups if group.file.filename == file.filename}


def rows_by_id(recording: Recording, tables: Mapping[str, list[str]], where: str) -> UnitRows:
    """Return the row of each of the recording's units in the table they were read from.

    Parameters
    ----------
    recording : Recording
        What was analysed.
    tables : Mapping
        Path of each units table in the file to the ids of its rows.
    where : str
        The file, for the message.

    Raises
    ------
    TargetError
        If none of the tables can be the one that the recording was read from.
    """
    names = [unit.id for unit in recording.units]
    for path, ids in tables.items():
        if len(set(ids)) == len(ids) and set(names) <= set(ids):
            places = {name: i for i, name in enumerate(ids)}
            return UnitRows(path, len(ids), {name: places[name] for name in names})
    for path, ids in tables.items():
        if len(names) == len(ids):
            return UnitRows(path, len(ids), {name: i for i, name in enumerate(names)})
    found = ", ".join(f"{path} has {len(ids)}" for path, ids in tables.items())
    raise TargetError(f"{len(names)} units were analysed, but {found}", where=where, remedy="analyse it again")


def spikes_within(recording: Recording, unit: UnitResult, spans: tuple[tuple[float, float], ...]) -> FloatArray:
    """Return the unit's spike times inside `spans`; all of them where there are none inside."""
    times = _all_spikes(recording, unit)
    inside = np.zeros(times.size, bool)
    for start, stop in spans:
        inside |= (times >= start) & (times < stop)
    return times[inside] if inside.any() else times


def _all_spikes(recording: Recording, unit: UnitResult) -> FloatArray:
    if unit.vm_spikes is not None:
        return np.unique(unit.vm_spikes.time_s)
    for candidate in recording.units:
        if candidate.id == unit.unit:
            return candidate.train.read()
    return np.zeros(0)

