"""`unitclass report` on real files, read back and opened in a real browser."""

from __future__ import annotations

import re
import shutil
import subprocess
from pathlib import Path

import pytest

from tests.commands.program import rows_of, run
from unitclass.io.decisions import DecisionStore
from unitclass.io.resolver import samples_folder

CHROMIUM = shutil.which("chromium") or shutil.which("chromium-browser")


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


def test_one_cycle_no_units_and_an_existing_or_unwritable_target(tmp_path, report):
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
def test_a_real_browser_shows_the_page_without_errors_and_nothing_wider_than_the_window(report, page, width, tmp_path):
    probe = tmp_path / "probe.html"
    probe.write_text((report / page).read_text(encoding="utf-8").replace("</body>", (
        "<script>const root = document.documentElement; document.title = JSON.stringify({wide: root.scrollWidth, "
        "window: window.innerWidth, svg: [...document.querySelectorAll('svg')].filter(s => s.getBoundingClientRect()"
        ".height > 5).length, all: document.querySelectorAll('svg').length})</script></body>")), encoding="utf-8")
    ran = subprocess.run(
        [str(CHROMIUM), "--headless", "--no-sandbox", "--disable-gpu", "--enable-logging=stderr",
         f"--window-size={width},900", "--dump-dom", probe.as_uri()],
        capture_output=True, text=True, timeout=90, check=False)
    assert ran.returncode == 0
    assert "CONSOLE" not in ran.stderr
    told = re.search(r'<title>\{"wide":(\d+),"window":(\d+),"svg":(\d+),"all":(\d+)\}</title>',
                     ran.stdout.replace("&quot;", '"'))
    assert told, ran.stdout[:300]
    wide, window, shown, every = map(int, told.groups())
    assert wide <= window
    assert shown == every > 0
