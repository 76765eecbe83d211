import csv

import h5py
import numpy as np
import pytest

from unitclass.io.resolver import samples_folder
from unitclass.simulate.breathing import phase_at
from unitclass.simulate.samples import SAMPLES

STEMS = ["quill-baseline", "bramble-pons-removed", "sorrel-slice", "tansy-cell-a", "tansy-cell-b"]
LIMIT_BYTES = 2_000_000


@pytest.mark.parametrize("stem", STEMS)
def test_each_sample_is_there_small_and_with_its_truth(stem):
    assert (samples_folder() / f"{stem}.nwb").stat().st_size < LIMIT_BYTES
    assert (samples_folder() / f"{stem}.truth.csv").is_file()


@pytest.mark.parametrize("stem", STEMS[:3])
def test_a_sample_of_units_covers_many_types(stem):
    with (samples_folder() / f"{stem}.truth.csv").open(encoding="utf-8") as file:
        rows = list(csv.DictReader(file))
    assert 8 <= len({row["unit"] for row in rows}) <= 20
    assert len({row["type"] for row in rows}) >= 6


def test_the_slice_as_shipped_is_what_its_seed_makes():
    session = SAMPLES[2].simulated()
    assert session.stem == "sorrel-slice"
    assert session.breaths.n_breaths >= 60
    with h5py.File(samples_folder() / "sorrel-slice.nwb") as file:
        assert np.array_equal(file["acquisition/XII rootlet/data"][()], session.nerves[0].counts)
        for i, unit in enumerate(session.units):
            stop = file["units/spike_times_index"][i]
            start = file["units/spike_times_index"][i - 1] if i else 0
            assert np.array_equal(file["units/spike_times"][start:stop], unit.spike_times_s)


def test_the_shipped_post_inspiratory_cell_fires_after_inspiration():
    sample = SAMPLES[3]
    session = sample.simulated()
    assert (session.stem, session.membrane.type) == ("tansy-cell-a", "post-I")
    phase, _ = phase_at(session.breaths, session.membrane.spikes_s)
    assert np.mean((phase > 1) & (phase < 1.6)) > 0.9
    assert session.breaths.n_breaths >= 60
    with h5py.File(samples_folder() / "tansy-cell-a.nwb") as file:
        assert np.array_equal(file["acquisition/membrane_potential/data"][()], session.membrane.counts)
