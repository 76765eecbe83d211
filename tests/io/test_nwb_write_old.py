"""Files of NWB 2.0 to 2.10, with and without extensions, can be labelled.

Outside check: the files that pynwb itself is tested with, its validator and the NWB inspector.
"""

from __future__ import annotations

import h5py
import pytest

from tests.io.labelling import label, read
from tests.old_nwb import old_nwb_files
from tests.results import session_result
from unitclass.records import Recording

inspector = pytest.importorskip("nwbinspector", reason="nwbinspector is in the extra 'test'")


def messages(path):
    # Without the place, which differs when raw data is linked.
    return {(m.importance.name, m.check_function_name, m.message)
            for m in inspector.inspect_nwbfile(nwbfile_path=str(path)) if "external_file" not in m.check_function_name}


CHOSEN = (
    ("1.0.2_nwbfile.nwb", "2.0b", False), ("1.0.3_str_pub.nwb", "2.0.2", True), ("1.1.0_nwbfile.nwb", "2.1.0", False),
    ("1.1.2_str_experimenter.nwb", "2.1.0", True), ("1.5.1_imageseries_no_unit.nwb", "2.3.0", True),
    ("2.1.0_nwbfile_with_extension.nwb", "2.5.0", False), ("3.0.0_fiber_photometry_extension.nwb", "2.8.0", True))


@pytest.mark.slow
@pytest.mark.parametrize(("name", "version", "link_raw"), CHOSEN)
def test_a_file_of_an_earlier_version_can_be_labelled_and_nothing_new_is_found_in_it(
        tmp_path, name, version, link_raw):
    source = next(path for path in old_nwb_files() if path.name == name)
    with h5py.File(source) as file:
        assert str(file.attrs["nwb_version"]) == version
    recording = Recording(str(source), "", "", "", "", 0.0, 1.0)
    target = label(source, tmp_path / name, session_result(units={}), recording, link_raw=link_raw)
    assert messages(target) <= messages(source)
    with read(target) as nwb:
        assert len(nwb.intervals["respiratory_cycles"]) == 78
