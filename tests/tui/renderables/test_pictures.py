"""Pictures are to scale: checked on the characters themselves."""

from dataclasses import replace

import numpy as np
import pytest

from tests.results import condition_result, unit_result, vm_result
from unitclass.tui.renderables.axis import CycleAxis
from unitclass.tui.renderables.bars import bar, in_words, probability_rows
from unitclass.tui.renderables.glyphs import ASCII, BLOCKS, COLOUR, MONO, PLAIN
from unitclass.tui.renderables.heat import heat_row
from unitclass.tui.renderables.histogram import Bars, histogram_rows, round_up
from unitclass.tui.renderables.membrane import membrane_rows
from unitclass.tui.renderables.nerves import nerve_rows
from unitclass.tui.renderables.raster import raster_rows, shown_cycles
from unitclass.tui.renderables.trace import Burst, TraceWindow, burst_rows, time_axis, trace_rows
from unitclass.tui.renderables.unit_picture import Rows, unit_picture

AXIS = CycleAxis(8, 4)
NONE = np.full(8, np.nan)


def column(sheet, x):
    return "".join(row[x] for row in sheet.cells)


def plain_bars(rate, fit=NONE, low=NONE, high=NONE):
    return Bars(*(np.asarray(values, float) for values in (rate, low, high, fit)))


def eighths(text):
    return sum(BLOCKS.levels.index(c) for c in text if c in BLOCKS.levels)


@pytest.mark.parametrize("share", [0, 0.03, 0.25, 0.5, 0.77, 1.0])
def test_a_bar_is_as_high_as_its_rate_to_an_eighth_of_a_row(share):
    sheet = histogram_rows(AXIS, plain_bars([80 * share] * 8), 10, 80.0, look=COLOUR)
    assert eighths(column(sheet, 6)) == round(share * 80)


def test_a_bar_is_solid_to_its_lower_limit_and_doubtful_above():
    sheet = histogram_rows(AXIS, plain_bars([8.0] * 8, low=[4.0] * 8), 10, 10.0, look=COLOUR)
    assert column(sheet, 5) == "  ▓▓▓▓████"


def test_a_whisker_reaches_from_the_bar_to_the_upper_limit():
    sheet = histogram_rows(AXIS, plain_bars([4.0] * 8, low=[4.0] * 8, high=[7.0] * 8), 10, 10.0, look=COLOUR)
    assert column(sheet, 5) == "   │││████"


def test_a_limit_outside_the_picture_says_so():
    sheet = histogram_rows(AXIS, plain_bars([4.0] * 8, high=[70.0] * 8), 10, 10.0, look=COLOUR)
    assert column(sheet, 5)[0] == BLOCKS.beyond


def test_the_family_is_drawn_at_its_fitted_rate_whatever_the_bars_do():
    fit = np.array([1.0, 2, 3, 4, 5, 6, 7, 8]) + 0.5
    for rate in (np.zeros(8), np.full(8, 10.0)):
        sheet = histogram_rows(AXIS, plain_bars(rate, fit), 10, 10.0, look=COLOUR)
        found = [next(9 - y for y in range(10) if sheet.cells[y][x] in BLOCKS.fit) for x in range(8)]
        assert found == [1, 2, 3, 4, 5, 6, 7, 8]


def test_a_histogram_in_ascii_has_the_same_heights_to_the_row():
    sheet = histogram_rows(AXIS, plain_bars([2.0, 4, 6, 8, 10, 0, 5, 5]), 10, 10.0, look=PLAIN)
    assert sheet.text().isascii()
    assert [column(sheet, x).count("#") for x in range(8)] == [2, 4, 6, 8, 10, 0, 5, 5]


def test_inspiration_is_shaded_with_and_without_colour():
    bars = plain_bars([0.0] * 8)
    assert histogram_rows(AXIS, bars, 4, 1.0, look=COLOUR).inks[0] == ["+"] * 4 + [""] * 4
    mono = histogram_rows(AXIS, bars, 4, 1.0, look=MONO).lines()
    assert all(line.count("·") > 0 and "·" not in line[4:] for line in mono)


