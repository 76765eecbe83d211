"""Samples spread over a recording, from which the detector learns."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from unitclass.records import ChunkReader, FloatArray
from unitclass.signals.vm_bumps import Grid, noise_sd
from unitclass.signals.vm_measures import Lens, slopes, smoothed
from unitclass.signals.vm_stream import Block, BlockPlan, blocks

N_WINDOWS = 16
WINDOW_S = 3.0


@dataclass(frozen=True)
class Sample:
    """Blocks to learn from and their coarse means."""

    blocks: tuple[Block, ...]
    coarse: tuple[FloatArray, ...]


def plan_for(grid: Grid) -> BlockPlan:
    """Return blocks of five seconds with margins of 40 ms, both whole bins."""
    k = grid.bin_samples
    own, margin = k * round(5.0 * grid.rate_hz / k), k * int(np.ceil(0.04 * grid.rate_hz / k))
    return BlockPlan(grid.rate_hz, own, margin)


def sample_blocks(reader: ChunkReader, grid: Grid, start_s: float, stop_s: float) -> Sample:
    """Read the whole of a short recording, else sixteen windows of three seconds spread over it."""
    plan = plan_for(grid)
    if stop_s - start_s <= N_WINDOWS * WINDOW_S + 12.0:
        found = list(blocks(reader, plan, start_s, stop_s))
    else:
        found = [b for low in _window_starts(start_s, stop_s) for b in blocks(reader, plan, low, low + WINDOW_S)]
        if sum(b.last - b.first for b in found) < 5.0 * grid.rate_hz:
            found = _first_minute(reader, plan, start_s, stop_s)
    return Sample(tuple(found), tuple(grid.means(b.values) for b in found))


def _first_minute(reader: ChunkReader, plan: BlockPlan, start_s: float, stop_s: float) -> list[Block]:
    """Return the first blocks that there are, of a recording that is mostly gap."""
    found: list[Block] = []
    for block in blocks(reader, plan, start_s, stop_s):
        found.append(block)
        if len(found) >= 12:
            break
    return found


def _window_starts(start_s: float, stop_s: float) -> FloatArray:
    """Spread the windows evenly but out of step, so that no rhythm can hide between them."""
    step = (stop_s - start_s) / N_WINDOWS
    shift = (np.arange(N_WINDOWS) * 0.6180339887) % 1.0
    return np.asarray(start_s + step * np.arange(N_WINDOWS) + shift * (step - WINDOW_S))


def slope_noise(sample: Sample, lens: Lens) -> float:
    """Return the noise of dV/dt as the lens takes it, mV/ms."""
    some = [slopes(_piece(b), lens.slope_samples) for b in sample.blocks[:: max(1, len(sample.blocks) // 4)]]
    return noise_sd(np.concatenate(some)) * lens.rate_hz / 1e3


def value_noise(sample: Sample, lens: Lens) -> float:
    """Return the fast noise of values as the lens smooths them, mV.

    From differences over 0.2 ms: over one sample a filtered trace would seem to have none.
    """
    lag = lens.samples(0.2)
    some = [smoothed(_piece(b), lens.smooth_samples) for b in sample.blocks[:: max(1, len(sample.blocks) // 4)]]
    return noise_sd(np.concatenate([values[lag:] - values[:-lag] for values in some])) / float(np.sqrt(2.0))


def _piece(block: Block) -> FloatArray:
    """Return up to 20 000 of a block's own samples: enough for a noise."""
    return block.values[block.first : min(block.last, block.first + 20_000)]
