"""How many units of each type, with intervals, and one row per animal for statistics."""

from __future__ import annotations

import math
from collections import Counter
from collections.abc import Iterable, Sequence
from dataclasses import dataclass

Z95 = 1.959963984540054


@dataclass(frozen=True)
class TypedUnit:
    """One unit in one condition with its type and whether a person decided it."""

    animal: str
    session: str
    condition: str
    unit: str
    type: str
    is_decided: bool


@dataclass(frozen=True)
class TypeCount:
    """Units of one type among all of an animal and condition, with Wilson's 95 % interval of the share."""

    animal: str
    condition: str
    type: str
    n: int
    of: int
    low: float
    high: float

    @property
    def share(self) -> float:
        """Return the share of the type."""
        return self.n / self.of if self.of else math.nan


def wilson(n: int, of: int) -> tuple[float, float]:
    """Return the 95 % score interval of a share [1]_; (nan, nan) of nothing.

    References
    ----------
    .. [1] E. B. Wilson, "Probable inference, the law of succession, and statistical inference",
       J Am Stat Assoc 22:209, 1927.
    """
    if not of:
        return math.nan, math.nan
    p, z2 = n / of, Z95**2
    middle = (p + z2 / (2 * of)) / (1 + z2 / of)
    half = Z95 / (1 + z2 / of) * math.sqrt(p * (1 - p) / of + z2 / (4 * of**2))
    return max(0.0, middle - half), min(1.0, middle + half)


def type_counts(units: Iterable[TypedUnit], order: Sequence[str], *, by_animal: bool = True) -> tuple[TypeCount, ...]:
    """Count types per animal and condition, types in the order given, those unknown to it last.

    Without `by_animal` all animals count together, under the name "".
    """
    groups: dict[tuple[str, str], Counter[str]] = {}
    for unit in units:
        groups.setdefault((unit.animal if by_animal else "", unit.condition), Counter())[unit.type] += 1
    rows = []
    for (animal, condition), counter in groups.items():
        of = sum(counter.values())
        names = [name for name in order if name in counter] + sorted(set(counter) - set(order))
        rows += [TypeCount(animal, condition, name, counter[name], of, *wilson(counter[name], of)) for name in names]
    return tuple(rows)


def animal_rows(units: Iterable[TypedUnit], order: Sequence[str]) -> list[dict[str, str | int | float | None]]:
    """Return one row per animal and condition, one column per type: animals are the sample, not units.

    Every row has the same columns; a type that an animal lacks counts 0.
    """
    found = list(units)
    types = [name for name in order if any(u.type == name for u in found)]
    types += sorted({u.type for u in found} - set(types))
    rows: list[dict[str, str | int | float | None]] = []
    for animal, condition in dict.fromkeys((u.animal, u.condition) for u in found):
        mine = [u for u in found if (u.animal, u.condition) == (animal, condition)]
        counter = Counter(u.type for u in mine)
        rows.append({"animal": animal, "condition": condition, "n_sessions": len({u.session for u in mine}),
                     "n_units": len(mine), "n_decided": sum(u.is_decided for u in mine),
                     **{f"n_{name}": counter[name] for name in types},
                     **{f"share_{name}": round(counter[name] / len(mine), 6) for name in types}})
    return rows