def test_unknown_bins_stay_empty():
    sheet = histogram_rows(AXIS, plain_bars([np.nan] * 8), 3, 1.0, look=COLOUR)
    assert sheet.text().strip() == ""


def test_the_scale_holds_bars_and_fit():
    bars = plain_bars([10.0] * 8, fit=[37.0] * 8)
    assert bars.top_hz == 40.0


@pytest.mark.parametrize(("value", "top"),
                         [(0, 1), (np.nan, 1), (1, 1), (0.9, 1), (11, 12), (37, 40), (101, 120)])
def test_the_scale_ends_at_a_round_number(value, top):
    assert round_up(value) == pytest.approx(top)


def test_a_nerve_fills_its_rows_from_its_least_to_its_greatest_value():
    sheet = nerve_rows(AXIS, np.linspace(3, 5, 8), 2, look=COLOUR)
    assert [eighths(column(sheet, x)) for x in (0, 7)] == [0, 16]


def test_a_dead_nerve_is_an_empty_picture():
    assert nerve_rows(AXIS, np.full(8, np.nan), 2, look=COLOUR).text().strip() == ""
    assert nerve_rows(AXIS, np.full(8, 2.0), 2, look=COLOUR).text().strip() == ""


def test_every_spike_of_the_raster_is_a_dot_where_it_belongs():
    sheet = raster_rows(CycleAxis(4, 2), [0.0, 1.99], [0, 7], 8, 2, look=COLOUR)
    assert sheet.lines() == ["⠁", "   ⢀"]


def test_a_raster_in_ascii_has_one_cycle_a_row():
    sheet = raster_rows(CycleAxis(4, 2), [0.0, 1.99], [0, 1], 2, 3, look=PLAIN)
    assert [line.replace(":", " ").rstrip() for line in sheet.lines()] == ["|", "   |", ""]


def test_more_cycles_than_rows_are_thinned_evenly_with_first_and_last():
    shown = shown_cycles(100, 9)
    assert shown[0] == 0
    assert shown[-1] == 99
    assert set(np.diff(shown)) <= {12, 13}


def test_an_empty_raster_draws_nothing():
    assert raster_rows(AXIS, [], [], 0, 2, look=COLOUR).text().strip() == ""


def test_the_membrane_potential_spans_whole_millivolts_around_mean_and_spread():
    vm = vm_result().vm
    picture = membrane_rows(CycleAxis(40, 14), vm.mean_mv, vm.sd_mv, vm.reference_mv, 5, look=COLOUR)
    assert picture.top_mv == np.ceil((vm.mean_mv + vm.sd_mv).max())
    assert picture.bottom_mv == np.floor((vm.mean_mv - vm.sd_mv).min())


def test_the_membrane_potential_is_lowest_where_the_cell_is_most_hyperpolarised():
    vm = vm_result().vm
    sheet = membrane_rows(CycleAxis(40, 14), vm.mean_mv, np.zeros(40), vm.reference_mv, 6, look=PLAIN).sheet
    lowest = min(x for x, c in enumerate(sheet.cells[-1]) if c in ASCII.fit)
    assert 3 <= lowest <= 10


def test_a_cell_without_membrane_potential_draws_nothing():
    picture = membrane_rows(AXIS, np.full(8, np.nan), np.full(8, np.nan), np.nan, 3)
    assert picture.sheet.text().strip() == ""
    assert np.isnan(picture.top_mv)


def test_a_heat_row_is_darkest_at_the_peak_and_empty_without_spikes():
    assert heat_row(AXIS, [0, 1, 2, 3, 4, 3, 2, 1], look=MONO).lines() == [" ░▒▓█▓▒░"]
    assert heat_row(AXIS, np.zeros(8), look=MONO).lines() == [""]
    assert heat_row(AXIS, np.full(8, np.nan), look=MONO).lines() == [""]


