"""Shape groups over all open sessions: which units fire alike, whatever they are called."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from unitclass.classify.clustering import group_names
from unitclass.io.session_view import SessionView
from unitclass.review.entry import EntryKey


def grouped(views: Sequence[SessionView]) -> dict[EntryKey, str]:
    """Return the group of every unit that has a shape; empty where there are too few units to group."""
    keys, rates = [], []
    for view in views:
        for light, rate in zip(view.units, view.rates_hz(), strict=True):
            if light.ranked:
                keys.append((view.head.path, light.unit, light.condition))
                rates.append(rate)
    names = group_names(np.stack(rates)) if rates else ()
    return {key: name for key, name in zip(keys, names, strict=True) if name}
