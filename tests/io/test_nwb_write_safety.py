"""Nothing half-written, nothing lost, one line for whatever goes wrong."""

from __future__ import annotations

import errno
import os
import subprocess
import sys
from dataclasses import replace

import h5py
import numpy as np
import pytest

from tests.io import sources
from tests.io.labelling import label, read
from unitclass.errors import FileError, TargetError
from unitclass.io import labelling, nwb_check, nwb_write


@pytest.fixture
def source(tmp_path):
    folder = tmp_path / "rig"
    folder.mkdir()
    return sources.session_file(folder / "heron_04.nwb")


@pytest.fixture
def out(tmp_path):
    folder = tmp_path / "out"
    folder.mkdir()
    return folder


# ------------------------------------------------------------------------------- failures

def test_an_existing_target_is_kept_without_force(source, out):
    (out / "x.nwb").write_text("precious")
    with pytest.raises(TargetError, match="exists already; give --force to replace it"):
        label(source, out / "x.nwb")
    assert (out / "x.nwb").read_text() == "precious"
    label(source, out / "x.nwb", force=True)
    assert h5py.is_hdf5(out / "x.nwb")
    assert os.listdir(out) == ["x.nwb"]


def test_the_source_is_refused_as_target_even_with_force(source):
    before = source.read_bytes()
    with pytest.raises(TargetError, match="is the source itself"):
        label(source, source, force=True)
    assert source.read_bytes() == before


@pytest.mark.parametrize("place", ["_copy", "add_labels", "check_written"])
@pytest.mark.parametrize("failure", [
    OSError(errno.ENOSPC, "No space left on device"),
    RuntimeError("Unable to flush file (file write failed: time = now, errno = 28, error message = 'No space')")])
def test_a_disk_that_fills_up_at_any_moment_leaves_nothing(source, out, monkeypatch, place, failure):
    def fail(*_args, **_options):
        raise failure

    monkeypatch.setattr(nwb_write, place, fail)
    with pytest.raises(TargetError) as caught:
        label(source, out / "x.nwb")
    assert str(caught.value) == f"{out / 'x.nwb'}: the disk is full; free some space or name another folder"
    assert os.listdir(out) == []


@pytest.mark.slow
@pytest.mark.skipif(sys.platform != "linux", reason="needs the file size limit of Linux")
@pytest.mark.parametrize(("share", "link_raw"), [(0.0, False), (0.5, False), (1.0, False), (1.05, False),
                                                 (0.0, True), (1.0, True)])
def test_a_real_limit_on_the_file_size_is_one_line_and_leaves_nothing(source, out, share, link_raw):
    limit = int((source.stat().st_size if not link_raw else 500_000) * share)
    code = f"""
import resource, signal, sys
import pynwb  # may keep a file of its own in the user's cache, which the limit would cut
signal.signal(signal.SIGXFSZ, signal.SIG_IGN)
resource.setrlimit(resource.RLIMIT_FSIZE, ({limit}, {limit}))
from pathlib import Path
from tests.io.labelling import label
from unitclass.errors import TargetError
try:
    label(Path({str(source)!r}), Path({str(out / "x.nwb")!r}), link_raw={link_raw})
except TargetError as problem:
    sys.exit(3 if "larger than this system allows" in str(problem) else f"odd: {{problem}}")
"""
    done = subprocess.run([sys.executable, "-W", "ignore", "-c", code], check=False, capture_output=True, text=True)
    assert (done.returncode, done.stderr) == (3, "")
    assert os.listdir(out) == []


def test_a_value_that_reads_back_differently_is_not_handed_out(source, out, monkeypatch):
    def spoil(path, given):
        written = labelling.add_labels(path, given)
        with h5py.File(path, "r+") as file:
            file["analysis/phase_histograms/counts"][0, 0] += 1
        return written

    monkeypatch.setattr(nwb_write, "add_labels", spoil)
    with pytest.raises(TargetError, match="column counts of /analysis/phase_histograms does not read back"):
        label(source, out / "x.nwb")
    assert os.listdir(out) == []


def test_a_copy_that_would_not_be_valid_is_not_handed_out(source, out, monkeypatch):
    def spoil(path, given):
        written = labelling.add_labels(path, given)
        with h5py.File(path, "r+") as file:
            del file["session_description"]
        return written

    monkeypatch.setattr(nwb_write, "add_labels", spoil)
    with pytest.raises(TargetError, match=r"would not be valid NWB .*session_description"):
        label(source, out / "x.nwb")
    assert os.listdir(out) == []


def test_what_is_wrong_with_the_source_already_does_not_stop_the_export(source, out):
    with h5py.File(source, "r+") as file:
        del file["session_description"]
    label(source, out / "x.nwb")
    assert nwb_check._validation_errors(str(out / "x.nwb")) == nwb_check._validation_errors(str(source))


