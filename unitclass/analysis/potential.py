"""The membrane potential of an impaled cell over the cycles of one condition."""

from __future__ import annotations

from unitclass.analysis.cells import Cell
from unitclass.classify.membrane import MembraneLevels
from unitclass.records import Cycles, VmProfile
from unitclass.settings import Settings


def mean_potential(cell: Cell, cycles: Cycles, settings: Settings) -> VmProfile | None:
    """Return the cycle-averaged membrane potential, or None for a sorted unit."""
    if cell.membrane is None or cell.vm_spikes is None or not cycles.n_cycles:
        return None
    from unitclass.phase.vm_profile import vm_profile

    return vm_profile(cell.membrane, cell.vm_spikes, cycles, settings.membrane, n_bins=settings.phase.n_bins,
                      locked_window_ms=settings.phase.locked_window_ms)


def membrane_levels(cell: Cell, profile: VmProfile | None, cycles: Cycles) -> MembraneLevels | None:
    """Return the levels that may vote on the type, or None where there is no membrane potential.

    Where a vagus tells the end of post-inspiration, that parts post-I from E2.
    """
    if profile is None:
        return None
    from unitclass.phase.vm_profile import vm_phase_levels

    levels = vm_phase_levels(profile, cycles)
    return MembraneLevels(levels.level_mv, levels.error_mv, may_vote=not cell.vote_problem,
                          reason=cell.vote_problem)
