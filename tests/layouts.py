"""One simulated session written the way different laboratories would write it.

The nerves and units come from the tests' own simulators, not from the program's demo sessions.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass
from datetime import UTC, datetime
from pathlib import Path

import numpy as np

from tests.simulators.sessions import whole
from unitclass.records import FloatArray, Signal

STARTED = datetime(2026, 3, 4, 9, 30, tzinfo=UTC)


@dataclass(frozen=True)
class Session:
    """Traces by nerve name, trains, the true types, and the length in seconds."""

    traces: Mapping[str, FloatArray]
    rates_hz: Mapping[str, float]
    trains: tuple[FloatArray, ...]
    types: tuple[str, ...]
    stop_s: float


def simulated(regime: str = "three-phase", *, n_per_type: int = 1, n_cycles: int = 45, seed: int = 5,
              trouble: tuple[str, ...] = ("hum", "heart"), types: tuple[str, ...] | None = None) -> Session:
    """Return a clean session of firing types that nobody confuses."""
    rng = np.random.default_rng(seed)
    wanted = types or ("early-I", "ramp-I", "post-I", "aug-E", "pre-I", "NRM")
    recording, units = whole("rates", regime, n_per_type, n_cycles=n_cycles, rng=rng, raw_rate_hz=2500.0,
                             hardness=0.2, trouble=trouble, peak_hz=(20.0, 80.0), types=wanted, with_other=False)
    return Session({s.name: _trace(s) for s in recording.nerves}, {s.name: s.rate_hz for s in recording.nerves},
                   tuple(units.trains), tuple(units.types), recording.stop_s)


def _trace(signal: Signal) -> FloatArray:
    return np.concatenate([chunk.values for chunk in signal.reader.chunks()])


def integrated(trace: FloatArray, rate_hz: float, out_hz: float = 100.0, tau_s: float = 0.05) -> FloatArray:
    """Return a leaky-integrated neurogram, as analogue hardware writes it."""
    from scipy.signal import butter, lfilter, sosfilt

    a = np.exp(-1 / (tau_s * rate_hz))
    passed = sosfilt(butter(2, [300, 1000], "bandpass", fs=rate_hz, output="sos"), trace)
    return lfilter([1 - a], [1, -a], np.abs(passed))[:: round(rate_hz / out_hz)]


def new_file(session_id: str = "lab-7"):
    """Return an empty NWB file of an invented laboratory."""
    from pynwb import NWBFile
    from pynwb.file import Subject

    nwb = NWBFile("neurons of a breathing preparation", f"{session_id}-identifier", STARTED, session_id=session_id)
    nwb.subject = Subject(subject_id="woodcock-3", species="Rattus norvegicus", age="P28D", sex="M")
    return nwb


def write(nwb, path: Path) -> Path:
    """Write the file and return its path."""
    from pynwb import NWBHDF5IO

    with NWBHDF5IO(str(path), "w") as io:
        io.write(nwb)
    return path


def add_units(nwb, session: Session, *, shift_s: float = 0.0, observed: bool = False, region: bool = True) -> None:
    """Add the units table, with a region column and perhaps observation intervals."""
    if region:
        nwb.add_unit_column("region", "where the unit was recorded")
    for i, train in enumerate(session.trains):
        more = {"region": "preBötC" if i % 2 else "BötC"} if region else {}
        if observed:
            more["obs_intervals"] = np.array([[shift_s, session.stop_s + shift_s]])
        nwb.add_unit(spike_times=train + shift_s, id=10 + i, **more)


def channels_of_one_series(session: Session, path: Path) -> Path:
    """All nerves as channels of one int16 ElectricalSeries, named by the electrodes table; epochs with tags."""
    from pynwb.ecephys import ElectricalSeries

    nwb = new_file()
    device = nwb.create_device("amplifier")
    group = nwb.create_electrode_group("hooks", "suction electrodes", "thorax", device)
    nwb.add_electrode_column("label", "what is on the channel")
    for label in ("right phrenic", "cervical vagus", "spare"):
        nwb.add_electrode(location="nerve", group=group, label=label)
    region = nwb.create_electrode_table_region([0, 1, 2], "nerve channels")
    counts = [np.round(trace / 2e-7).clip(-32768, 32767) for trace in session.traces.values()]
    spare = np.random.default_rng(0).normal(0, 30, counts[0].size).round()
    data = np.stack([*counts, spare], axis=1).astype(np.int16)
    nwb.add_acquisition(ElectricalSeries("neurograms", data, region, rate=2500.0, conversion=2e-7, starting_time=0.0))
    add_units(nwb, session)
    middle = session.stop_s / 2
    nwb.add_epoch(0.0, middle, ["baseline"])
    nwb.add_epoch(middle, session.stop_s, ["high CO2"])
    return write(nwb, path)


def series_with_timestamps(session: Session, path: Path) -> Path:
    """Each nerve a TimeSeries with time stamps on a late clock; conditions in the trials table."""
    from pynwb import TimeSeries

    nwb, shift = new_file(), 1000.0
    for name, trace in session.traces.items():
        times = shift + np.arange(trace.size) / session.rates_hz[name]
        nwb.add_acquisition(TimeSeries(name, trace * 1e3, "mV", timestamps=times, description=f"raw {name}"))
    add_units(nwb, session, shift_s=shift, observed=True)
    nwb.add_trial_column("condition", "what was done")
    nwb.add_trial(shift, shift + session.stop_s, condition="baseline")
    return write(nwb, path)


def integrated_in_a_module(session: Session, path: Path) -> Path:
    """Integrated nerves at 100 Hz in a processing module; no conditions at all."""
    from pynwb import TimeSeries

    nwb = new_file()
    module = nwb.create_processing_module("nerves", "integrated neurograms")
    for name, trace in session.traces.items():
        module.add(TimeSeries(f"int{name}", integrated(trace, session.rates_hz[name]), "V", rate=100.0,
                              description="rectified and integrated, time constant 50 ms"))
    add_units(nwb, session, region=False)
    return write(nwb, path)


def columns_named_in_words(session: Session, path: Path) -> Path:
    """Nerves as columns of a plain TimeSeries that its description names; a table of the lab's own; a bad stretch."""
    from pynwb import TimeSeries
    from pynwb.epoch import TimeIntervals

    nwb, shift = new_file(), 50.0
    data = np.stack([-trace for trace in session.traces.values()], axis=1)
    nwb.add_acquisition(TimeSeries("physiology", data, "volts", rate=2500.0, starting_time=shift,
                                   description="channels: PND, cVN"))
    add_units(nwb, session, shift_s=shift)
    table = TimeIntervals("experimental_conditions", "what was done when")
    table.add_column("treatment", "gas or drug")
    table.add_row(start_time=shift, stop_time=shift + session.stop_s, treatment="5 % CO2")
    nwb.add_time_intervals(table)
    nwb.add_invalid_time_interval(shift + 20.0, shift + 24.0)
    return write(nwb, path)


LAYOUTS: Mapping[str, Callable[[Session, Path], Path]] = {
    "channels": channels_of_one_series, "timestamps": series_with_timestamps,
    "integrated": integrated_in_a_module, "columns": columns_named_in_words}
