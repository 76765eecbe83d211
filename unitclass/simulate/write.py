"""Simulated sessions as NWB files, with the truth in a table beside them."""

from __future__ import annotations

import csv
import uuid
from datetime import UTC, datetime, timedelta
from pathlib import Path
from typing import Any

import numpy as np

from unitclass.io.atomic import check_target, made_folder, written_whole
from unitclass.simulate.membrane import MV_PER_COUNT
from unitclass.simulate.nerves import NerveTrace
from unitclass.simulate.scenario import EXPERIMENTER, INSTITUTION, LAB
from unitclass.simulate.session import SimulatedSession

_FIRST_DAY = datetime(2021, 3, 1, 9, 30, tzinfo=UTC)
_NAMESPACE = uuid.UUID("6e2c4f1e-93b0-4a52-8f0c-1d5b6a7c8e90")


def write_session(session: SimulatedSession, path: Path | str, *, force: bool = False) -> Path:
    """Write the session as NWB at `path` and its truth as `STEM.truth.csv` beside it.

    The truth stands outside the NWB file, so that it cannot leak into a suggestion.

    Raises
    ------
    TargetError
        If `path` exists and `force` is false, or the folder cannot be written.
    """
    path = Path(path)
    truth = path.with_suffix(".truth.csv")
    made_folder(str(path.parent))
    check_target(str(truth), force=force)
    with written_whole(str(path), force=force) as part:
        _write_nwb(session, part)
    with written_whole(str(truth), force=force) as part:
        write_truth(session, part)
    return path


def write_truth(session: SimulatedSession, path: Path) -> None:
    """Write a row per unit and condition: unit, condition, type, detail."""
    with path.open("w", newline="", encoding="utf-8") as file:
        table = csv.DictWriter(file, ["unit", "condition", "type", "detail"], lineterminator="\n")
        table.writeheader()
        table.writerows(session.truth())


def _write_nwb(session: SimulatedSession, path: Path) -> None:
    import h5py
    from pynwb import NWBHDF5IO

    with h5py.File(path, "w") as file, NWBHDF5IO(file=file, mode="w") as io:
        io.write(as_nwb(session))


def as_nwb(session: SimulatedSession) -> Any:
    """Return the session as a pynwb NWBFile in memory."""
    nwb = _file(session)
    _add_nerves(nwb, session)
    if session.units:
        _add_units(nwb, session)
    if session.membrane is not None:
        _add_membrane(nwb, session)
    if session.scenario.is_labelled:
        _add_conditions(nwb, session)
    return nwb


def _file(session: SimulatedSession) -> Any:
    from pynwb import NWBFile
    from pynwb.file import Subject

    s = session.scenario
    day = timedelta(days=session.seed % 200, minutes=17 * (session.seed % 11))
    animal = s.animal
    return NWBFile(
        session_description=f"{s.title}. Simulated, not a recording.",
        identifier=str(uuid.uuid5(_NAMESPACE, f"{s.stem}/{session.kind}/{session.seed}/{session.stop_s}")),
        session_start_time=_FIRST_DAY + day, session_id=s.stem, experimenter=[EXPERIMENTER], lab=LAB,
        institution=INSTITUTION, experiment_description=f"Simulated session of unitclass: {s.look}.",
        keywords=["respiration", "brainstem", "simulation"],
        subject=Subject(subject_id=animal.id, species=animal.species, age=animal.age, sex=animal.sex,
                        weight=animal.weight, description=f"{animal.description} (invented)"))


def _add_nerves(nwb: Any, session: SimulatedSession) -> None:
    amplifier = nwb.create_device(name="nerve amplifier", description="differential amplifier and digitiser",
                                  manufacturer="invented")
    group = nwb.create_electrode_group(name="nerve electrodes", description="suction electrodes on nerves",
                                       location="peripheral nerves", device=amplifier)
    raw = [n for n in session.nerves if not n.wire.is_integrated]
    for nerve in raw:
        nwb.add_electrode(group=group, location=f"{nerve.wire.nerve} nerve")
    for i, nerve in enumerate(raw):
        nwb.add_acquisition(_raw_series(nwb, nerve, i))
    smooth = [n for n in session.nerves if n.wire.is_integrated]
    if smooth:
        module = nwb.create_processing_module(name="ecephys", description="integrated nerve activity")
        for nerve in smooth:
            module.add(_integrated_series(nerve))


def _raw_series(nwb: Any, nerve: NerveTrace, electrode: int) -> Any:
    from pynwb.ecephys import ElectricalSeries

    region = nwb.create_electrode_table_region(region=[electrode], description=f"on the {nerve.wire.nerve}")
    return ElectricalSeries(name=nerve.wire.name, description=nerve.description, data=_packed(nerve.counts),
                            electrodes=region, rate=nerve.wire.rate_hz, starting_time=0.0,
                            conversion=nerve.conversion, filtering="band-pass before digitising")


def _integrated_series(nerve: NerveTrace) -> Any:
    from pynwb import TimeSeries

    return TimeSeries(name=nerve.wire.name, description=nerve.description, data=_packed(nerve.counts),
                      unit="volts", rate=nerve.wire.rate_hz, starting_time=0.0, conversion=nerve.conversion)


def _add_units(nwb: Any, session: SimulatedSession) -> None:
    nwb.add_unit_column("region", "where the electrode's tip was")
    nwb.add_unit_column("depth_um", "depth below the surface in micrometres")
    for unit in session.units:
        nwb.add_unit(id=unit.id, spike_times=unit.spike_times_s, region=unit.region, depth_um=unit.depth_um,
                     obs_intervals=np.array([[0.0, session.stop_s]]))
    nwb.units.resolution = 1 / 30000


def _add_membrane(nwb: Any, session: SimulatedSession) -> None:
    from pynwb.icephys import CurrentClampSeries

    cell = session.membrane
    assert cell is not None
    headstage = nwb.create_device(name="intracellular amplifier", description="bridge amplifier",
                                  manufacturer="invented")
    electrode = nwb.create_icephys_electrode(
        name="sharp electrode", device=headstage, cell_id=cell.cell_id, resistance="70 megaohm",
        location="ventral respiratory column", slice="none, in situ", initial_access_resistance="72 megaohm",
        description="sharp glass electrode filled with 3 M potassium acetate; junction potential "
                    "not corrected")
    nwb.add_acquisition(CurrentClampSeries(
        name="membrane_potential", description="membrane potential, current clamp in bridge mode",
        data=_packed(cell.counts), rate=cell.rate_hz, starting_time=0.0, conversion=MV_PER_COUNT / 1000,
        electrode=electrode, gain=1.0, bias_current=0.0, bridge_balance=70e6, capacitance_compensation=0.0,
        stimulus_description="none", sweep_number=np.uint32(0)))


def _add_conditions(nwb: Any, session: SimulatedSession) -> None:
    nwb.add_epoch_column("condition", "what the animal was in")
    for condition in session.conditions:
        nwb.add_epoch(start_time=condition.start_s, stop_time=condition.stop_s, condition=condition.label)
    for gap in session.exclusions:
        nwb.add_invalid_time_interval(start_time=gap.start_s, stop_time=gap.stop_s, tags=[gap.reason])


def _packed(counts: Any) -> Any:
    from hdmf.backends.hdf5.h5_utils import H5DataIO

    return H5DataIO(counts, compression="gzip", compression_opts=6, shuffle=True,
                    chunks=(min(counts.size, 65536),))
