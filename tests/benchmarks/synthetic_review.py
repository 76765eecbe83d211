"""Two thousand synthetic units of several files in a result cache, and a program that reviews them.

`python -m tests.benchmarks.synthetic_review FOLDER make` fills FOLDER;
`python -m tests.benchmarks.synthetic_review FOLDER` opens the review on it, as a second opening does;
with `busy` after it, a niced process computes meanwhile, as the analysis of further files would.
"""

from __future__ import annotations

import os
import sys
from functools import partial
from pathlib import Path

N_FILES, N_UNITS = 10, 200
KINDS = ("pre-I", "early-I", "ramp-I", "post-I", "aug-E", "late-E")


def make(folder: Path) -> None:
    """Write the cache, and empty files for it to belong to."""
    from dataclasses import replace

    import numpy as np

    from tests.results import session_result
    from unitclass.io.result_cache import FileStamp, ResultCache

    rng = np.random.default_rng(20)
    cache = ResultCache(folder / "cache.sqlite")
    for number in range(N_FILES):
        path = folder / f"heron_{number:02d}.nwb"
        path.write_bytes(b"")
        session = session_result(str(path), conditions=("baseline",), identifier=f"heron-{number}",
                                 object_id=f"object-{number}")
        condition = session.conditions[0]
        units = tuple(_noisy(f"{n}", KINDS[int(rng.integers(len(KINDS)))], rng) for n in range(N_UNITS))
        nerves = (*condition.nerve_profiles, _vagus(condition.nerve_profiles[0]))
        session = replace(session, conditions=(replace(condition, units=units, nerve_profiles=nerves),))
        cache.put(session, FileStamp.of(path), _key())
    cache.close()


def _vagus(profile):  # type: ignore[no-untyped-def]
    from dataclasses import replace

    import numpy as np

    half = profile.mean.size // 2
    mean = np.concatenate([np.linspace(0.1, 0.3, half), np.linspace(0.4, 0.05, half)])
    return replace(profile, name="cVN", role="vagus", mean=mean)


def _noisy(name, kind, rng):  # type: ignore[no-untyped-def]
    """Return a unit whose counts are Poisson, and whose probability is anything."""
    from dataclasses import replace

    import numpy as np

    from tests.results import suggestion, unit_result
    from unitclass.records import Raster

    unit = unit_result(name, kind, digest=f"{rng.integers(1 << 60):x}")
    h = unit.histogram
    counts = rng.poisson(h.counts * rng.uniform(0.3, 2.0)).astype(float)
    rate, error = counts / h.exposure_s, 2 * np.sqrt(counts) / h.exposure_s
    histogram = replace(h, counts=counts, low_hz=np.maximum(rate - error, 0), high_hz=rate + error)
    phase = np.repeat(h.centres, counts.astype(int)) + rng.uniform(-0.025, 0.025, int(counts.sum()))
    row = rng.integers(0, h.n_cycles, phase.size)
    raster = Raster((phase % 2).astype(np.float32), row.astype(np.int32), h.n_cycles, h.n_cycles)
    return replace(unit, histogram=histogram, raster=raster, n_spikes=phase.size,
                   suggestion=suggestion(kind, h, float(rng.uniform(0.3, 1.0))))


def _key():  # type: ignore[no-untyped-def]
    from unitclass.io.result_cache import CacheKey

    return CacheKey("5e771265d1ce", "7e3b1a7ed1ce")


def burn(path: str) -> str:
    """Compute until the program that wants it ends."""
    import numpy as np

    while True:
        np.linalg.svd(np.random.default_rng(1).normal(size=(200, 200)))


def groups(folder: Path):  # type: ignore[no-untyped-def]
    """Return the shape groups, as the program makes them."""
    from unitclass.review.grouping import grouped

    return grouped(kept(folder))


def kept(folder: Path):  # type: ignore[no-untyped-def]
    """Return the results that are in the cache."""
    from unitclass.io.result_cache import ResultCache

    cache = ResultCache(folder / "cache.sqlite")
    views = [cache.find(path, _key()) for path in sorted(folder.glob("*.nwb"))]
    assert None not in views
    return views


def types():  # type: ignore[no-untyped-def]
    """Return the types that come with the program."""
    from unitclass.io.template_files import read_library

    return read_library()


def review(folder: Path, is_busy: bool) -> int:
    """Open the review on the cache."""
    from unitclass.tui.app import ReviewApp, run_review  # first: it sets the toolkit up

    from unitclass.io.decisions import DecisionStore  # isort: skip
    from unitclass.review.session import ReviewSession

    session = ReviewSession(DecisionStore(folder / "decisions.sqlite"), "Ada Fischer")
    session.add_session(*kept(folder))
    pending = [str(folder / "further.nwb")] if is_busy else []
    session.expect(pending)
    app = ReviewApp(session, library=types, analyse=burn, pending=pending, group=partial(groups, folder))
    return run_review(app)


if __name__ == "__main__":
    os.environ.setdefault("OPENBLAS_NUM_THREADS", "1")
    if sys.argv[2:] == ["make"]:
        make(Path(sys.argv[1]))
    else:
        sys.exit(review(Path(sys.argv[1]), sys.argv[2:] == ["busy"]))