@pytest.mark.skipif(not hasattr(os, "geteuid") or os.geteuid() == 0, reason="root may write anywhere")
def test_a_folder_that_may_not_be_written_is_named(source, out):
    out.chmod(0o555)
    with pytest.raises(TargetError, match="the folder cannot be written"):
        label(source, out / "x.nwb")


def test_a_missing_folder_is_named(source, out):
    with pytest.raises(TargetError, match="the folder does not exist; make it first"):
        label(source, out / "no" / "x.nwb")


def test_a_source_that_is_gone_or_cut_off_is_a_matter_of_the_source(source, out):
    recording = sources.session_recording(source)
    with source.open("r+b") as file:
        file.truncate(4096)
    with pytest.raises(FileError, match=r"heron_04\.nwb"):
        label(source, out / "x.nwb", recording=recording)
    source.unlink()
    with pytest.raises(FileError, match="there is no such file"):
        label(source, out / "x.nwb", recording=recording)
    assert os.listdir(out) == []


def test_a_units_table_that_is_not_the_one_analysed_is_refused(source, out):
    recording = sources.session_recording(source)
    other = replace(recording, units=(*recording.units, replace(recording.units[0], id="99")))
    with pytest.raises(TargetError, match="6 units were analysed, but /units has 5; analyse it again"):
        label(source, out / "x.nwb", recording=other)


# ------------------------------------------------------------------ what points elsewhere

@pytest.fixture
def unchecked(monkeypatch):
    """Skip the program's own check, which takes longest; these tests look at the file themselves."""
    monkeypatch.setattr(nwb_write, "check_written", lambda *_: None)


def test_linked_raw_data_reads_the_same_and_takes_no_room(source, out):
    label(source, out / "x.nwb", link_raw=True)
    with h5py.File(out / "x.nwb") as file:
        link = file["acquisition/PNA"].get("data", getlink=True)
        assert isinstance(link, h5py.ExternalLink)
        assert (link.filename, link.path) == ("../rig/heron_04.nwb", "/acquisition/PNA/data")
    with read(source) as old, read(out / "x.nwb") as new:
        for name in ("PNA", "cVN"):
            np.testing.assert_array_equal(new.acquisition[name].data[:], old.acquisition[name].data[:])
        np.testing.assert_array_equal(new.acquisition["cVN"].timestamps[:], old.acquisition["cVN"].timestamps[:])
        assert list(new.acquisition["PNA"].electrodes.data[:]) == [0]
        assert new.acquisition["PNA"].electrodes.table is new.electrodes
        assert new.electrodes["group"][0] is new.electrode_groups["nerve"]
        assert (new.units["spike_times"][2] == old.units["spike_times"][2]).all()
    assert (out / "x.nwb").stat().st_size < source.stat().st_size / 3


@pytest.mark.usefixtures("unchecked")
def test_a_moved_pair_of_linked_files_stays_together(source, out, tmp_path):
    label(source, out / "x.nwb", link_raw=True)
    (tmp_path / "elsewhere").mkdir()
    for folder in (source.parent, out):
        folder.rename(tmp_path / "elsewhere" / folder.name)
    with read(tmp_path / "elsewhere" / "out" / "x.nwb") as nwb:
        assert nwb.acquisition["PNA"].data.shape == (240_000, 1)


@pytest.mark.usefixtures("unchecked")
def test_a_linked_copy_keeps_types_attributes_links_and_references(source, out):
    odd = np.array([(1, b"x"), (2, b"y")], dtype=[("n", "<i2"), ("s", "S3")])
    with h5py.File(source, "r+") as file:
        scratch = file.require_group("scratch")
        scratch["compound"] = odd
        scratch["twice"] = scratch["compound"]
        scratch["soft"] = h5py.SoftLink("/scratch/compound")
        scratch["gone"] = h5py.SoftLink("/nowhere")
        scratch.create_dataset("packed", data=np.arange(10_000), chunks=(100,), compression="gzip", shuffle=True)
        scratch["packed"].attrs["nothing"] = h5py.Empty("f4")
        scratch["packed"].attrs["fixed"] = np.array([b"ab", b"c"])
        both = np.dtype([("to", h5py.ref_dtype), ("n", "<i4")])
        scratch.create_dataset("refs", data=np.array([(scratch["compound"].ref, 7)], dtype=both))
        scratch.create_dataset("empty_ref", data=np.array([h5py.Reference()], dtype=h5py.ref_dtype))
    label(source, out / "x.nwb", link_raw=True)
    with h5py.File(out / "x.nwb") as file:
        scratch = file["scratch"]
        np.testing.assert_array_equal(scratch["compound"][()], odd)
        assert scratch["twice"] == scratch["compound"] == scratch["soft"]
        assert scratch.get("gone", getlink=True).path == "/nowhere"
        assert (scratch["packed"].chunks, scratch["packed"].compression) == ((100,), "gzip")
        assert isinstance(scratch["packed"].attrs["nothing"], h5py.Empty)
        assert scratch["packed"].attrs.get_id("fixed").dtype == np.dtype("S2")
        assert file[scratch["refs"][0]["to"]].name == "/scratch/compound"
        assert scratch["refs"][0]["n"] == 7
        assert not scratch["empty_ref"][0]
        assert "/specifications" in (file[file.attrs[".specloc"]].name,)


