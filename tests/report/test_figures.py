"""Figures hold the numbers of the results, text stays text, and odd units do not break them."""

from __future__ import annotations

import csv
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
from pypdf import PdfReader

from tests.results import nerve_cycles, session_result
from unitclass.analysis.changes import type_changes
from unitclass.batch import Plan, analyse_file, read_planned
from unitclass.io.resolver import samples_folder
from unitclass.io.template_files import read_library
from unitclass.records import ArrayChunks, Cycles, Recording, SessionResult, Signal
from unitclass.report.counts import TypedUnit, type_counts
from unitclass.report.cycles_figure import cycles_figure, tag_of
from unitclass.report.making import safe_name
from unitclass.report.population_figure import population_figure
from unitclass.report.saving import Drawn, picture, save
from unitclass.report.session_figures import changes_figure, conditions_figure, counts_figure
from unitclass.report.stretch import usual_stretch
from unitclass.report.style import nice_length, quantity
from unitclass.report.unit_figure import Shown, unit_figure
from unitclass.settings import Settings

PLAN = Plan(Settings(), read_library())
ORDER = tuple(family.id for family in PLAN.library.families)


@pytest.fixture(scope="module", params=["quill-baseline", "tansy-cell-a"])
def session(request) -> tuple[Recording, SessionResult]:
    path = str(samples_folder() / f"{request.param}.nwb")
    result = analyse_file(path, PLAN).result
    assert result is not None
    return read_planned(path, PLAN), result


def as_svg(drawn: Drawn) -> str:
    return picture(drawn, []).svg


def saved_rows(drawn: Drawn, folder: Path) -> list[dict[str, str]]:
    *_, table = save(drawn, folder / "figure", ["svg"], force=True)
    return list(csv.DictReader(table.open(encoding="utf-8")))


def test_the_table_beside_a_unit_figure_is_its_histogram(session, tmp_path):
    recording, result = session
    unit = result.conditions[0].units[0]
    rows = saved_rows(unit_figure(Shown(recording, result.conditions[0], unit)), tmp_path)
    phase = [row for row in rows if row["panel"] == "phase"]
    assert [float(row["y"]) for row in phase] == pytest.approx(unit.histogram.rate_hz.tolist(), rel=1e-5)
    assert {row["unit_of_y"] for row in phase} == {"spikes/s"}
    assert {"spikes", "locked to onset", "locked to offset"} <= {row["panel"] for row in rows}


def test_text_stays_text_in_svg_and_pdf_and_the_same_results_give_the_same_svg_and_table(session, tmp_path):
    recording, result = session
    unit = result.conditions[0].units[0]
    files = []
    for name in ("one", "two"):
        drawn = unit_figure(Shown(recording, result.conditions[0], unit))
        files.append(save(drawn, tmp_path / name, ["svg", "pdf", "png"], force=False))
    text = PdfReader(files[0][1]).pages[0].extract_text()
    assert f"unit {unit.unit}" in text
    assert "rate (spikes/s)" in text
    assert "<text" in files[0][0].read_text()
    for one, two in zip(*files, strict=True):
        assert one.suffix in (".pdf", ".png") or one.read_bytes() == two.read_bytes()


def test_a_silent_unit_a_unit_without_cycles_and_hostile_names_are_drawn(session):
    recording, result = session
    condition = result.conditions[0]
    unit = condition.units[0]
    zero = np.zeros(unit.histogram.n_bins)
    silent = replace(unit, unit="<script>$x_{1}$\n", n_spikes=0, locked=(), suggestion=replace(
        unit.suggestion, type="silent", probabilities={}, fitted_rate_hz=np.zeros(0)),
        histogram=replace(unit.histogram, counts=zero, low_hz=zero * np.nan, high_hz=zero * np.nan))
    assert "<script>" not in as_svg(unit_figure(Shown(recording, condition, silent)))
    none = replace(condition.nerve_cycles, cycles=Cycles.plain(np.zeros(0), np.zeros(0), np.zeros(0)))
    empty = replace(unit, histogram=replace(unit.histogram, counts=zero, exposure_s=zero))
    as_svg(unit_figure(Shown(recording, replace(condition, nerve_cycles=none), empty)))
    as_svg(population_figure(replace(condition, units=(silent,)), {}, ORDER))


def test_a_heat_map_is_sorted_by_type_and_within_it_by_the_phase_of_the_peak(tmp_path):
    condition = session_result().conditions[0]
    rows = saved_rows(population_figure(condition, {}, ORDER), tmp_path)
    places = [ORDER.index(row["type"]) if row["type"] in ORDER else len(ORDER) for row in rows]
    assert places == sorted(places)
    assert {row["unit"] for row in rows} == {u.unit for u in condition.units if u.n_spikes}


