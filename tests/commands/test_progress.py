"""Progress on a terminal stays out of what is piped away; Ctrl-C keeps what was finished."""

from __future__ import annotations

import os
import pty
import shutil
import signal
import subprocess
import sys
import time
from pathlib import Path

import pytest

from tests.tui.terminal import as_from_a_shell
from unitclass.io.resolver import samples_folder


@pytest.fixture
def archive(tmp_path) -> Path:
    folder = tmp_path / "archive"
    folder.mkdir()
    for i in range(14):
        shutil.copyfile(samples_folder() / "sorrel-slice.nwb", folder / f"slice-{i}.nwb")
    return folder


def start(archive: Path, tmp_path: Path, out: object, *words: str) -> tuple[subprocess.Popen[bytes], int]:
    """Start `classify` with a terminal as stderr; return the process and the terminal's other end."""
    mine, its = pty.openpty()
    process = subprocess.Popen(
        [sys.executable, "-m", "unitclass", "classify", str(archive), *words], stdout=out, stderr=its,  # type: ignore[call-overload]
        env=os.environ | {"TERM": "xterm", "XDG_CACHE_HOME": str(tmp_path / "cache")}, start_new_session=True,
        preexec_fn=as_from_a_shell)
    os.close(its)
    return process, mine


def seen(terminal: int) -> str:
    """Return all that the terminal shows until the program ends."""
    text = b""
    while True:
        try:
            part = os.read(terminal, 65536)
        except OSError:
            return text.decode(errors="replace")
        if not part:
            return text.decode(errors="replace")
        text += part


def test_with_a_bar_on_the_terminal_what_is_piped_away_arrives_whole(archive, tmp_path):
    with (tmp_path / "out.txt").open("wb") as out:
        process, terminal = start(archive, tmp_path, out)
        shown = seen(terminal)
    assert process.wait() == 0
    assert "suggested" not in shown
    assert (tmp_path / "out.txt").read_text().count("suggested") == 14


def test_ctrl_c_ends_in_one_line_and_the_next_run_goes_on_from_there(archive, tmp_path):
    process, terminal = start(archive, tmp_path, subprocess.DEVNULL, "--workers", "2", "--table", str(tmp_path / "t.csv"))
    results = tmp_path / "cache" / "unitclass" / "results.sqlite"
    for _ in range(300):
        if results.exists() and results.stat().st_size > 200_000:
            break
        time.sleep(0.05)
    os.killpg(process.pid, signal.SIGINT)
    shown = seen(terminal)
    # A shell shows 130 for both: Python may end by the signal itself when it struck while code was being made.
    assert process.wait() in (130, -signal.SIGINT)
    assert "Traceback" not in shown
    assert "the same command goes on from there" in shown
    assert not (tmp_path / "t.csv").exists()
    again, terminal = start(archive, tmp_path, subprocess.DEVNULL, "--table", str(tmp_path / "t.csv"))
    seen(terminal)
    assert again.wait() == 0
    assert (tmp_path / "t.csv").read_text().count("\n") == 141
