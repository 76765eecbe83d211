"""What a user of the review feels, in figures: `python -m tests.benchmarks.review [FOLDER]`.

Two thousand synthetic units of ten files, results in the cache as on a second opening, in a real
pseudo-terminal: seconds to the first unit against `import textual.app`; milliseconds from key to
the last byte of the repaint, idle and beside a computing process, also under key repeat; bytes per
step; bytes and CPU of an idle minute (scaled up from ten seconds).
"""

from __future__ import annotations

import os
import select
import statistics
import subprocess
import sys
import tempfile
import time
from pathlib import Path

from tests.benchmarks.synthetic_review import make
from tests.tui.terminal import KEYS, Terminal

QUIET_S = 0.12
N_STEPS, N_STARTS = 100, 7
LONGEST_S = 30.0


def main(folder: Path) -> None:
    """Measure and print."""
    os.environ.pop("PYTHONDONTWRITEBYTECODE", None)  # a second opening finds compiled modules
    if not (folder / "cache.sqlite").exists():
        make(folder)
    _print_start(folder)
    for size in ((80, 24), (200, 60)):
        for state in ("", "busy"):
            _print_steps(folder, size, state)
    _print_idle(folder)


def opened(folder: Path, size: tuple[int, int] = (80, 24), state: str = "") -> Terminal:
    """Return the program once it shows a unit and has settled."""
    terminal = program(folder, size, state)
    terminal.wait_for("suggested:", 60)
    terminal.settle(1.0)
    return terminal


def program(folder: Path, size: tuple[int, int], state: str) -> Terminal:
    """Start the program."""
    given = ["-m", "tests.benchmarks.synthetic_review", str(folder), *filter(None, [state])]
    return Terminal(*given, size=size, env={"OPENBLAS_NUM_THREADS": "1"})


def _print_start(folder: Path) -> None:
    base, first = [], []
    for _ in range(N_STARTS):
        start = time.perf_counter()
        subprocess.run([sys.executable, "-c", "import textual.app"], check=True)
        base.append(time.perf_counter() - start)
        start = time.perf_counter()
        with program(folder, (80, 24), "") as terminal:
            while "suggested:" not in terminal.text:
                terminal._read(0.05)
                if time.perf_counter() - start > LONGEST_S:
                    sys.exit(f"no unit is shown; delete {folder} when the program has changed since it was made")
            first.append(time.perf_counter() - start)
    ratio = statistics.median(first) / statistics.median(base)
    print(f"first unit after {statistics.median(first):.3f} s, `import textual.app` takes "
          f"{statistics.median(base):.3f} s: {ratio:.2f} x")


def _print_steps(folder: Path, size: tuple[int, int], state: str) -> None:
    with opened(folder, size, state) as terminal:
        single = [step(terminal) for _ in range(N_STEPS)]
        repeated = repeat(terminal, N_STEPS)
    delays, sizes = [s for s, _ in single], [n for _, n in single]
    where = f"{size[0]} x {size[1]}{' beside a busy process' if state else ''}"
    print(f"{where}: Down to last byte, ms: median {statistics.median(delays):.1f}, 95 % {p95(delays):.1f}; "
          f"under repeat (30/s) 95 % {p95(repeated):.1f}; bytes: median {statistics.median(sizes):.0f}, "
          f"95 % {p95(sizes):.0f}, most {max(sizes)}")


def step(terminal: Terminal) -> tuple[float, int]:
    """Press Down once; return milliseconds to the last byte and the number of bytes."""
    start = time.perf_counter()
    os.write(terminal._fd, KEYS["Down"].encode())
    data, last = b"", start
    while select.select([terminal._fd], [], [], QUIET_S)[0]:
        data += os.read(terminal._fd, 65536)
        last = time.perf_counter()
    return (last - start) * 1e3, len(data)


def repeat(terminal: Terminal, n_keys: int, rate_hz: float = 30.0) -> list[float]:
    """Hold Down; return the milliseconds from each key to the last byte before the next one."""
    delays = []
    begin = time.perf_counter()
    for number in range(n_keys):
        due = begin + number / rate_hz
        time.sleep(max(0.0, due - time.perf_counter()))
        start = last = time.perf_counter()
        os.write(terminal._fd, KEYS["Down"].encode())
        while (left := due + 1 / rate_hz - time.perf_counter()) > 0:
            if select.select([terminal._fd], [], [], left)[0]:
                os.read(terminal._fd, 65536)
                last = time.perf_counter()
        delays.append((last - start) * 1e3)
    return delays


def _print_idle(folder: Path, seconds: float = 10.0) -> None:
    with opened(folder) as terminal:
        terminal.settle(5.0, 5.0)  # until the shape groups are there
        before, n_bytes = _cpu_s(terminal.pid), len(terminal.raw)
        terminal.settle(seconds, seconds)
        spent = (_cpu_s(terminal.pid) - before) * 60 / seconds
        print(f"idle for a minute: {len(terminal.raw) - n_bytes} bytes, {spent:.2f} s of CPU")


def _cpu_s(pid: int) -> float:
    fields = Path(f"/proc/{pid}/stat").read_text().rpartition(")")[2].split()
    return (int(fields[11]) + int(fields[12])) / float(os.sysconf("SC_CLK_TCK"))


def p95(values: list[float] | list[int]) -> float:
    """Return the 95th percentile."""
    ordered = sorted(values)
    return float(ordered[min(len(ordered) - 1, int(0.95 * len(ordered)))])


if __name__ == "__main__":
    main(Path(sys.argv[1]) if len(sys.argv) > 1 else Path(tempfile.mkdtemp(prefix="review-")))
