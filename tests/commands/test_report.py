"""`unitclass report` on real files, read back and opened in a real browser."""

from __future__ import annotations

import re
import shutil
from pathlib import Path
from urllib.parse import unquote

import numpy as np
import pytest
from pypdf import PdfReader

from tests.commands.browser import CHROMIUM, look
from tests.commands.program import rows_of, run
from tests.layouts import new_file, write
from unitclass.io.decisions import DecisionStore
from unitclass.io.resolver import samples_folder


@pytest.fixture(scope="module")
def report(tmp_path_factory) -> Path:
    out = tmp_path_factory.mktemp("report")
    ran = run("report", samples_folder() / "bramble-pons-removed.nwb", samples_folder() / "tansy-cell-a.nwb", "--out", out,
              "--unit", "5", "--format", "svg", "--format", "pdf", "--quiet")
    assert ran.code == 0, ran.err
    assert str(out / "index.html") in ran.out
    return out


def test_there_is_a_page_per_session_one_over_all_a_table_of_animals_and_figures_with_numbers(report):
    names = {path.name for path in report.iterdir()}
    assert {"index.html", "bramble-pons-removed.html", "tansy-cell-a.html", "animals.csv"} <= names
    figures = {path.name for path in (report / "figures").iterdir()}
    for stem in ("bramble-pons-removed-baseline-unit-5", "bramble-pons-removed-changes-1", "all-counts",
                 "tansy-cell-a-cycles"):
        assert {f"{stem}.svg", f"{stem}.pdf", f"{stem}.csv"} <= figures
    assert {row["animal"] for row in rows_of(report / "animals.csv")} == {"bramble", "tansy"}


def test_a_page_needs_nothing_from_elsewhere(report):
    for page in report.glob("*.html"):
        text = page.read_text(encoding="utf-8")
        assert not re.findall(r'(?:src|href)\s*=\s*"(?:https?:)?//', text)
        assert not re.findall(r"@import|url\(\s*['\"]?https?:", text)
        assert "<script" not in text


def test_every_unit_is_there_with_its_grounds_and_that_nobody_has_labelled_is_said(report):
    text = (report / "bramble-pons-removed.html").read_text(encoding="utf-8")
    assert text.count('<article class="unit">') == 28
    assert text.count('<svg class="glance"') == 28
    assert "all types below are suggestions" in text
    assert 'id="methods"' in text
    assert "Orem" in text
    assert "invalid time" in text


def test_labels_with_reviewer_and_note_stand_in_the_page_and_text_is_escaped(tmp_path):
    from unitclass.batch import Plan, analyse_file
    from unitclass.io.template_files import read_library
    from unitclass.review.session import ReviewSession
    from unitclass.settings import Settings

    session = tmp_path / "quill.nwb"
    shutil.copyfile(samples_folder() / "quill-baseline.nwb", session)
    result = analyse_file(str(session), Plan(Settings(), read_library())).result
    assert result is not None
    with DecisionStore(tmp_path / "unitclass.sqlite") as store:
        for reviewer in ("<b>anna</b>", "bert"):
            review = ReviewSession(store, reviewer)
            review.add_result(result)
            for _ in range(3):
                review.note("<img src=x onerror=alert(1)>")
                review.accept()
    assert run("report", session, "--out", tmp_path / "out", "--format", "svg", "--quiet").code == 0
    page = (tmp_path / "out" / "quill.html").read_text(encoding="utf-8")
    assert "labelled by" in page
    assert "<img src=x" not in page
    assert "<b>anna" not in page
    assert "&lt;b&gt;anna" in page
    index = (tmp_path / "out" / "index.html").read_text(encoding="utf-8")
    assert "kappa" in index
    assert "no unit was judged by two people" not in index


def tiny_session(path: Path, *, bursts_s: tuple[float, ...], trains: tuple[tuple[float, ...], ...]) -> Path:
    """Write a raw phrenic of 30 s with a burst of 1 s at each of the times, and units with the trains given."""
    from pynwb import TimeSeries

    rng = np.random.default_rng(4)
    time_s = np.arange(60_000) / 2000.0
    nerve = rng.normal(0, 2e-6, time_s.size)
    for start in bursts_s:
        inside = (time_s >= start) & (time_s < start + 1.0)
        nerve[inside] += rng.normal(0, 3e-5, inside.sum()) * (time_s[inside] - start + 0.2)
    nwb = new_file("tiny <b>rig</b>")
    nwb.add_acquisition(TimeSeries("phrenic", nerve, "V", rate=2000.0, description="raw phrenic nerve"))
    for train in trains:
        nwb.add_unit(spike_times=list(train))
    nwb.add_epoch(0.0, 30.0, ["<img src=x>"])
    return write(nwb, path)


