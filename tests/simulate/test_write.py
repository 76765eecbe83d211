import csv

import h5py
import numpy as np
import pynwb
import pytest
from nwbinspector import Importance, inspect_nwbfile
from pynwb import NWBHDF5IO

from unitclass.errors import TargetError
from unitclass.simulate import KINDS, simulate_session, write_session
from unitclass.simulate.curves import TYPES


@pytest.fixture(scope="module")
def written(tmp_path_factory):
    folder = tmp_path_factory.mktemp("simulated")
    sessions = {kind: simulate_session(kind, seed=2, seconds=15, raw_rate_hz=1000) for kind in KINDS}
    return {kind: (session, write_session(session, folder / f"{session.stem}.nwb"))
            for kind, session in sessions.items()}


@pytest.mark.parametrize("kind", KINDS)
def test_the_file_is_valid_nwb_by_the_standard_s_own_validator(written, kind):
    found = pynwb.validate(path=str(written[kind][1]))
    errors = found[0] if isinstance(found, tuple) else found  # pynwb before 3 adds an exit status
    assert list(errors) == []


@pytest.mark.parametrize("kind", KINDS)
def test_the_inspector_has_nothing_to_say(written, kind):
    found = list(inspect_nwbfile(nwbfile_path=str(written[kind][1]),
                                 importance_threshold=Importance.BEST_PRACTICE_SUGGESTION))
    assert [message.message for message in found] == []


@pytest.mark.parametrize("kind", ["three-phase", "pons-removed"])
def test_spike_times_and_nerves_come_back_as_simulated(written, kind):
    session, path = written[kind]
    with NWBHDF5IO(str(path), "r") as io:
        nwb = io.read()
        for i, unit in enumerate(session.units):
            assert np.array_equal(nwb.units["spike_times"][i], unit.spike_times_s)
        raw = session.nerves[0]
        series = nwb.acquisition[raw.wire.name]
        assert np.array_equal(series.data[:], raw.counts)
        assert series.conversion == raw.conversion


def test_the_truth_stands_beside_the_file_and_nowhere_in_it(written):
    session, path = written["pons-removed"]
    with path.with_suffix(".truth.csv").open(encoding="utf-8") as file:
        rows = list(csv.DictReader(file))
    assert rows == session.truth()
    names = set(TYPES) - {"NRM", "tonic", "silent"}
    with h5py.File(path) as file:
        assert set(file["units"]) == {"id", "spike_times", "spike_times_index", "obs_intervals",
                                      "obs_intervals_index", "region", "depth_um"}
        assert not any(word in names for word in _words(file))


def _words(file):
    found = []

    def look(_, item):
        found.extend(str(value) for value in item.attrs.values() if isinstance(value, str))
        if isinstance(item, h5py.Dataset) and h5py.check_string_dtype(item.dtype):
            found.extend(np.ravel(item.asstr()[()]).tolist())
    file.visititems(look)
    return {word for text in found for word in text.split()}


def test_conditions_and_exclusions_are_in_the_file(written):
    session, path = written["pons-removed"]
    with NWBHDF5IO(str(path), "r") as io:
        nwb = io.read()
        assert list(nwb.epochs["condition"][:]) == ["baseline", "pons removed"]
        assert list(nwb.invalid_times["start_time"][:]) == [gap.start_s for gap in session.exclusions]


def test_the_membrane_potential_is_in_volts_with_its_electrode(written):
    _, path = written["intracellular"]
    with NWBHDF5IO(str(path), "r") as io:
        series = io.read().acquisition["membrane_potential"]
        volts = series.data[:8000] * series.conversion
        assert -0.08 < np.median(volts) < -0.04
        assert series.electrode.cell_id == "tansy-cell-a"
        assert "potassium acetate" in series.electrode.description
        assert series.bias_current == 0


def test_an_existing_file_is_replaced_only_by_force(written, tmp_path):
    session, _ = written["slice"]
    target = write_session(session, tmp_path / "a.nwb")
    before = target.read_bytes()
    with pytest.raises(TargetError, match="--force"):
        write_session(session, target)
    assert target.read_bytes() == before
    assert write_session(session, target, force=True) == target
    assert sorted(p.name for p in tmp_path.iterdir()) == ["a.nwb", "a.truth.csv"]


def test_the_same_seed_gives_a_file_with_the_same_content(written, tmp_path):
    first = written["three-phase"][1]
    session = simulate_session("three-phase", seed=2, seconds=15, raw_rate_hz=1000)
    again = write_session(session, tmp_path / "a.nwb")
    with h5py.File(first) as one, h5py.File(again) as two:
        assert one["identifier"][()] == two["identifier"][()]
        for name in ("units/spike_times", "acquisition/phrenic/data", "processing/ecephys/vagus/data"):
            assert np.array_equal(one[name][()], two[name][()])
