"""A real browser looks at a page: what it requests, says on its console, and how wide the page becomes.

The page is served by a server on this machine that writes down every request; all host names lead to
it, so that a request to anywhere else is written down too. It stands in a frame of the width wanted,
since a browser's own window has a least width above a phone's.
"""

from __future__ import annotations

import json
import re
import shutil
import subprocess
from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import dataclass, field
from functools import partial
from html import unescape
from http.server import SimpleHTTPRequestHandler, ThreadingHTTPServer
from pathlib import Path
from threading import Thread

CHROMIUM = shutil.which("chromium") or shutil.which("chromium-browser")

FRAME = """<!doctype html><link rel="icon" href="data:,"><title>no answer</title>
<iframe id="f" style="border:0;width:{width}px;height:900px" src="/{page}"></iframe>
<script>addEventListener("load", () => {{
  const inner = document.getElementById("f").contentWindow, page = inner.document;
  const seen = [...page.querySelectorAll("svg")].filter(s => s.getBoundingClientRect().height > 5);
  document.title = JSON.stringify({{wide: page.documentElement.scrollWidth, window: inner.innerWidth,
    pictures: page.querySelectorAll("svg").length, pictures_seen: seen.length}});
}})</script>"""


@dataclass
class Seen:
    """What the browser did with the page."""

    requests: list[str]
    console: list[str]
    wide: int
    window: int
    pictures: int
    pictures_seen: int


@dataclass
class _Log:
    frame: str
    requests: list[str] = field(default_factory=list)


class _Handler(SimpleHTTPRequestHandler):
    def __init__(self, log: _Log, *args: object, directory: str) -> None:
        self.log = log
        super().__init__(*args, directory=directory)  # type: ignore[arg-type]

    def do_GET(self) -> None:
        host = self.headers.get("Host", "").split(":")[0]
        if host == "127.0.0.1" and self.path == "/the-frame":
            body = self.log.frame.encode()
            self.send_response(200)
            self.send_header("Content-Type", "text/html")
            self.end_headers()
            self.wfile.write(body)
            return
        self.log.requests.append(f"{host}{self.path}")
        super().do_GET()

    def log_message(self, *args: object) -> None:
        pass


@contextmanager
def _served(folder: Path, log: _Log) -> Iterator[int]:
    server = ThreadingHTTPServer(("127.0.0.1", 0), partial(_Handler, log, directory=str(folder)))
    thread = Thread(target=server.serve_forever, daemon=True)
    thread.start()
    try:
        yield server.server_address[1]
    finally:
        server.shutdown()
        server.server_close()
        thread.join(5)


def look(folder: Path, page: str, width: int) -> Seen:
    """Open a page of the folder at a width, CSS pixels."""
    log = _Log(FRAME.format(width=width, page=page))
    with _served(folder, log) as port:
        ran = subprocess.run(
            [str(CHROMIUM), "--headless", "--no-sandbox", "--disable-gpu", "--disable-background-networking",
             "--disable-component-update", "--disable-features=NetworkTimeServiceQuerying",
             "--enable-logging=stderr", "--window-size=1400,1000", f"--host-resolver-rules=MAP * 127.0.0.1:{port}",
             "--dump-dom", f"http://127.0.0.1:{port}/the-frame"],
            capture_output=True, text=True, timeout=90, check=True)
    told = re.search(r"<title>(.*?)</title>", ran.stdout)
    assert told, ran.stdout[:300]
    console = [line for line in ran.stderr.splitlines() if "CONSOLE" in line]
    return Seen(requests=log.requests, console=console, **json.loads(unescape(told[1])))
