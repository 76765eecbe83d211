"""The sample sessions that come with the program: how each one is made."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path

from unitclass.simulate.session import SimulatedSession, simulate_session
from unitclass.simulate.write import write_session


@dataclass(frozen=True)
class Sample:
    """One sample file: a kind of session, its seed, its name and, for a cell, the type."""

    kind: str
    seed: int
    stem: str = ""
    cell: str = ""

    def simulated(self) -> SimulatedSession:
        """Return the session."""
        return simulate_session(self.kind, seed=self.seed, cell=self.cell, stem=self.stem)


SAMPLES = (
    Sample("three-phase", 11),
    Sample("pons-removed", 12),
    Sample("slice", 13),
    Sample("intracellular", 14, stem="tansy-cell-a", cell="post-I"),
    Sample("intracellular", 15, stem="tansy-cell-b", cell="early-I"),
)


def write_samples(folder: Path | str, *, force: bool = False) -> list[Path]:
    """Write every sample session and its truth into `folder`; return the NWB files written.

    Raises
    ------
    TargetError
        If a file exists and `force` is false, or the folder cannot be written.
    """
    written = []
    for sample in SAMPLES:
        session = sample.simulated()
        written.append(write_session(session, Path(folder) / f"{session.stem}.nwb", force=force))
    return written
