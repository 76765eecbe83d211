"""The real program in a pseudo-terminal, looked at through an emulator."""

import re
import signal

import pytest

from tests.tui.terminal import Terminal
from unitclass.io.decisions import DecisionStore


def review(folder, *options, **terminal):
    return Terminal("-m", "tests.tui.fake_review", str(folder), *options, **terminal)


def wait(terminal, words="suggested:"):
    return terminal.wait_for(words)


@pytest.mark.parametrize("size", [(80, 24), (120, 40), (200, 60)])
def test_every_size_shows_unit_file_picture_verdict_and_keys(tmp_path, size):
    with review(tmp_path, size=size) as terminal:
        text = wait(terminal)
    for words in ("unit 1  baseline", "heron_04.nwb", "1 of 60", "suggested: early-I 0.93", "as fitted",
                  "95 % limits", "expiration 2.00 s", "PNA", "begins at phase", "? help", "Enter accept"):
        assert words in text
    assert all(len(line) <= size[0] for line in text.split("\n"))
    assert "Traceback" not in text


def test_a_small_terminal_has_a_plainer_picture(tmp_path):
    with review(tmp_path, size=(40, 12)) as terminal:
        text = wait(terminal, "early-I 0.93")
    for words in ("unit 1", "sp/s", "? help", "rule of thumb: early-I"):
        assert words in text
    assert "█" in text


def test_a_terminal_that_is_too_small_says_so(tmp_path):
    with review(tmp_path, size=(24, 7)) as terminal:
        assert "make it 40 x 12" in wait(terminal, "Too small")
        terminal.resize(80, 24)
        wait(terminal)


def test_resizing_down_and_up_comes_back_to_the_same_screen(tmp_path):
    with review(tmp_path) as terminal:
        before = wait(terminal)
        terminal.resize(40, 12)
        wait(terminal, "rule of thumb: early-I, the same")
        terminal.resize(80, 24)
        wait(terminal)
        terminal.settle()
        assert terminal.text == before


def test_without_utf8_everything_written_is_ascii(tmp_path):
    with review(tmp_path, env={"LC_ALL": "C"}) as terminal:
        wait(terminal)
        terminal.press("p", "Esc", "c", "Esc", "k", "Esc", "s", "Esc", "?", "Esc")
        terminal.settle()
        assert "#" in terminal.text
    assert terminal.raw.isascii()


def test_the_c_locale_counts_as_ascii_although_python_turns_it_into_utf8(tmp_path):
    with review(tmp_path, env={"LANG": "C"}) as terminal:
        wait(terminal)
    assert terminal.raw.isascii()


def test_without_colour_no_colour_is_sent_and_nothing_is_lost(tmp_path):
    with review(tmp_path, env={"NO_COLOR": "1"}) as terminal:
        text = wait(terminal)
    colours = re.findall(rb"\x1b\[[0-9;]*m", terminal.raw)
    assert all(not {int(n) for n in code[2:-1].split(b";") if n} & {*range(30, 39), *range(40, 49), *range(90, 108)}
               for code in colours)
    assert "·" in text  # inspiration is shaded by a lattice
    assert "━" in text
    assert "▓" in text


def test_on_a_light_background_the_shading_is_light_and_its_text_dark(tmp_path):
    with review(tmp_path, "light") as terminal:
        wait(terminal)
    assert b"48;5;254" in terminal.raw
    assert b"48;5;236" not in terminal.raw


def test_a_dumb_terminal_gets_one_clear_line(tmp_path):
    with review(tmp_path, env={"TERM": "dumb"}) as terminal:
        assert terminal.wait_until_ended() == 2
        terminal.settle()
        text = " ".join(terminal.text.split())
    assert text.startswith("unitclass: the review needs a terminal")
    assert "Traceback" not in text


def test_names_of_a_file_never_steer_the_terminal(tmp_path):
    with review(tmp_path, "hostile") as terminal:
        wait(terminal)
        for _ in range(9):
            terminal.press("Down")
        terminal.press("p", "Esc", "s", "Esc", "i", "Esc", "k", "Esc", "a", "Esc", "w", "Esc")
        terminal.settle()
    assert b"\x1b]0;owned" not in terminal.raw
    assert b"\x1b[2J" not in terminal.raw.split(b"\x1b[?1049h")[1]
    for character in ("\u202e", "\u2066", "\x9b"):
        assert character.encode() not in terminal.raw
    assert b"\x07" not in re.sub(rb"\x1b\][^\x07\x1b]*(\x07|\x1b\\)", b"", terminal.raw)
    assert "[bold red]unit[/]" in re.sub(r"\x1b\[[0-9;?]*[A-Za-z]", "", terminal.raw.decode())


