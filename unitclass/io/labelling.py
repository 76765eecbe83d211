"""Put cycles, firing types and histograms into an NWB file that is already a copy."""

from __future__ import annotations

import datetime
import uuid
from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from pathlib import Path

import h5py

from unitclass.errors import TargetError
from unitclass.io.atomic import claim_space
from unitclass.io.hdf5 import attribute
from unitclass.io.hdf5 import text as text_of
from unitclass.io.hdf5_tables import (
    Placed,
    add_columns,
    add_table,
    own_child,
    remove_own_columns,
    remove_own_tables,
)
from unitclass.io.labelled_tables import (
    cycles_table,
    firing_types_table,
    histograms_table,
    mean_vm_table,
    with_spikes_if_single,
)
from unitclass.io.labelled_units import label_columns, vm_units_table
from unitclass.io.nwb_check import Written
from unitclass.io.provenance import is_own
from unitclass.io.table_columns import Table
from unitclass.io.unit_rows import UnitRows, rows_by_id
from unitclass.records import ConditionResult, Labels, Recording, SessionResult

_TEXT = h5py.string_dtype()


@dataclass(frozen=True)
class Labelling:
    """All that goes into a labelled file.

    `condition` is the one whose labels stand in the units table, None for none of them;
    `tables` are the source's units tables, path to row ids; `run` says in words how to repeat
    the analysis; `where` is the file that messages name.
    """

    recording: Recording
    result: SessionResult
    labels: Labels
    condition: ConditionResult | None
    tables: Mapping[str, list[str]]
    run: str
    where: str

    @property
    def size(self) -> int:
        """Return about how many bytes it takes, generously."""
        units = [unit for _, unit in self.result.units()]
        n_cycles = sum(c.nerve_cycles.cycles.n_cycles for c in self.result.conditions)
        n_spikes = sum(unit.vm_spikes.time_s.size for unit in units if unit.vm_spikes)
        n_values = sum(unit.histogram.n_bins * 4 for unit in units)
        return 8 * n_values + 2000 * len(units) + 400 * n_cycles + 100 * n_spikes + 1_000_000


def add_labels(path: Path, labelling: Labelling) -> Written:
    """Add everything to the file at `path`, in place of what an earlier export added.

    Returns
    -------
    Mapping
        Path of each table to the columns written into it.

    Raises
    ------
    TargetError
        If the file has a place where the tables belong in another file, or its units table is
        not the one that was analysed.
    OSError
        If the disk has no room for what is added.
    """
    claim_space(path, labelling.size)
    with h5py.File(path, "r+") as file:
        _make_new(file)
        intervals, analysis = (_place(file, name, labelling.where) for name in ("intervals", "analysis"))
        _remove_earlier(file, labelling.tables)
        written: dict[str, Placed] = {}
        rows = _units(file, labelling, written)
        for table in _tables(labelling, rows):
            _add(intervals if table.kind == "TimeIntervals" else analysis, table, written)
        return written


def _tables(labelling: Labelling, rows: UnitRows) -> list[Table]:
    result = labelling.result
    tables = [] if not any(True for _ in result.units()) else [
        firing_types_table(result, labelling.labels, rows, labelling.run), histograms_table(result, rows)]
    mean_vm = mean_vm_table(result, rows)
    tables += [mean_vm] if mean_vm else []
    tables = [with_spikes_if_single(table, result, labelling.recording) for table in tables]
    cycles = cycles_table(result)
    return [*tables, cycles] if cycles else tables


def _units(file: h5py.File, labelling: Labelling, written: dict[str, Placed]) -> UnitRows:
    """Label the units table, or make one of the intracellular cells; return who stands where."""
    if labelling.recording.units and labelling.tables:
        rows = rows_by_id(labelling.recording, labelling.tables, labelling.where)
        _add_vm_units(file, labelling, "intracellular_units", written)
    elif file.get("units", getlink=True) is None:
        rows = _add_vm_units(file, labelling, "units", written)
    else:
        rows = _add_vm_units(file, labelling, "intracellular_units", written)
    if rows.path and labelling.condition:
        columns = tuple(c for c in label_columns(labelling.condition, labelling.labels, rows) if not c.is_empty)
        written[rows.path] = written.get(rows.path, {}) | add_columns(file[rows.path], columns)
    return rows


def _add_vm_units(file: h5py.File, labelling: Labelling, name: str,
                  written: dict[str, Placed]) -> UnitRows:
    table, rows = vm_units_table(labelling.recording, labelling.result, name)
    if table is None:
        return rows
    path = _add(file if name == "units" else file["analysis"], table, written)
    return UnitRows(path, rows.n_rows, rows.row)


def _add(parent: h5py.Group, table: Table, written: dict[str, Placed]) -> str:
    path, written_columns = add_table(parent, table)
    written[path] = written_columns
    return path


def _remove_earlier(file: h5py.File, tables: Iterable[str]) -> None:
    remove_own_tables(file["intervals"])
    remove_own_tables(file["analysis"])
    units = own_child(file, "units")
    if isinstance(units, h5py.Group) and is_own(attribute(units, "description")):
        del file["units"]
    for path in tables:
        remove_own_columns(file[path])


def _place(file: h5py.File, name: str, where: str) -> h5py.Group:
    if file.get(name, getlink=True) is None:
        return file.create_group(name)
    group = own_child(file, name)
    if not isinstance(group, h5py.Group):
        raise TargetError(f"keeps its /{name} in another file, where nothing may be written", where=where,
                          remedy="export a copy that holds it first")
    return group


def _make_new(file: h5py.File) -> None:
    """Give the file an object id of its own, and note today as a date of modification."""
    file.attrs["object_id"] = str(uuid.uuid4())
    dates = own_child(file, "file_create_date")
    if not isinstance(dates, h5py.Dataset) or dates.ndim != 1:
        return
    now = datetime.datetime.now().astimezone().isoformat()
    values = [*(text_of(value) for value in dates[:]), now]
    attributes = dict(dates.attrs)
    del file["file_create_date"]
    file.create_dataset("file_create_date", data=values, dtype=_TEXT, maxshape=(None,)).attrs.update(attributes)