@pytest.mark.usefixtures("unchecked")
def test_region_references_cannot_be_linked_and_are_named(source, out):
    with h5py.File(source, "r+") as file:
        file["scratch/target"] = np.arange(5)
        kind = h5py.regionref_dtype
        file["scratch/region"] = np.array([file["scratch/target"].regionref[1:3]], dtype=kind)
    with pytest.raises(TargetError, match=r"region references.*export without --link-raw"):
        label(source, out / "x.nwb", link_raw=True)
    label(source, out / "x.nwb")


@pytest.mark.parametrize("link_raw", [False, True])
@pytest.mark.usefixtures("unchecked")
def test_links_to_other_files_still_lead_there_from_another_folder(source, out, link_raw):
    with h5py.File(source.parent / "raw.h5", "w") as raw:
        raw["trace"] = np.arange(7.0)
    with h5py.File(source, "r+") as file:
        file["scratch/link"] = h5py.ExternalLink("raw.h5", "/trace")
        file["scratch/broken"] = h5py.ExternalLink("lost.h5", "/trace")
        layout = h5py.VirtualLayout(shape=(7,), dtype=float)
        layout[:] = h5py.VirtualSource("raw.h5", "trace", shape=(7,))
        file["scratch"].create_virtual_dataset("virtual", layout)
        file["scratch/virtual"].attrs["unit"] = "V"
    label(source, out / "x.nwb", link_raw=link_raw)
    with h5py.File(out / "x.nwb") as file:
        np.testing.assert_array_equal(file["scratch/link"][()], np.arange(7.0))
        np.testing.assert_array_equal(file["scratch/virtual"][()], np.arange(7.0))
        assert file["scratch/virtual"].attrs["unit"] == "V"
        assert file["scratch"].get("broken", getlink=True).filename == "../rig/lost.h5"


@pytest.mark.parametrize("link_raw", [False, True])
@pytest.mark.usefixtures("unchecked")
def test_films_named_by_an_image_series_still_lead_there(source, out, link_raw):
    from pynwb import NWBHDF5IO
    from pynwb.image import ImageSeries

    (source.parent / "film.avi").write_bytes(b"x")
    with NWBHDF5IO(source, "a") as io:
        nwb = io.read()
        nwb.add_acquisition(ImageSeries(name="film", external_file=["film.avi", "lost.avi"], format="external",
                                        starting_frame=[0, 10], timestamps=np.arange(20) / 25, unit="n.a.",
                                        description="the bath"))
        io.write(nwb)
    label(source, out / "x.nwb", link_raw=link_raw)
    with read(out / "x.nwb") as nwb:
        assert list(nwb.acquisition["film"].external_file[:]) == ["../rig/film.avi", "lost.avi"]
        assert list(nwb.acquisition["film"].starting_frame[:]) == [0, 10]


@pytest.mark.usefixtures("unchecked")
def test_units_in_another_file_are_never_written_to(source, out):
    other = source.parent / "units.nwb"
    source.rename(other)
    sources.session_file(source, ())
    with h5py.File(source, "r+") as file:
        file["units"] = h5py.ExternalLink("units.nwb", "/units")
    before = other.read_bytes()
    label(source, out / "x.nwb")
    assert other.read_bytes() == before
    with h5py.File(out / "x.nwb") as file:
        assert "firing_type" not in file["units"]
        assert list(file["analysis/firing_types/unit_id"].asstr()[:]) == ["3", "7", "12", "20", "31"]


@pytest.mark.usefixtures("unchecked")
def test_an_analysis_group_in_another_file_is_refused(source, out):
    with h5py.File(source.parent / "other.h5", "w") as other:
        other.create_group("analysis")
    with h5py.File(source, "r+") as file:
        del file["analysis"]
        file["analysis"] = h5py.ExternalLink("other.h5", "/analysis")
    with pytest.raises(TargetError, match="keeps its /analysis in another file"):
        label(source, out / "x.nwb")
    assert os.listdir(out) == []
