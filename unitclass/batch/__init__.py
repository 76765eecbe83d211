"""Many files: local processes, or a Dask cluster; one bad file never stops the rest."""

from unitclass.batch.files import Outcome, Plan, analyse_file, analyse_files, read_planned
from unitclass.batch.runners import runner_for

__all__ = ["Outcome", "Plan", "analyse_file", "analyse_files", "read_planned", "runner_for"]
