"""Blocks are the same however the samples arrive."""

from __future__ import annotations

import numpy as np
import pytest

from unitclass.records import ArrayChunks, Chunk
from unitclass.signals.vm_stream import Block, BlockPlan, blocks, runs_of

PLAN = BlockPlan(rate_hz=100.0, own=50, margin=8)


class Given:
    def __init__(self, *chunks: Chunk) -> None:
        self.given = chunks

    def chunks(self, start_s: float = -np.inf, stop_s: float = np.inf):
        return iter(self.given)


def own(found: list[Block]) -> np.ndarray:
    return np.concatenate([b.values[b.first : b.last] for b in found])


@pytest.mark.parametrize("chunk_s", [0.01, 0.13, 0.5, 0.66, 9.0])
@pytest.mark.parametrize("n", [1, 49, 50, 51, 58, 66, 237])
def test_every_sample_is_owned_once_whatever_the_chunks(chunk_s: float, n: int) -> None:
    values = np.random.default_rng(0).normal(size=n)
    found = list(blocks(ArrayChunks(values, 100.0, 7.0, chunk_s), PLAN))
    assert own(found) == pytest.approx(values)
    for i, block in enumerate(found):
        assert block.start_s + block.first / 100.0 == pytest.approx(7.0 + i * 0.5)
        assert block.first == 8
        assert block.values.size - block.last == 8
    padded = np.concatenate([np.full(8, values[0]), values, np.full(8, values[-1])])
    for i, block in enumerate(found):
        assert block.values == pytest.approx(padded[i * 50 : i * 50 + block.values.size])


def test_a_gap_starts_a_new_stretch_and_a_jitter_does_not() -> None:
    a, b = np.arange(30.0), np.arange(30.0, 60.0)
    jitter = list(blocks(Given(Chunk(0.0, a), Chunk(0.304, b)), PLAN))
    gap = list(blocks(Given(Chunk(0.0, a), Chunk(0.32, b)), PLAN))
    assert [b.last - b.first for b in jitter] == [50, 10]
    assert [b.last - b.first for b in gap] == [30, 30]
    assert gap[1].start_s + 0.08 == pytest.approx(0.32)
    assert gap[1].values[:8] == pytest.approx(30.0)


def test_missing_samples_are_named_and_filled_with_the_value_before() -> None:
    values = np.arange(60.0)
    values[[0, 1, 20, 21, 59]] = np.nan
    found = list(blocks(ArrayChunks(values, 100.0), PLAN))
    assert found[0].missing_s == (pytest.approx((0.0, 0.02)), pytest.approx((0.2, 0.22)))
    assert found[1].missing_s == (pytest.approx((0.59, 0.6)),)
    assert own(found)[[0, 1, 2, 20, 21, 22, 59]].tolist() == [2, 2, 2, 19, 19, 22, 58]


def test_empty_chunks_and_empty_signals_give_no_blocks() -> None:
    assert list(blocks(Given(Chunk(0.0, np.empty(0))), PLAN)) == []
    assert list(blocks(Given(), PLAN)) == []


def test_runs_are_half_open_ranges() -> None:
    assert runs_of(np.array([1, 1, 0, 1, 0, 0, 1], bool)) == [(0, 2), (3, 4), (6, 7)]
    assert runs_of(np.zeros(0, bool)) == []
