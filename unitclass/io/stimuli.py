"""Current pulses and other stimuli as windows to leave out, where the user asks for it."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from fnmatch import fnmatch

import h5py
import numpy as np

from unitclass.io.series import Series, peek
from unitclass.records import Exclusion
from unitclass.settings import RigSettings

_JOIN_S = 0.05  # pulses closer than this are one window


def is_named(word: str, names: Sequence[str]) -> bool:
    """Tell whether the user's list holds a word: the case of letters apart, `*` and `?` as in file names."""
    return any(fnmatch(word.strip().lower(), name.strip().lower()) for name in names)


def stimulus_windows(file: h5py.File, path: str, series: Sequence[Series], rig: RigSettings) -> tuple[Exclusion, ...]:
    """Return when the stimulus series named in the settings (`rig.exclude`) leave their baseline."""
    return tuple(Exclusion(start, stop, f"stimulus {one.name}") for one in series if is_named(one.name, rig.exclude)
                 for start, stop in _windows(path, one, _baseline(file, one)))


def _baseline(file: h5py.File, series: Series) -> float:
    """Return the stimulus' resting value: 0 where it takes it, else the middle of what was looked at."""
    values = np.concatenate([part[:, 0] for part in peek(file, series, n_places=5)])
    return 0.0 if np.any(values == 0) else float(np.median(values))


def _windows(path: str, series: Series, baseline: float) -> list[tuple[float, float]]:
    found: list[tuple[float, float]] = []
    for start, stop in _pulses(path, series, baseline):
        if found and start - found[-1][1] <= _JOIN_S:
            found[-1] = (found[-1][0], stop)
        else:
            found.append((start, stop))
    return found


def _pulses(path: str, series: Series, baseline: float) -> Iterator[tuple[float, float]]:
    reader, step = series.reader(path, 0), 1.0 / series.times.rate_hz
    largest = max((float(np.abs(chunk.values - baseline).max()) for chunk in reader.chunks()), default=0.0)
    if largest == 0.0:
        return
    for chunk in reader.chunks():
        away = np.concatenate([[False], np.abs(chunk.values - baseline) > 0.1 * largest, [False]])
        edges = np.flatnonzero(np.diff(away.astype(np.int8)))
        for first, last in edges.reshape(-1, 2):
            yield chunk.start_s + first * step, chunk.start_s + last * step