def test_the_trace_keeps_every_peak():
    window = TraceWindow(0.0, 10.0, 20)
    times = np.arange(0, 10, 0.001)
    values = np.where(np.abs(times - 5.2) < 0.002, 4.0, 0.0)
    sheet, top = trace_rows(window, times, values, np.nan, 4, look=COLOUR)
    assert top == 4.0
    assert column(sheet, 10) == "████"
    assert column(sheet, 5).strip() == ""


def test_the_threshold_lies_at_its_height():
    window = TraceWindow(0.0, 1.0, 4)
    sheet, _ = trace_rows(window, [0.1, 0.9], [10.0, 10.0], 5.0, 10, look=COLOUR)
    assert [y for y in range(10) if sheet.cells[y][1] == BLOCKS.threshold] == [4]


def test_bursts_left_out_look_different_without_colour():
    window = TraceWindow(0.0, 10.0, 20)
    sheet = burst_rows(window, [Burst(0, 2, 5), Burst(5, 7, 10, False, "sigh", True)], look=MONO)
    bars, kinds, pointer = sheet.lines()
    assert bars == "▀▀▀▀▀     ×××××"
    assert kinds == "          sigh"
    assert pointer == "          ^"


def test_the_time_axis_has_round_times_and_its_unit():
    words = time_axis(TraceWindow(12.0, 42.0, 60)).lines()[1].split()
    assert words[-1] == "s"
    assert [float(w) for w in words[:-1]] == [15, 20, 25, 30, 35]


def test_probabilities_are_listed_with_their_digit_number_and_bar():
    sheet = probability_rows([("post-I", 0.75), ("dec-E", 0.25)], 32, 5, look=PLAIN)
    assert sheet.lines() == ["1 post-I 0.75 #############", "2 dec-E  0.25 ####"]


def test_bars_of_probability_are_to_scale():
    assert bar(0.5, 10, PLAIN) == "#####"
    assert bar(0.0, 10, COLOUR) == ""
    assert bar(1.0, 3, COLOUR) == "███"


def test_no_probability_is_rounded_to_certainty():
    shown = [in_words(p) for p in (0.9991, 1.0, 0.0004, 0.0, 0.934)]
    assert shown == [">.99", "1.00", "<.01", "0.00", "0.93"]


@pytest.mark.parametrize("height", range(1, 60))
@pytest.mark.parametrize("has_membrane", [False, True])
def test_the_rows_of_a_picture_add_up(height, has_membrane):
    rows = Rows.share(height, 3, has_membrane, 40)
    below = rows.histogram + rows.legend + rows.raster + rows.membrane + rows.axis
    assert rows.nerve * rows.n_nerves + below == height
    assert min(rows.histogram, rows.raster, rows.membrane) >= 0


def test_a_unit_picture_names_its_axes_with_units():
    condition = condition_result()
    text = unit_picture(condition.units[0], condition.nerve_profiles, 1.0, 2.0, 80, 24, family="early-I",
                        look=MONO).text()
    for words in ("spikes/s", "40", "PNA", "phase", "insp", "expiration 2.00 s", "cycles",
                  "early-I as fitted", "95 % limits"):
        assert words in text


def test_a_blind_picture_shows_no_family():
    condition = condition_result()
    text = unit_picture(condition.units[0], condition.nerve_profiles, 1.0, 2.0, 80, 24, look=MONO).text()
    assert "fitted" not in text
    assert "━" not in text


def test_an_intracellular_unit_has_its_membrane_potential_on_the_same_axis():
    text = unit_picture(vm_result(), condition_result().nerve_profiles, 1.0, 2.0, 60, 24, look=MONO).text()
    assert "Vm mV" in text
    assert "-48" in text


@pytest.mark.parametrize("size", [(1, 1), (8, 3), (33, 9), (55, 20), (120, 50)])
@pytest.mark.parametrize("look", [COLOUR, PLAIN])
def test_a_picture_of_any_size_is_drawn(size, look):
    condition = condition_result()
    for unit in (*condition.units, vm_result(), replace(unit_result(), vm=None)):
        sheet = unit_picture(unit, condition.nerve_profiles, np.nan, np.nan, *size, family="x", look=look)
        assert (sheet.width, sheet.height) == size
        assert all(len(row) == size[0] for row in sheet.cells)