@pytest.mark.parametrize("bursts_s", [(5.0, 9.0), tuple(np.arange(1.0, 28.0, 3.0))])
def test_a_session_of_one_cycle_and_a_unit_without_spikes_have_a_page(tmp_path, bursts_s):
    trains = ((), (5.5, 6.0, 9.3))
    path = tiny_session(tmp_path / "tiny #1.nwb", bursts_s=bursts_s, trains=trains)
    ran = run("report", path, "--out", tmp_path / "out", "--unit", "all", "--format", "svg", "--quiet")
    assert ran.code == 0, ran.err
    page = (tmp_path / "out" / "tiny #1.html").read_text(encoding="utf-8")
    assert page.count('<article class="unit">') == len(trains)
    assert "<b>rig" not in page
    assert "<img" not in page
    links = re.findall(r'href="(figures/[^"]+)"', page)
    assert links
    assert all((tmp_path / "out" / unquote(link)).exists() for link in links)
    index = (tmp_path / "out" / "index.html").read_text(encoding="utf-8")
    assert 'href="tiny%20%231.html"' in index


def test_a_session_without_units_is_one_line(tmp_path):
    path = tiny_session(tmp_path / "none.nwb", bursts_s=(5.0, 9.0, 13.0), trains=())
    ran = run("report", path, "--out", tmp_path / "out", "--quiet")
    assert ran.code == 3
    assert "none.nwb: holds no units" in ran.err


def test_full_figures_are_linked_from_their_unit_and_a_unit_that_no_session_has_is_said(report, tmp_path):
    page = (report / "bramble-pons-removed.html").read_text(encoding="utf-8")
    card = next(part for part in page.split("<article")[1:] if ">unit 5<" in part)
    assert 'href="figures/bramble-pons-removed-baseline-unit-5.pdf"' in card
    ran = run("report", samples_folder() / "tansy-cell-a.nwb", "--out", tmp_path, "--unit", "77", "--format", "svg",
              "--quiet")
    assert ran.code == 1
    assert "no unit 77" in ran.err


def test_cycle_detection_of_a_stretch_has_its_tags_and_an_empty_stretch_is_refused(tmp_path):
    session = samples_folder() / "bramble-pons-removed.nwb"
    assert run("report", session, "--out", tmp_path, "--stretch", "40", "75", "--format", "pdf", "--quiet").code == 0
    figure = tmp_path / "figures" / "bramble-pons-removed-baseline-cycles-40-75.pdf"
    words = PdfReader(figure).pages[0].extract_text()
    assert "after a sigh" in words
    assert "excluded" in words
    assert not list(tmp_path.glob("figures/*pons_removed-cycles-40-75*"))  # lies in the other condition
    refused = run("report", session, "--out", tmp_path / "other", "--stretch", "75", "40", "--quiet")
    assert refused.code == 2
    assert "does not end after it starts" in refused.err


def test_an_existing_or_unwritable_target_and_nothing_readable(tmp_path, report):
    again = run("report", samples_folder() / "tansy-cell-a.nwb", "--out", report, "--quiet")
    assert again.code == 1
    assert "exists already" in again.err
    (tmp_path / "file").touch()
    assert run("report", samples_folder() / "tansy-cell-a.nwb", "--out", tmp_path / "file", "--quiet").code == 1
    bad = run("report", report, "--out", tmp_path / "none", "--quiet")
    assert bad.code in (2, 3)


@pytest.mark.skipif(CHROMIUM is None, reason="no chromium on this machine")
@pytest.mark.parametrize("width", [390, 1280])
@pytest.mark.parametrize("page", ["index.html", "bramble-pons-removed.html"])
def test_a_real_browser_shows_the_page_without_errors_or_requests_and_nothing_wider_than_the_window(report, page, width):
    seen = look(report, page, width)
    assert seen.requests == [f"127.0.0.1/{page}"]
    assert seen.console == []
    assert seen.wide <= seen.window == width
    assert seen.pictures_seen == seen.pictures > 0


@pytest.mark.skipif(CHROMIUM is None, reason="no chromium on this machine")
def test_the_look_through_the_browser_notices_requests_errors_and_width(tmp_path):
    (tmp_path / "bad.html").write_text(
        '<!doctype html><link rel="icon" href="data:,"><img src="near.png"><img src="http://elsewhere.example/far.png">'
        '<div style="width:700px">wide</div><svg height="0"></svg><script>console.error("no")</script>')
    seen = look(tmp_path, "bad.html", 390)
    assert sorted(seen.requests) == ["127.0.0.1/bad.html", "127.0.0.1/near.png", "elsewhere.example/far.png"]
    assert seen.console
    assert seen.wide > seen.window == 390
    assert seen.pictures_seen < seen.pictures
