"""How often suggestions are right, on units of simulators that the engine was not built on.

`python -m tests.benchmarks.accuracy [--n 6] [--cycles 15 40 120] [--oracle]` prints, for each simulator and
regime, from raw nerve to label: macro recall over the types of the trade, calibration error (10 bins of equal
count), how many suggestions at 0.95 or over are right, hits and false alarms of `other`, and beside them what
correlating with mean templates reaches (and, with --oracle, an observer who knows the simulator's families).
"""

from __future__ import annotations

import argparse
import warnings
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from tests.simulators.sessions import whole
from unitclass.analysis import analyse
from unitclass.classify.draws import Timing, draw_families
from unitclass.io.template_files import read_library
from unitclass.records import NOT_MODULATED, OTHER, FloatArray, UnitResult
from unitclass.settings import Settings

SIMULATORS = ("rates", "resampled", "integrate-fire")
REGIMES = ("three-phase", "two-phase", "one-phase")


@dataclass(frozen=True)
class Judged:
    """True and suggested types with their probabilities; `by_template` is what correlation says."""

    truth: np.ndarray
    suggested: np.ndarray
    probability: FloatArray
    by_template: np.ndarray
    by_oracle: np.ndarray

    def recalls(self, answer: np.ndarray) -> dict[str, float]:
        """Return the share of each type that an answer names rightly."""
        return {t: float(np.mean(answer[self.truth == t] == t)) for t in dict.fromkeys(self.truth)}


def judged(simulator: str, regime: str, n: int, n_cycles: int, seed: int, *, with_oracle: bool) -> Judged:
    """Simulate a session with `n` units a type and return what the program says of the units it can judge."""
    rng = np.random.default_rng([seed, SIMULATORS.index(simulator), REGIMES.index(regime), n_cycles])
    recording, units = whole(simulator, regime, n, n_cycles=n_cycles, rng=rng)
    result = analyse(recording, LIBRARY, Settings())
    found = result.conditions[0].units
    enough = [i for i, unit in enumerate(found) if unit.suggestion.probabilities]
    truth = np.array(units.types)[enough]
    said = np.array([found[i].suggestion.type for i in enough])
    sure = np.array([found[i].suggestion.probability for i in enough])
    cycles = units.cycles
    timing = Timing(float(np.median(cycles.ti_s)), float(np.median(cycles.te_s)))
    return Judged(truth, said, sure, _by_template([found[i] for i in enough], timing),
                  _by_oracle(simulator, regime, units, enough, rng) if with_oracle else np.array([]))


def _by_template(units: Sequence[UnitResult], timing: Timing) -> np.ndarray:
    """Return the type whose mean profile correlates best: the script that many would write."""
    drawn = draw_families(LIBRARY, timing, n_bins=units[0].histogram.n_bins, n_draws=256)
    phasic = [t for t in drawn.types if t != NOT_MODULATED]
    means = np.stack([drawn.rate[drawn.rows(t)].mean(axis=0) for t in phasic])
    best = []
    for unit in units:
        r = np.corrcoef(np.vstack([np.nan_to_num(unit.histogram.rate_hz), means]))[0, 1:]
        best.append(NOT_MODULATED if not unit.modulation.eta_squared_p <= 0.05 else phasic[int(np.argmax(r))])
    return np.array(best)


def _by_oracle(simulator: str, regime: str, units: object, enough: Sequence[int], rng: np.random.Generator) -> np.ndarray:
    from tests.simulators.oracle import oracle

    judge = oracle(simulator, units.cycles, regime, rng)  # type: ignore[attr-defined]
    names = judge.names(units.trains, units.cycles)  # type: ignore[attr-defined]
    return np.array(names)[list(enough)]


def pooled(parts: Sequence[Judged]) -> Judged:
    """Return several sessions as one."""
    return Judged(*(np.concatenate([getattr(p, name) for p in parts]) for name in
                    ("truth", "suggested", "probability", "by_template", "by_oracle")))


def calibration_error(probability: FloatArray, right: np.ndarray, n_bins: int = 10) -> float:
    """Return the expected calibration error over bins of equal count."""
    parts = np.array_split(np.argsort(probability, kind="stable"), n_bins)
    return float(sum(len(p) * abs(probability[p].mean() - right[p].mean()) for p in parts if len(p)) / len(right))


def macro(recalls: dict[str, float]) -> float:
    """Return the mean recall over the types, `other` apart."""
    return float(np.mean([v for t, v in recalls.items() if t != OTHER]))


def line(name: str, j: Judged) -> str:
    """Return one row of the table."""
    right = j.suggested == j.truth
    sure = j.probability >= 0.95
    ordinary = j.truth != OTHER
    recalls = j.recalls(j.suggested)
    oracle = f"{macro(j.recalls(j.by_oracle)):7.3f}" if j.by_oracle.size else "      -"
    return (f"{name:34s}{len(right):6d}{macro(recalls):8.3f}{macro(j.recalls(j.by_template)):10.3f}{oracle}"
            f"{calibration_error(j.probability, right):8.3f}{right[sure].mean():8.3f}{sure.mean():7.2f}"
            f"{recalls.get(OTHER, np.nan):8.2f}{np.mean(j.suggested[ordinary] == OTHER):8.3f}")


HEAD = (f"{'simulator, regime, cycles':34s}{'units':>6s}{'recall':>8s}{'template':>10s}{'oracle':>7s}{'ECE':>8s}"
        f"{'p>=.95':>8s}{'share':>7s}{'other':>8s}{'false':>8s}")
LIBRARY = read_library()


def main() -> None:
    """Print the table and the recall of each type."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--n", type=int, default=4, help="units a type and session")
    parser.add_argument("--cycles", type=int, nargs="+", default=[15, 40, 120])
    parser.add_argument("--simulators", nargs="+", default=list(SIMULATORS))
    parser.add_argument("--seed", type=int, default=1)
    parser.add_argument("--oracle", action="store_true")
    args = parser.parse_args()
    warnings.simplefilter("ignore")
    print(HEAD)
    everything: list[Judged] = []
    for simulator in args.simulators:
        mine = []
        for regime in REGIMES:
            for n_cycles in args.cycles:
                one = judged(simulator, regime, args.n, n_cycles, args.seed, with_oracle=args.oracle)
                print(line(f"{simulator}, {regime}, {n_cycles}", one), flush=True)
                mine.append(one)
        print(line(f"{simulator}, all", pooled(mine)))
        everything += mine
    whole_set = pooled(everything)
    print(line("all", whole_set))
    print("recall of each type:", ", ".join(f"{t} {r:.2f}" for t, r in sorted(
        whole_set.recalls(whole_set.suggested).items(), key=lambda pair: pair[1])))


if __name__ == "__main__":
    main()
