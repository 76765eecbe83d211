"""Write and read labelled files in a line."""

from __future__ import annotations

from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

import pynwb

from tests.io import sources
from tests.results import labels_for
from unitclass.io.nwb_write import write_labelled
from unitclass.records import Labels, Recording, SessionResult


def label(source: Path, target: Path, result: SessionResult | None = None, recording: Recording | None = None,
          labels: Labels | None = None, **options) -> Path:
    """Label a file made by `sources.session_file`."""
    result = result or sources.one_condition()
    write_labelled(str(source), str(target), recording or sources.session_recording(source), result,
                   labels_for(result) if labels is None and result.conditions else labels or {}, **options)
    return target


def label_cell(source: Path, target: Path, result: SessionResult | None = None, **options) -> Path:
    """Label a file made by `sources.cell_file`."""
    return label(source, target, result or sources.cell_result(), sources.cell_recording(source), {}, **options)


@contextmanager
def read(path: Path) -> Iterator[pynwb.NWBFile]:
    """Open a file as any reader would."""
    with pynwb.NWBHDF5IO(path, "r", load_namespaces=True) as io:
        yield io.read()


def label_names(path: Path) -> list[str]:
    """Return the label columns in the units table."""
    with read(path) as nwb:
        return [name for name in nwb.units.colnames if "firing_type" in name]
