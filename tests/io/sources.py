"""Small NWB sessions to label, with the recording and the result that belong to each."""

from __future__ import annotations

import datetime
from pathlib import Path

import numpy as np
from pynwb import NWBHDF5IO, NWBFile, TimeSeries
from pynwb.ecephys import ElectricalSeries
from pynwb.file import Subject
from pynwb.icephys import CurrentClampSeries

from tests.results import CONDITION_S, UNITS, condition_result, session_result, vm_result
from unitclass.records import (
    ArrayChunks,
    ArraySpikes,
    Condition,
    ConditionResult,
    Electrode,
    Membrane,
    Recording,
    SessionResult,
    Signal,
    Unit,
)

RATE_HZ = 1000.0
STOP_S = 2 * CONDITION_S


def session_file(path: Path, ids: tuple[int, ...] = (3, 7, 12, 20, 31)) -> Path:
    """Write a phrenic and a vagus nerve, and a units table with a region column."""
    file = _file()
    electrodes = _electrodes(file)
    rng = np.random.default_rng(4)
    trace = rng.normal(0, 1e-4, (int(STOP_S * RATE_HZ), 1))
    file.add_acquisition(ElectricalSeries(name="PNA", data=trace, rate=RATE_HZ, electrodes=electrodes,
                                          starting_time=0.0, description="phrenic nerve"))
    file.add_acquisition(TimeSeries(name="cVN", data=trace[:, 0].copy(), timestamps=np.arange(len(trace)) / RATE_HZ,
                                    unit="V", description="cervical vagus"))
    if ids:
        file.add_unit_column("region", "where the cell was")
    for i, name in enumerate(ids):
        file.add_unit(id=name, spike_times=spikes_of(i), region="rostral column")
    if ids:
        file.units.resolution = 1e-6
    return _written(file, path)


def spikes_of(i: int) -> np.ndarray:
    """Return the spike times of the i-th unit: silent for the fourth."""
    n = 0 if i == 3 else 200 + i
    return np.round(np.sort(np.random.default_rng(i).uniform(0.01, STOP_S - 0.01, n)), 6)


def session_recording(path: Path, ids: tuple[int, ...] = (3, 7, 12, 20, 31)) -> Recording:
    """Return the recording that a reader would make of `session_file`."""
    units = tuple(Unit(str(name), ArraySpikes(spikes_of(i)), np.array([[0.0, STOP_S]]),
                       columns={"region": "rostral column"}) for i, name in enumerate(ids))
    return Recording(str(path), "heron_04", "heron-04-identifier", "0b7e", "heron 04", 0.0, STOP_S,
                     reference="PNA", units=units, conditions=(Condition("baseline", 0.0, CONDITION_S),))


def one_condition(units: dict[str, str] | None = None, name: str = "baseline") -> SessionResult:
    """Return a result with one condition."""
    return session_result(conditions=(name,), units=units or dict(UNITS))


def cell_file(path: Path) -> Path:
    """Write one intracellular cell and a phrenic nerve; no units table."""
    file = _file()
    electrode = file.create_icephys_electrode(name="sharp 1", description="sharp electrode",
                                              device=_device(file), cell_id="cell 2", location="ventral column")
    samples = int(CONDITION_S * RATE_HZ)
    file.add_acquisition(CurrentClampSeries(name="Vm", data=np.full(samples, -56.0), rate=RATE_HZ, gain=1.0,
                                            conversion=1e-3, starting_time=0.0, electrode=electrode,
                                            description="membrane potential"))
    file.add_acquisition(TimeSeries(name="PNA", data=np.sin(np.arange(samples)), rate=RATE_HZ, starting_time=0.0,
                                    unit="V", description="phrenic nerve"))
    return _written(file, path)


def cell_recording(path: Path) -> Recording:
    """Return the recording that a reader would make of `cell_file`."""
    chunks = ArrayChunks(np.full(10, -56.0), RATE_HZ)
    signal = Signal("Vm", "membrane", "mV", RATE_HZ, 0.0, CONDITION_S, chunks, location="/acquisition/Vm")
    return Recording(str(path), "heron_04", "heron-04-identifier", "0b7e", "heron 04", 0.0, CONDITION_S,
                     reference="PNA", membranes=(Membrane(signal, Electrode("sharp 1", "cell 2")),))


def cell_result(**changes: object) -> SessionResult:
    """Return the result of `cell_file`: one post-I cell in one condition without a name."""
    condition = condition_result("", {})
    with_cell = ConditionResult(**{**vars(condition), "units": (vm_result("cell 2", "", **changes),)})
    return session_result(conditions=()).__class__(**{**vars(session_result()), "conditions": (with_cell,)})


def _file() -> NWBFile:
    file = NWBFile("a phrenic nerve and its neurons", "heron-04-identifier",
                   datetime.datetime(2021, 3, 4, 9, tzinfo=datetime.UTC), session_id="heron_04",
                   experimenter=["Fischer, Ada"], institution="Institute of the Marsh", lab="Reed lab",
                   experiment_description="cells of the breathing rhythm", keywords=["respiration"])
    file.subject = Subject(subject_id="heron-04", species="Rattus norvegicus", age="P30D", sex="M",
                           description="perfused preparation")
    return file


def _device(file: NWBFile):
    return file.create_device("amplifier", description="amplifier of the rig")


def _electrodes(file: NWBFile):
    group = file.create_electrode_group("nerve", description="suction electrode", location="phrenic nerve",
                                        device=_device(file))
    file.add_electrode(location="phrenic nerve", group=group)
    return file.create_electrode_table_region([0], "the phrenic electrode")


def _written(file: NWBFile, path: Path) -> Path:
    with NWBHDF5IO(path, "w") as io:
        io.write(file)
    return path
