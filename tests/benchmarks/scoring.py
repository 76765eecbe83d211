"""The likelihood engine alone: 10,000 units x 40 bins against all families, and building the profiles.

`python -m tests.benchmarks.scoring` prints seconds of drawing the profiles of all families and of scoring.
"""

from __future__ import annotations

import os
import time

import numpy as np

from unitclass.classify.draws import Timing, draw_families
from unitclass.classify.posterior import score_units
from unitclass.classify.unit_counts import UnitCounts
from unitclass.io.template_files import read_library
from unitclass.settings import Settings

N_UNITS, N_BINS = 10_000, 40


def units(rng: np.random.Generator) -> UnitCounts:
    """Return units with Poisson counts around random smooth profiles."""
    phase = (np.arange(N_BINS) + 0.5) / 20
    away = np.abs((phase - rng.uniform(0, 2, (N_UNITS, 1)) + 1) % 2 - 1)
    rate = rng.uniform(3, 60, (N_UNITS, 1)) * np.exp(-0.5 * (away / rng.uniform(0.1, 0.6, (N_UNITS, 1))) ** 2)
    exposure = np.full((N_UNITS, N_BINS), 5.0)
    thirds = rng.poisson(rate[:, None] * exposure[:, None] / 3, (N_UNITS, 3, N_BINS)).astype(float)
    return UnitCounts(thirds.sum(axis=1), exposure, thirds, np.repeat(exposure[:, None] / 3, 3, axis=1),
                      np.ones(N_UNITS), np.full(N_UNITS, 0.002))


def main() -> None:
    """Print the two times."""
    settings, library, many = Settings(), read_library(), units(np.random.default_rng(1))
    start = time.perf_counter()
    drawn = draw_families(library, Timing(1.0, 2.0), n_bins=N_BINS, n_draws=settings.classify.n_draws)
    built = time.perf_counter() - start
    start = time.perf_counter()
    table = score_units(many, drawn, settings.classify)
    print(f"{os.cpu_count()} cores; profiles of {len(drawn.types)} families, {len(drawn.rate)} in all: {built:.2f} s; "
          f"{len(table)} units x {N_BINS} bins scored in {time.perf_counter() - start:.2f} s")


if __name__ == "__main__":
    main()
