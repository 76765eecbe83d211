"""A real pseudo-terminal with an emulator, for tests that look at the screen as a person does."""

from __future__ import annotations

import fcntl
import os
import pty
import select
import signal
import struct
import sys
import termios
import time
from types import TracebackType

import pyte

KEYS = {"Enter": "\r", "Esc": "\x1b", "Up": "\x1b[A", "Down": "\x1b[B", "Right": "\x1b[C", "Left": "\x1b[D",
        "PgDn": "\x1b[6~", "PgUp": "\x1b[5~", "Home": "\x1b[H", "End": "\x1b[F", "Ctrl-C": "\x03"}


def as_from_a_shell() -> None:
    """Let a child take the signals that a shell's own children take, however the tests were started (nohup, &)."""
    for number in (signal.SIGINT, signal.SIGHUP, signal.SIGQUIT):
        signal.signal(number, signal.SIG_DFL)


class Terminal:
    """A program behind a terminal of a given size; everything it wrote is in `raw`."""

    def __init__(self, *arguments: str, size: tuple[int, int] = (80, 24),
                 env: dict[str, str] | None = None) -> None:
        self.screen = pyte.Screen(*size)
        self._stream = pyte.ByteStream(self.screen)
        self.raw = b""
        self.code: int | None = None
        self.pid, self._fd = pty.fork()
        if self.pid == 0:
            as_from_a_shell()
            fcntl.ioctl(0, termios.TIOCSWINSZ, struct.pack("HHHH", size[1], size[0], 0, 0))
            os.execve(sys.executable, [sys.executable, *arguments], _environment(env or {}))
        self.resize(*size)

    def resize(self, columns: int, rows: int) -> None:
        """Change the size, as a user who drags the window."""
        self.screen.resize(rows, columns)
        fcntl.ioctl(self._fd, termios.TIOCSWINSZ, struct.pack("HHHH", rows, columns, 0, 0))

    def press(self, *keys: str) -> None:
        """Send keys, by name or as they are."""
        for key in keys:
            os.write(self._fd, KEYS.get(key, key).encode())
            self.settle(0.03)

    def write(self, keys: str) -> None:
        """Send keys without looking at what comes of them."""
        os.write(self._fd, keys.encode())

    def settle(self, quiet_s: float = 0.15, longest_s: float = 5.0) -> None:
        """Read until nothing has come for a while."""
        end = time.monotonic() + longest_s
        while time.monotonic() < end and self._read(quiet_s):
            pass

    def wait_for(self, words: str, timeout_s: float = 15.0) -> str:
        """Read until the screen shows some words; return the screen."""
        end = time.monotonic() + timeout_s
        while words not in self.text:
            if time.monotonic() > end or (not self._read(0.1) and self.has_ended):
                raise AssertionError(f"{words!r} never came; the screen shows\n{self.text}")
        self.settle(0.04)
        return self.text

    def wait_until_ended(self, timeout_s: float = 10.0) -> int:
        """Read until the program has ended; return its exit code."""
        end = time.monotonic() + timeout_s
        while not self.has_ended:
            if time.monotonic() > end:
                raise AssertionError(f"the program goes on; the screen shows\n{self.text}")
            self._read(0.05)
        self._read(0.05)
        assert self.code is not None
        return self.code

    @property
    def has_ended(self) -> bool:
        """Return whether the program has ended."""
        if self.code is None:
            pid, status = os.waitpid(self.pid, os.WNOHANG)
            if pid:
                self.code = os.waitstatus_to_exitcode(status)
        return self.code is not None

    @property
    def text(self) -> str:
        """Return the screen as a person reads it."""
        return "\n".join(line.rstrip() for line in self.screen.display)

    @property
    def lines(self) -> list[str]:
        """Return the screen's lines."""
        return self.text.split("\n")

    def signal(self, number: int) -> None:
        """Send the program a signal."""
        os.kill(self.pid, number)

    def _read(self, timeout_s: float) -> bool:
        ready, _, _ = select.select([self._fd], [], [], timeout_s)
        try:
            data = os.read(self._fd, 65536) if ready else b""
        except OSError:
            return False
        self.raw += data
        self._stream.feed(data)
        return bool(data)

    def __enter__(self) -> Terminal:
        return self

    def __exit__(self, kind: type[BaseException] | None, error: BaseException | None,
                 trace: TracebackType | None) -> None:
        if not self.has_ended:
            self.signal(signal.SIGKILL)
            os.waitpid(self.pid, 0)
        os.close(self._fd)


def _environment(changes: dict[str, str]) -> dict[str, str]:
    """Return the environment of a plain terminal, with changes (readline may have set LINES behind us)."""
    left_out = ("NO_COLOR", "LC_ALL", "LC_CTYPE", "COLUMNS", "LINES", "COLORFGBG", "COLORTERM")
    kept = {name: value for name, value in os.environ.items() if name not in left_out}
    return {**kept, "TERM": "xterm-256color", "LANG": "C.UTF-8", **changes}
