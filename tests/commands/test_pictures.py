"""`review --pictures` writes every screen, with shape groups, and names no passing folder."""

from __future__ import annotations

import re
from pathlib import Path

from tests.commands.program import run

SESSION = Path(__file__).parents[2] / "sample_nwb" / "bramble-pons-removed.nwb"


def test_every_screen_of_a_session_is_a_picture_that_names_no_passing_folder(tmp_path):
    ran = run("review", SESSION, "--pictures", tmp_path / "p")
    assert ran.code == 0, ran.err
    pictures = {path.stem: path.read_text("utf-8") for path in (tmp_path / "p").glob("*.svg")}
    assert {"review", "population", "conditions", "cycles", "kinds", "end", "help"} <= set(pictures)
    words = {name: re.sub(r"<[^>]*>", " ", text).replace("&#160;", " ") for name, text in pictures.items()}
    assert re.search(r"kept in\s+unitclass\.sqlite", words["end"])
    assert re.search(r"\bG\d\b", words["population"])
    assert not list(SESSION.parent.glob("*.sqlite"))
