"""Changes to a condition's cycles that are not stored yet: what the cycles screen works on."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field, replace

import numpy as np

from unitclass.records import BoolArray, CycleEdit, Cycles

STEP = 1.1
LEAST, MOST = 0.1, 10.0


@dataclass(frozen=True)
class CycleDraft:
    """A threshold asked for, and cycles to drop or take in again.

    Attributes
    ----------
    condition : str
    cycles : Cycles
        As they were found last.
    threshold : float
        Level in force on the reference envelope; NaN when the detector tells none.
    scale_in_force : float
        Factor on the detector's own level that made `threshold`.
    scale : float
        The factor asked for.
    turned : tuple of int
        Cycles whose acceptance is to be turned, in the order in which that was asked.
    """

    condition: str
    cycles: Cycles
    threshold: float
    scale_in_force: float = 1.0
    scale: float = 1.0
    turned: tuple[int, ...] = ()
    past: tuple[CycleDraft, ...] = field(default=(), repr=False)

    @staticmethod
    def of(condition: str, cycles: Cycles, threshold: float, edits: Sequence[CycleEdit]) -> CycleDraft:
        """Return a draft without changes; `edits` are those in force, oldest first."""
        scales = [e.value for e in edits if e.condition == condition and e.action == "threshold"]
        scale = scales[-1] if scales else 1.0
        return CycleDraft(condition, cycles, threshold, scale, scale)

    @property
    def is_changed(self) -> bool:
        """Return whether there is anything to apply."""
        return bool(self.turned) or self.scale != self.scale_in_force

    @property
    def level(self) -> float:
        """Return the threshold asked for, in the envelope's unit."""
        return self.threshold * self.scale / self.scale_in_force

    @property
    def accepted(self) -> BoolArray:
        """Return which cycles would be used, were the threshold left alone."""
        accepted = self.cycles.accepted.copy()
        for index in self.turned:
            accepted[index] = not accepted[index]
        return accepted

    def moved(self, steps: int) -> CycleDraft:
        """Return the draft with the threshold moved by steps of a tenth of itself."""
        scale = round(float(np.clip(self.scale * STEP**steps, LEAST, MOST)), 4)
        return replace(self, scale=scale, past=(*self.past, self))

    def toggled(self, index: int) -> CycleDraft:
        """Return the draft with a cycle dropped, or taken in again."""
        left = tuple(i for i in self.turned if i != index)
        turned = left if index in self.turned else (*self.turned, index)
        return replace(self, turned=turned, past=(*self.past, self))

    def undone(self) -> CycleDraft:
        """Return the draft before its last change."""
        return self.past[-1] if self.past else self

    def edits(self) -> tuple[CycleEdit, ...]:
        """Return the changes as the store keeps them, the threshold first."""
        edits = []
        if self.scale != self.scale_in_force:
            edits.append(CycleEdit(self.condition, "threshold", value=self.scale))
        accepted = self.accepted
        for index in self.turned:
            middle = float(self.cycles.onset_s[index] + self._span(index) / 2)
            edits.append(CycleEdit(self.condition, "restore" if accepted[index] else "drop", at_s=middle))
        return tuple(edits)

    def _span(self, index: int) -> float:
        end = float(self.cycles.end_s[index])
        return end - float(self.cycles.onset_s[index]) if np.isfinite(end) else 0.0
