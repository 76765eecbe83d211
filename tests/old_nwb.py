"""NWB files that earlier versions of pynwb wrote, from pynwb's own source distribution (BSD licence).

They are fetched once by pip from the package registry it is set up for, and kept in the folder for
temporary files. Tests that need them skip, and say so, where there is no registry.
"""

from __future__ import annotations

import subprocess
import sys
import tarfile
import tempfile
from functools import lru_cache
from pathlib import Path

import pytest

VERSION = "4.2.0"
_PLACE = Path(tempfile.gettempdir()) / f"unitclass-tests-pynwb-{VERSION}"
_INSIDE = f"pynwb-{VERSION}/tests/back_compat/"


@lru_cache
def old_nwb_files() -> tuple[Path, ...]:
    """Return the files, sorted by name; skips the test when they cannot be had."""
    if not list(_PLACE.glob("*.nwb")):
        _fetch()
    return tuple(sorted(_PLACE.glob("*.nwb")))


def _fetch() -> None:
    with tempfile.TemporaryDirectory() as folder:
        done = subprocess.run([sys.executable, "-m", "pip", "download", "--quiet", "--no-deps", "--no-binary", "pynwb",
                               "--dest", folder, f"pynwb=={VERSION}"], check=False, capture_output=True, timeout=120)
        found = list(Path(folder).glob("pynwb-*.tar.gz"))
        if done.returncode or not found:
            pytest.skip(f"pynwb {VERSION}'s source distribution, with NWB files of old versions, cannot be fetched")
        _PLACE.mkdir(exist_ok=True)
        with tarfile.open(found[0]) as archive:
            for member in archive.getmembers():
                if member.name.startswith(_INSIDE) and member.name.endswith(".nwb"):
                    (_PLACE / Path(member.name).name).write_bytes(archive.extractfile(member).read())
