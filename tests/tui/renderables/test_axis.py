"""The cycle axis keeps proportion and pools bins correctly."""

import numpy as np
import pytest

from unitclass.tui.renderables.axis import CycleAxis, axis_rows
from unitclass.tui.renderables.glyphs import MONO, PLAIN


def test_inspiration_and_expiration_take_columns_in_proportion_to_their_durations():
    axis = CycleAxis.for_durations(60, 1.0, 2.0)
    assert (axis.n_inspiration, axis.n_columns) == (20, 60)


def test_unknown_durations_give_equal_halves():
    assert CycleAxis.for_durations(40, np.nan, 2.0).n_inspiration == 20


@pytest.mark.parametrize(("ti", "te"), [(0.001, 50.0), (50.0, 0.001)])
def test_a_very_short_phase_keeps_two_columns(ti, te):
    axis = CycleAxis.for_durations(30, ti, te)
    assert 2 <= axis.n_inspiration <= 28


def test_the_end_of_inspiration_is_a_column_edge():
    axis = CycleAxis.for_durations(47, 0.9, 2.3)
    assert axis.edges[axis.n_inspiration] == 1.0


def test_every_phase_falls_between_the_edges_of_its_column():
    axis = CycleAxis.for_durations(47, 0.9, 2.3)
    phase = np.linspace(0, 2, 400, endpoint=False)
    column = axis.column_of(phase)
    assert np.all(axis.edges[column] <= phase + 1e-8)
    assert np.all(phase < axis.edges[column + 1] + 1e-8)


def test_pooling_conserves_the_rate_of_a_steady_cell():
    axis = CycleAxis.for_durations(33, 1.0, 2.4)
    exposure = np.repeat([0.5, 1.2], 20)
    assert np.allclose(axis.rate(7 * exposure, exposure), 7.0)


def test_a_column_over_several_bins_shows_all_their_counts_over_all_their_seconds():
    axis = CycleAxis(4, 2)
    counts, exposure = np.array([1.0, 5, 0, 2, 0, 0, 8, 0]), np.array([1.0, 4, 1, 1, 1, 1, 2, 2])
    assert np.allclose(axis.rate(counts, exposure), [6 / 5, 1.0, 0.0, 2.0])


def test_bins_without_exposure_are_unknown_and_not_zero():
    axis = CycleAxis(4, 2)
    rate = axis.rate(np.zeros(4), np.array([1.0, 0, 1, 1]))
    assert np.isnan(rate[1])
    assert rate[0] == 0


def test_a_mean_leaves_unknown_bins_out():
    assert np.allclose(CycleAxis(4, 2).mean([1, np.nan, 3, 3, 5, 5, 7, 7]), [1, 3, 5, 7])


def test_the_ruler_names_both_stretches_with_their_seconds():
    text = axis_rows(CycleAxis.for_durations(60, 0.92, 1.84), look=MONO).text()
    assert "inspiration 0.92 s" in text
    assert "expiration 1.84 s" in text
    ticks = text.splitlines()[1].split()
    assert ticks == ["0", "0.5", "1", "1.5", "2"]


def test_the_tick_of_phase_one_stands_at_the_end_of_inspiration():
    ruler = axis_rows(CycleAxis(60, 20), look=PLAIN).lines()[0]
    assert ruler[20] == "+"
    assert ruler.count("+") == 5


def test_a_narrow_axis_still_tells_the_two_apart():
    lines = axis_rows(CycleAxis(12, 4), look=PLAIN).lines()
    assert lines[2].lstrip().startswith("I")
    assert "exp" in lines[2]