def test_the_cycle_figure_shows_the_stretch_asked_for(session, tmp_path):
    recording, result = session
    rows = saved_rows(cycles_figure(recording, result.conditions[0], (20.0, 30.0)), tmp_path)
    times = [float(row["time_s"]) for row in rows]
    assert 20.0 <= min(times) < 20.1
    assert 29.9 < max(times) < 30.0


def test_a_matrix_of_changes_counts_every_unit_once(tmp_path):
    result = session_result()
    changes = type_changes(result, {})
    before, after = (c.condition.name for c in result.conditions)
    rows = saved_rows(changes_figure(changes, before, after, ORDER), tmp_path)
    assert sum(int(row["n_units"]) for row in rows) == len(changes) > 0


def test_counts_and_conditions_side_by_side_are_drawn_with_their_numbers(tmp_path):
    units = [TypedUnit("heron", "s", "a", str(i), name, False) for i, name in enumerate(("ramp-I", "ramp-I", "post-I"))]
    rows = saved_rows(counts_figure(type_counts(units, ORDER)), tmp_path)
    assert [(row["type"], row["n"], row["of"]) for row in rows] == [("ramp-I", "2", "3"), ("post-I", "1", "3")]
    result = session_result()
    mine = [c.units[0] for c in result.conditions]
    assert {row["condition"] for row in saved_rows(conditions_figure(mine, {}), tmp_path)} == {u.condition for u in mine}


def test_a_usual_stretch_is_of_consecutive_cycles_in_use():
    onset = np.arange(20.0)
    cycles = Cycles.plain(onset, onset + 0.4, onset + 1)
    cycles = replace(cycles, accepted=np.array([i not in (5, 9, 10) for i in range(20)]))
    start, stop = usual_stretch(cycles, 4)
    assert stop - start == pytest.approx(4.5)
    inside = [i for i in range(20) if onset[i] >= start and onset[i] + 1 <= stop]
    assert all(cycles.accepted[inside])
    assert all(np.isnan(usual_stretch(Cycles.plain(onset[:0], onset[:0], onset[:0]))))


@pytest.mark.parametrize(("value", "unit", "words"), [(5e-5, "volts", "50 µV"), (0.02, "V", "20 mV"), (20, "mV", "20 mV"),
                                                      (2.0, "a.u.", "2 a.u.")])
def test_scale_bars_carry_a_round_length_with_its_unit(value, unit, words):
    assert quantity(value, unit) == words
    assert [nice_length(span) for span in (10, 33, 0.7)] == pytest.approx([2, 5, 0.1])


def test_cycles_in_a_row_share_one_tag_and_every_odd_cycle_has_one():
    plain = Cycles.plain(np.arange(6.0), np.arange(6.0) + 0.4, np.arange(6.0) + 1)
    cycles = replace(plain, accepted=np.array([True, False, False, True, False, True]),
                     kind=("breath", "sigh", "breath", "breath", "breath", "doublet"),
                     reason=("", "sigh: 2.0 x the usual", "after a sigh", "", "", ""))
    assert [tag_of(cycles, i) for i in range(6)] == ["", "sigh", "after a sigh", "", "not used", "doublet"]
    run = replace(plain, accepted=np.zeros(6, bool), reason=("excluded: nerve moistened",) * 6)
    condition = session_result().conditions[0]
    condition = replace(condition, nerve_cycles=replace(condition.nerve_cycles, cycles=run))
    recording = Recording("a.nwb", "a", "a", "a", "heron", 0.0, 60.0, nerves=(ramps(),))
    svg = as_svg(cycles_figure(recording, condition, (0.0, 6.0)))
    assert svg.count(">excluded<") == 1


def ramps() -> Signal:
    envelope = nerve_cycles().envelopes[0]
    return Signal(name="PNA", role="phrenic", unit="V", rate_hz=envelope.rate_hz, start_s=0.0,
                  stop_s=envelope.values.size / envelope.rate_hz, is_integrated=True, form_reason="made so",
                  location="/acquisition/PNA", reason="made so",
                  reader=ArrayChunks(envelope.values.astype(float), envelope.rate_hz))


def test_names_that_a_file_system_cannot_take_do_not_meet():
    assert safe_name("aug-E 12") == "aug-E_12"
    assert len({safe_name(name) for name in ("1/2", "1:2", "1_2", "x" * 70, "x" * 71)}) == 5
    assert all("/" not in safe_name(name) and len(safe_name(name)) < 70 for name in ("../../etc", "a/b" * 40))
