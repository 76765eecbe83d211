"""One continuous series of a file: its shape, clock, scale and words, without its samples."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

import h5py
import numpy as np
from numpy.typing import NDArray

from unitclass.io.chunk_readers import Column, EvenChunks, UnevenChunks
from unitclass.io.hdf5 import attribute, child_of, neurodata_type, number
from unitclass.io.nwb_types import series_kind
from unitclass.io.sample_blocks import scaled
from unitclass.io.timebase import TimeBase, UnusableSeriesError, time_base

_NO_UNIT = {"", "unknown", "n/a", "na", "none", "no unit", "see 'feature_units'"}


@dataclass(frozen=True)
class Series:
    """What the file says about a series. `n_columns` is 1 for a dataset of one dimension.

    `gains` holds a factor per column (conversion × channel_conversion); `offset` is in `unit`.
    """

    name: str
    location: str
    kind: str
    n_samples: int
    n_columns: int
    unit: str
    description: str
    comments: str
    gains: tuple[float, ...]
    offset: float
    times: TimeBase
    dataset: str
    time_axis: int = 0
    notes: tuple[str, ...] = ()

    @property
    def words(self) -> str:
        """Return description and comments as one text."""
        return " ".join(w for w in (self.description, self.comments) if w and w.lower() not in
                        ("no description", "no comments"))

    def column(self, path: str, index: int, *, factor: float = 1.0) -> Column:
        """Return where one column is stored and how it scales, times `factor`."""
        return Column(path, self.dataset, index, self.gains[index] * factor, self.offset * factor, self.time_axis)

    def reader(self, path: str, index: int, *, factor: float = 1.0) -> EvenChunks | UnevenChunks:
        """Return a reader of one column in `unit` × factor."""
        source, times = self.column(path, index, factor=factor), self.times
        if times.is_even:
            return EvenChunks(source, times.rate_hz, times.stretches)
        return UnevenChunks(source, times.timestamps, times.rate_hz, times.stretches)


def read_series(file: h5py.File, location: str, parents: Mapping[str, str],
                known_times: dict[Any, TimeBase]) -> Series | None:
    """Return what the file says about the series at `location`; None when it is not a trace.

    Raises
    ------
    UnusableSeriesError
        If it is a trace that cannot be used: no samples, no clock, a gain of zero.
    """
    group = file[location]
    data = child_of(group, "data")
    kind = series_kind(neurodata_type(group), parents)
    if kind == "not a trace" or not isinstance(data, h5py.Dataset) or not _is_trace(data):
        return None
    time_axis = _time_axis(group, data)
    n_samples = data.shape[time_axis]
    if data.size == 0:
        raise UnusableSeriesError("has no samples (zero length)")
    n_columns = 1 if data.ndim == 1 else data.shape[1 - time_axis]
    times = time_base(group, n_samples, known_times)
    series = Series(
        name=location.rsplit("/", 1)[-1], location=location, kind=kind, n_samples=n_samples,
        n_columns=n_columns, unit=_unit(data), description=attribute(group, "description"),
        comments=attribute(group, "comments"), gains=_gains(group, data, n_columns),
        offset=_offset(data), times=times, dataset=f"{location}/data", time_axis=time_axis,
        notes=tuple(filter(None, (times.note, _transposed_note(data, time_axis)))))
    if all(g == 0 for g in series.gains):
        raise UnusableSeriesError("has a gain (conversion) of zero")
    return series


def _is_trace(data: h5py.Dataset) -> bool:
    return data.dtype.kind in "iuf" and data.ndim in (1, 2)


def _time_axis(group: h5py.Group, data: h5py.Dataset) -> int:
    """Return 1 for data stored channels × time, which the time stamps or the electrodes betray."""
    if data.ndim == 1 or data.shape[0] >= data.shape[1]:
        return 0
    stamps, electrodes = child_of(group, "timestamps"), child_of(group, "electrodes")
    if isinstance(stamps, h5py.Dataset):
        return int(stamps.shape[0] == data.shape[1] != data.shape[0])
    if isinstance(electrodes, h5py.Dataset):
        return int(electrodes.shape[0] == data.shape[0] != data.shape[1])
    return int(data.shape[1] > 100 * data.shape[0])


def _transposed_note(data: h5py.Dataset, time_axis: int) -> str:
    if not time_axis:
        return ""
    return f"stored channels × time ({data.shape[0]} × {data.shape[1]}): read along its second axis"


def _unit(data: h5py.Dataset) -> str:
    unit = attribute(data, "unit")
    return "" if unit.lower() in _NO_UNIT else unit


def _gains(group: h5py.Group, data: h5py.Dataset, n_columns: int) -> tuple[float, ...]:
    conversion = number(data.attrs.get("conversion", 1.0), 1.0)
    if not np.isfinite(conversion):
        raise UnusableSeriesError(f"has a gain (conversion) of {conversion}")
    channels = child_of(group, "channel_conversion")
    factors = np.ones(n_columns)
    if isinstance(channels, h5py.Dataset) and channels.shape == (n_columns,):
        factors = channels[()].astype(float)
    return tuple(float(conversion * f) for f in factors)


def _offset(data: h5py.Dataset) -> float:
    offset = number(data.attrs.get("offset", 0.0), 0.0)
    return offset if np.isfinite(offset) else 0.0


# --------------------------------------------------------------------------------- peek

def peek(file: h5py.File, series: Series, *, seconds: float = 2.0, n_places: int = 3) -> list[NDArray[Any]]:
    """Return short samples from several places of a series, each shape (n, n_columns), in `unit`.

    Enough to see the scale, a constant channel, or whether a nerve was integrated; never the whole.
    """
    size = max(16, min(round(seconds * series.times.rate_hz), 2**17, series.n_samples))
    spread = np.linspace(0, series.n_samples - size, n_places + 2)[1:-1] if series.n_samples > size else [0]
    data = file[series.dataset]
    return [_peeked(data, series, int(first), int(first) + size) for first in spread]


def _peeked(data: h5py.Dataset, series: Series, first: int, stop: int) -> NDArray[Any]:
    raw = data[first:stop] if series.time_axis == 0 else data[:, first:stop].T
    columns = raw.reshape(stop - first, series.n_columns)
    return np.stack([scaled(columns[:, j], series.gains[j], series.offset) for j in range(series.n_columns)], axis=1)
