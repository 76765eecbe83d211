"""Every example in docs/ is run, and what it shows is what comes out."""

from __future__ import annotations

import re
import shlex
import shutil
from collections.abc import Iterator
from pathlib import Path

import pytest

from tests.commands.program import run
from tests.settings_page import PAGE, page
from unitclass.batch import Plan, analyse_file
from unitclass.io.decisions import DecisionStore
from unitclass.io.resolver import checkout_folder, samples_folder
from unitclass.io.template_files import read_library
from unitclass.review.session import ReviewSession
from unitclass.settings import Settings

DOCS = Path(__file__).parent.parent / "docs"
PAGES = sorted(path.name for path in DOCS.glob("*.md") if "```console" in path.read_text(encoding="utf-8"))
FILES = {
    "rig.toml": '[rig]\nnerve = "PNA"\nroles = { VNA = "vagus" }\nforms = { VNA = "integrated" }\n',
    "words.csv": "type,word\naug-E,E-aug\n",
    "conditions.csv": "file,start_s,stop_s,condition,animal,cell\nquill-baseline.nwb,0,60,early,,\n"
                      "quill-baseline.nwb,60,190,late,,\n",
}


def examples(name: str) -> Iterator[tuple[str, list[str]]]:
    """Yield every command of a page with the lines that it shows."""
    for block in re.findall(r"```console\n(.*?)```", (DOCS / name).read_text(encoding="utf-8"), re.S):
        for part in re.split(r"^\$ ", block, flags=re.M)[1:]:
            command, *shown = part.rstrip("\n").split("\n")
            yield command, shown


@pytest.fixture
def desk(tmp_path, monkeypatch) -> Path:
    """Return a folder with the samples and the small files that the pages speak of, and no wider terminal."""
    for sample in samples_folder().glob("*.nwb"):
        shutil.copyfile(sample, tmp_path / sample.name)
    for name, text in FILES.items():
        (tmp_path / name).write_text(text)
    monkeypatch.chdir(tmp_path)
    monkeypatch.delenv("COLUMNS", raising=False)
    return tmp_path


def two_people_label(folder: Path) -> None:
    """Let anna and bert label the sample, and differ on one unit."""
    result = analyse_file(str(folder / "quill-baseline.nwb"), Plan(Settings(), read_library())).result
    assert result is not None
    with DecisionStore(folder / "unitclass.sqlite") as store:
        for reviewer in ("anna", "bert"):
            review = ReviewSession(store, reviewer)
            review.add_result(result)
            if reviewer == "bert":
                review.name_type("other")
            for _ in range(5):
                review.accept()


def matches(line: str, printed: list[str]) -> bool:
    """Return whether a shown line was printed; "..." stands for anything."""
    pattern = re.compile(".*".join(re.escape(part) for part in line.strip().split("...")))
    return any(pattern.match(other.strip()) for other in printed)


@pytest.mark.parametrize("name", PAGES)
def test_every_command_of_the_page_works_and_prints_what_the_page_shows(name, desk):
    if name == "two-reviewers.md":
        two_people_label(desk)
    ran_any = False
    for command, shown in examples(name):
        program, *words = shlex.split(command)
        assert program == "unitclass"
        ran = run(*words)
        assert ran.code == 0, (command, ran.err)
        printed = (ran.out + ran.err).splitlines()
        lost = [line for line in shown if line.strip() != "..." and not matches(line, printed)]
        assert not lost, (command, lost, printed[:60])
        ran_any = True
    assert ran_any


def test_the_page_of_settings_is_the_list_in_force():
    assert PAGE.read_text(encoding="utf-8") == page()


def test_every_link_between_pages_leads_somewhere():
    root = checkout_folder()
    assert root is not None
    for path in (root / "README.md", *DOCS.glob("*.md")):
        for target in re.findall(r"\]\(([^)#:]+)\)", path.read_text(encoding="utf-8")):
            assert (path.parent / target).exists(), (path.name, target)
