"""Rules of shape that no linter knows."""

from __future__ import annotations

import ast
import subprocess
import sys
from pathlib import Path

import pytest

ROOT = Path(__file__).resolve().parent.parent
SOURCES = sorted((ROOT / "unitclass").rglob("*.py"))
ALLOWED_TOP = {"README.md", "DEVELOPERS.md", "pyproject.toml", "unitclass", "templates", "tests", "sample_nwb", "docs"}


def test_the_top_level_holds_what_was_agreed_and_nothing_else():
    listed = subprocess.run(["git", "ls-files"], cwd=ROOT, capture_output=True, text=True, check=False)
    if listed.returncode:
        pytest.skip("not a git checkout")
    top = {line.split("/")[0] for line in listed.stdout.splitlines()}
    assert {name for name in top if not name.startswith(".")} <= ALLOWED_TOP


@pytest.mark.parametrize("path", SOURCES, ids=lambda p: str(p.relative_to(ROOT)))
def test_a_source_file_is_short_enough_to_read(path):
    lines = path.read_text("utf-8").splitlines()
    assert len(lines) <= (800 if path.name == "records.py" else 400)


def test_functions_are_short_in_the_median():
    lengths = sorted(node.end_lineno - node.lineno + 1 for path in SOURCES
                     for node in ast.walk(ast.parse(path.read_text("utf-8")))
                     if isinstance(node, ast.FunctionDef | ast.AsyncFunctionDef))
    assert lengths[len(lengths) // 2] <= 12


def loaded_by(code: str, names: str) -> str:
    """Return which of some modules a program has loaded by its end, of those named."""
    watched = f"import sys\n{code}\nprint('loaded:', *(m for m in '{names}'.split() if m in sys.modules))"
    done = subprocess.run([sys.executable, "-c", watched], capture_output=True, text=True, check=True, cwd=ROOT)
    return done.stdout.strip().splitlines()[-1].removeprefix("loaded:").strip()


def test_the_command_line_is_parsed_without_any_heavy_library():
    assert loaded_by("from unitclass.commands.parser import build_parser; build_parser()",
                     "numpy scipy h5py pynwb sklearn textual rich sqlite3") == ""


def test_classify_needs_neither_scikit_learn_nor_scipys_statistics():
    sample = ROOT / "sample_nwb" / "sorrel-slice.nwb"
    code = f"from unitclass.__main__ import main; main(['classify', {str(sample)!r}, '--quiet'])"
    assert loaded_by(code, "sklearn scipy.stats pynwb textual") == ""