def test_a_decision_stands_after_the_process_is_killed(tmp_path):
    with review(tmp_path) as terminal:
        wait(terminal)
        terminal.press("Enter")
        terminal.wait_for("1 labelled")
        terminal.signal(signal.SIGKILL)
        terminal.wait_until_ended()
    with review(tmp_path) as terminal:
        assert "1 labelled" in wait(terminal)


@pytest.mark.parametrize("moment_s", [0.02, 0.11, 0.19, 0.33])
def test_killed_in_the_middle_of_a_run_of_decisions_all_that_was_shown_is_there_once(tmp_path, moment_s):
    with review(tmp_path) as terminal:
        wait(terminal)
        for _ in range(40):
            terminal.write("\r")
        terminal.settle(0.005, moment_s)
        terminal.signal(signal.SIGKILL)
        terminal.wait_until_ended()
        shown = int(re.search(r"(\d+) labelled", terminal.text).group(1))
    with DecisionStore(tmp_path / "decisions.sqlite") as store:
        told = store.history("heron-04-identifier", "0b7e7f0e-3b51-4c38-9a3c-6d2f4d6d1a11")
    assert len(told) >= shown
    assert len({(d.unit, d.condition) for d in told}) == len(told)


def test_a_hang_up_ends_the_program_and_keeps_what_was_decided(tmp_path):
    with review(tmp_path) as terminal:
        wait(terminal)
        terminal.press("Enter")
        terminal.wait_for("1 labelled")
        terminal.signal(signal.SIGHUP)
        terminal.wait_until_ended()
    with review(tmp_path) as terminal:
        assert "1 labelled" in wait(terminal)


@pytest.mark.parametrize("key", ["q", "Ctrl-C"])
def test_leaving_gives_the_terminal_back(tmp_path, key):
    with review(tmp_path) as terminal:
        wait(terminal)
        terminal.press(key)
        assert terminal.wait_until_ended() == 0
        terminal.settle()
    assert b"\x1b[?1049l" in terminal.raw
    assert b"\x1b[?25h" in terminal.raw


def test_a_request_to_end_gives_the_terminal_back(tmp_path):
    with review(tmp_path) as terminal:
        wait(terminal)
        terminal.signal(signal.SIGTERM)
        assert terminal.wait_until_ended() == 143
        terminal.settle()
    assert b"\x1b[?1049l" in terminal.raw


def test_files_come_in_while_one_reviews_and_a_failed_one_is_told(tmp_path):
    with review(tmp_path, "pending") as terminal:
        wait(terminal)
        terminal.wait_for("1 of 120")
        terminal.press("e")
        text = "".join(terminal.wait_for("failed:").split())
        assert text.count("broken.nwb:nounitsandnomembranepotential") == 1
        assert "a library that prints" not in terminal.raw.decode()
        assert "writes below Python" not in terminal.raw.decode()


def test_before_the_first_file_is_ready_the_screen_says_what_is_going_on(tmp_path):
    with review(tmp_path, "pending", "empty") as terminal:
        wait(terminal, "being analysed")
        wait(terminal)


def test_mouse_reporting_can_be_turned_off(tmp_path):
    with review(tmp_path, "nomouse") as terminal:
        wait(terminal)
    assert b"?1000h" not in terminal.raw
    assert b"?1003h" not in terminal.raw


def test_an_idle_program_sends_nothing(tmp_path):
    with review(tmp_path) as terminal:
        wait(terminal)
        terminal.settle(0.3)
        before = len(terminal.raw)
        terminal.settle(0.8)
        assert len(terminal.raw) == before


def test_a_step_sends_less_than_three_kibibytes(tmp_path):
    with review(tmp_path) as terminal:
        wait(terminal)
        terminal.settle(0.3)
        for _ in range(8):
            before = len(terminal.raw)
            terminal.press("Down")
            terminal.settle(0.06)
            assert 0 < len(terminal.raw) - before <= 3 * 1024
