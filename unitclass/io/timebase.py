"""When the samples of a series were taken: evenly, in stretches with gaps between, or unevenly.

Time stamps are scanned once, block by block, so an hour at 20 kHz never stands in memory whole.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from itertools import pairwise
from typing import Any

import h5py
import numpy as np

from unitclass.io.chunk_readers import Stretch
from unitclass.io.hdf5 import child_of, number
from unitclass.io.sample_blocks import column_blocks
from unitclass.records import FloatArray

_EVEN_SAMPLES = 0.4  # an even grid may miss a time stamp by this many samples,
_EVEN_S = 1e-4  # or by this, since time stamps are often rounded
_GAP_EVEN = 1.5  # sampling intervals
_GAP_UNEVEN = 8.0  # sampling intervals bridged by interpolation at most
_MAX_GAPS = 20_000


class UnusableSeriesError(Exception):
    """A series that cannot be used; the message says why, in words."""


@dataclass(frozen=True)
class TimeBase:
    """Stretches of samples on the session clock. `is_even` is False when they must be resampled."""

    rate_hz: float
    stretches: tuple[Stretch, ...]
    start_s: float
    stop_s: float
    is_even: bool = True
    timestamps: str = ""
    note: str = ""


@dataclass(frozen=True)
class _Run:
    """Consecutive time stamps without a gap: indices first up to stop, their ends and wobble in s."""

    first: int
    stop: int
    start_s: float
    last_s: float
    wobble_s: float


def time_base(series: h5py.Group, n_samples: int, known: dict[Any, TimeBase]) -> TimeBase:
    """Return when the `n_samples` of a series were taken.

    Parameters
    ----------
    known : dict
        Time bases found before in this file, by time-stamp dataset: series often share one.

    Raises
    ------
    UnusableSeriesError
        If the sampling rate is not positive, or time stamps are missing, not numbers or run backwards.
    """
    start = child_of(series, "starting_time")
    if isinstance(start, h5py.Dataset):
        return _from_rate(number(start[()]), number(start.attrs.get("rate")), n_samples)
    stamps = child_of(series, "timestamps")
    if not isinstance(stamps, h5py.Dataset):
        raise UnusableSeriesError("has neither a sampling rate nor time stamps")
    key = (stamps.file.filename, stamps.name, n_samples)
    if key not in known:
        known[key] = _from_stamps(stamps, f"{series.name}/timestamps", n_samples)
    return known[key]


def _from_rate(start_s: float, rate_hz: float, n_samples: int) -> TimeBase:
    if not (np.isfinite(rate_hz) and rate_hz > 0):
        raise UnusableSeriesError(f"has a sampling rate of {rate_hz:g} Hz")
    start_s = start_s if np.isfinite(start_s) else 0.0
    return TimeBase(rate_hz, (Stretch(0, n_samples, start_s),), start_s, start_s + n_samples / rate_hz)


def _from_stamps(stamps: h5py.Dataset, location: str, n_samples: int) -> TimeBase:
    n_used = min(n_samples, stamps.shape[0] if stamps.ndim == 1 else 0)
    if n_used < 2:
        raise UnusableSeriesError(f"has {n_used} time stamps for {n_samples} samples")
    interval_s = _usual_interval(stamps, n_used)
    note = "" if n_used == n_samples == stamps.shape[0] else (
        f"{stamps.shape[0]} time stamps for {n_samples} samples: the first {n_used} are used")
    groups = _stretches_of_runs(stamps, n_used, max(_GAP_EVEN * interval_s, interval_s + _EVEN_S))
    rate_hz = _even_rate(groups)
    if rate_hz > 0:
        return _even(groups, rate_hz, note)
    groups = _stretches_of_runs(stamps, n_used, _GAP_UNEVEN * interval_s)
    return _uneven(groups, 1.0 / interval_s, location, note)


def _even(groups: list[list[_Run]], rate_hz: float, note: str) -> TimeBase:
    stretches = _as_stretches(groups)
    return TimeBase(rate_hz, stretches, stretches[0].start_s, groups[-1][-1].last_s + 1.0 / rate_hz, note=note)


def _uneven(groups: list[list[_Run]], rate_hz: float, location: str, note: str) -> TimeBase:
    stretches = _as_stretches(groups)
    said = f"time stamps are uneven: resampled at {rate_hz:g} Hz by linear interpolation"
    return TimeBase(rate_hz, stretches, stretches[0].start_s, groups[-1][-1].last_s + 1.0 / rate_hz,
                    is_even=False, timestamps=location, note="; ".join(filter(None, (note, said))))


def _as_stretches(groups: list[list[_Run]]) -> tuple[Stretch, ...]:
    return tuple(Stretch(g[0].first, g[-1].stop, g[0].start_s) for g in groups)


def _usual_interval(stamps: h5py.Dataset, n_used: int) -> float:
    """Return the mean interval of three places of the series, gaps apart."""
    size = min(4096, n_used)
    places = {0, (n_used - size) // 2, n_used - size}
    steps = np.concatenate([np.diff(stamps[p : p + size].astype(float)) for p in sorted(places)])
    steps = steps[np.isfinite(steps) & (steps >= 0)]
    if not np.any(steps > 0):
        raise UnusableSeriesError("has time stamps that do not increase")
    return float(steps[steps <= 3.0 * np.median(steps[steps > 0])].mean())


def _stretches_of_runs(stamps: h5py.Dataset, n_used: int, gap_s: float) -> list[list[_Run]]:
    """Return the stretches between gaps, each as its runs (blocks cut stretches too), in one pass."""
    groups: list[list[_Run]] = []
    last_s = -np.inf
    for first, raw in column_blocks(stamps, 0, 0, n_used):
        times = raw.astype(float)
        _check_times(times, last_s, first)
        for run in _runs_of_block(times, first, gap_s):
            if groups and run.start_s - last_s <= gap_s:
                groups[-1].append(run)
            else:
                groups.append([run])
            last_s = run.last_s
        if len(groups) > _MAX_GAPS:
            raise UnusableSeriesError(f"has over {_MAX_GAPS} gaps in its time stamps")
    return groups


def _check_times(times: FloatArray, last_s: float, first: int) -> None:
    if not np.all(np.isfinite(times)):
        raise UnusableSeriesError(f"has time stamps that are not numbers (near sample {first})")
    steps = np.diff(times, prepend=max(last_s, -1e300))
    if np.any(steps < 0):
        at = first + int(np.argmax(steps < 0))
        raise UnusableSeriesError(f"has time stamps that run backwards (at sample {at})")


def _runs_of_block(times: FloatArray, first: int, gap_s: float) -> Iterator[_Run]:
    breaks = np.flatnonzero(np.diff(times) > gap_s) + 1
    for a, b in pairwise([0, *breaks.tolist(), times.size]):
        part = times[a:b]
        wobble = float(np.abs(part - np.linspace(part[0], part[-1], part.size)).max())
        yield _Run(first + a, first + b, float(part[0]), float(part[-1]), wobble)


def _even_rate(groups: list[list[_Run]]) -> float:
    """Return the rate whose even grid fits every stretch, 0 when none does."""
    seconds = sum(g[-1].last_s - g[0].start_s for g in groups)
    intervals = sum(g[-1].stop - g[0].first - 1 for g in groups)
    if seconds <= 0:
        return 0.0
    measured = intervals / seconds
    rates = [rate for rate in (round(measured), round(measured, 2), measured) if rate > 0]
    return next((float(rate) for rate in rates if all(_fits(g, rate) for g in groups)), 0.0)


def _fits(runs: list[_Run], rate_hz: float) -> bool:
    """Tell whether no time stamp of a stretch is far from the even grid that starts at its first."""
    origin = runs[0]
    allowed_s = max(_EVEN_SAMPLES / rate_hz, _EVEN_S)
    return all(_off_grid_s(run, origin, rate_hz) + run.wobble_s <= allowed_s for run in runs)


def _off_grid_s(run: _Run, origin: _Run, rate_hz: float) -> float:
    start = abs(run.start_s - origin.start_s - (run.first - origin.first) / rate_hz)
    last = abs(run.last_s - origin.start_s - (run.stop - 1 - origin.first) / rate_hz)
    return max(start, last)
