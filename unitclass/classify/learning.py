"""Learning from labels: a laboratory's own names for shapes, and its own mix of cells.

Every drawn profile is a shape that some cell may have. A label says what the laboratory calls
cells of that shape, so each draw carries a share per name: at first the whole of it is the
family it was drawn from. A label moves the shares of the draws that its unit looks like, and a
little those of their whole family; the draws like labelled cells also become more usual within
their family, and their family more usual among the types. All of it are counts on top of a prior
(Dirichlet-multinomial [1]_): without labels nothing changes at all, and forgetting them brings
the first answers back.

References
----------
.. [1] A. Gelman et al., *Bayesian Data Analysis*, 3rd ed., CRC, 2013, sect. 3.4.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from unitclass.classify.draws import DrawnFamilies
from unitclass.classify.likelihood import evidence_share, log_likelihood, sum_by_family
from unitclass.records import OTHER, FloatArray, IntArray

SHAPE_SPIKES = 100.0  # a label speaks of cells that this many spikes would not tell from its own
OWN_NAME = 0.8  # labels that a draw's own family counts for in its family's names
FAMILY_NAMES = 0.8  # labels that the family's names count for in a draw's
SLIP = 0.03  # chance of a name that the laboratory has not been seen to give to such cells
ROUNDS = 5
USUAL_SHAPE = 20.0  # labels that the even mix of draws counts for
USUAL_TYPE = 60.0  # labels that the library's priors count for: units are not labelled at random
BLOCK = 200  # units looked at at once: keeps the (units x draws) matrix small


@dataclass(frozen=True)
class ShapeCounts:
    """Spikes by phase of units that teach or are taught.

    Attributes
    ----------
    counts, exposure_s : ndarray, shape (n_units, n_bins)
    first : ndarray, shape (n_units, n_types + 1)
        Probabilities of the families and of `other` without any label; rows sum to one.
    """

    counts: FloatArray
    exposure_s: FloatArray
    first: FloatArray

    def rows(self, chosen: slice) -> ShapeCounts:
        """Return some of the units."""
        return ShapeCounts(self.counts[chosen], self.exposure_s[chosen], self.first[chosen])


@dataclass(frozen=True)
class Learned:
    """What labels say about the draws.

    Attributes
    ----------
    names : ndarray, shape (n_draws_total, n_types + 1)
        Share of each name (the families' ids, then `other`) for cells like the draw.
    other_names : ndarray, shape (n_types + 1,)
        The same for cells like none of the draws.
    log_weight : ndarray, shape (n_draws_total,)
        Log share of each draw within its family.
    log_usual : ndarray, shape (n_types + 1,)
        How much more usual each family has become, log.
    closeness : ndarray, shape (n_labels, n_draws_total)
        How well each labelled unit fits each draw, 1 for its best.
    labels : ndarray of int, shape (n_labels,)
        Index of each label among the names.
    """

    names: FloatArray
    other_names: FloatArray
    log_weight: FloatArray
    log_usual: FloatArray
    closeness: FloatArray
    labels: IntArray


@dataclass(frozen=True)
class Taught:
    """Units after the labels.

    Attributes
    ----------
    probabilities : ndarray, shape (n_units, n_types + 1)
    kinship : ndarray, shape (n_units, n_labels)
        How far each labelled unit stands for the unit's shape, 0 to 1.
    """

    probabilities: FloatArray
    kinship: FloatArray


def learn(lessons: ShapeCounts, labels: Sequence[str], weight: FloatArray, drawn: DrawnFamilies) -> Learned:
    """Return what labelled units teach about the draws.

    Parameters
    ----------
    lessons : ShapeCounts
        The labelled units, at least one.
    labels : sequence of str, length n_labels
        Ids of families, or "other".
    weight : ndarray, shape (n_labels,)
        How much each label counts, 1 for one that a person gave without seeing a suggestion.

    Raises
    ------
    ValueError
        When a label is no family and not "other".
    """
    types = (*drawn.types, OTHER)
    index = np.array([types.index(label) for label in labels], dtype=np.int64)
    named = weight[:, None] * np.eye(len(types))[index]
    log_lik = coarse_log_likelihood(lessons, drawn)
    closeness = np.exp(log_lik - log_lik.max(axis=1, keepdims=True))
    family, origin = _family_names(lessons.first, index, named)
    closeness = closeness * origin[:, drawn.owner]
    support = closeness.T @ named
    names = (FAMILY_NAMES * family[drawn.owner] + support) / (FAMILY_NAMES + support.sum(axis=1, keepdims=True))
    return Learned(names, family[-1], _moved_weight(closeness, weight, drawn),
                   _log_usual(lessons.first, weight), closeness, index)


def teach(units: ShapeCounts, learned: Learned, drawn: DrawnFamilies) -> Taught:
    """Return the probabilities of units, at least one, once the labels have spoken."""
    blocks = [_teach_block(units.rows(slice(i, i + BLOCK)), learned, drawn)
              for i in range(0, len(units.counts), BLOCK)]
    return Taught(np.concatenate([b.probabilities for b in blocks]), np.concatenate([b.kinship for b in blocks]))


def _teach_block(units: ShapeCounts, learned: Learned, drawn: DrawnFamilies) -> Taught:
    log_lik = coarse_log_likelihood(units, drawn)
    before, owned = sum_by_family(log_lik + drawn.log_weight, drawn)
    after, share = sum_by_family(log_lik + learned.log_weight, drawn)
    joint = units.first * np.exp(np.column_stack([after - before, np.zeros(len(after))]) + learned.log_usual)
    joint = joint / joint.sum(axis=1, keepdims=True)
    on_draws = share * joint[:, drawn.owner]
    table = on_draws @ learned.names + joint[:, -1:] * learned.other_names
    return Taught(table, (owned * units.first[:, drawn.owner]) @ learned.closeness.T)


def coarse_log_likelihood(units: ShapeCounts, drawn: DrawnFamilies) -> FloatArray:
    """Return the log-likelihood of draws, of as few spikes as tell shapes apart roughly."""
    share = evidence_share(units.counts, units.exposure_s, np.ones(len(units.counts)), SHAPE_SPIKES)
    return log_likelihood(units.counts * share, units.exposure_s * share, drawn.rate)


def _family_names(first: FloatArray, labels: IntArray, named: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Return the names of each family's cells, and from which family each labelled unit is.

    Shapes (n_types + 1, n_types + 1) and (n_labels, n_types + 1). A unit's family is judged by its
    shape and by what the laboratory calls cells of that family, which the labels themselves tell:
    a few rounds of expectation and maximisation.
    """
    own = OWN_NAME * np.eye(first.shape[1])
    names, origin = own, first
    for _ in range(ROUNDS):
        origin = first * (names[:, labels].T + SLIP)
        origin = origin / origin.sum(axis=1, keepdims=True)
        support = origin.T @ named
        names = (own + support) / (OWN_NAME + support.sum(axis=1, keepdims=True))
    return names, origin


def _moved_weight(closeness: FloatArray, weight: FloatArray, drawn: DrawnFamilies) -> FloatArray:
    gained = weight @ closeness
    mass = USUAL_SHAPE * np.exp(drawn.log_weight) + gained / np.maximum(_family_sum(closeness.sum(axis=0), drawn), 1.0)
    return np.asarray(np.log(mass / _family_sum(mass, drawn)))


def _family_sum(values: FloatArray, drawn: DrawnFamilies) -> FloatArray:
    """Return, for every draw, the sum over its family."""
    return np.asarray(np.bincount(drawn.owner, weights=values, minlength=len(drawn.types))[drawn.owner])


def _log_usual(first: FloatArray, weight: FloatArray) -> FloatArray:
    n_types = first.shape[1]
    even = np.full(n_types, 1.0 / n_types)
    seen = weight @ first
    return np.asarray(np.log((USUAL_TYPE * even + seen) / (USUAL_TYPE + weight.sum()) / even))
