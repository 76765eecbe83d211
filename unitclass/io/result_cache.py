"""Analysis results kept between runs, in a file of their own that may be deleted at any time.

A session is found again by its file's path, size and modification time and by all that shaped
the results; its light list is read at once, each unit when it is asked for.
"""

from __future__ import annotations

import hashlib
import os
import sqlite3
import threading
from collections.abc import Callable, Iterator
from dataclasses import dataclass, field
from datetime import UTC, datetime
from functools import lru_cache
from itertools import islice
from pathlib import Path
from typing import TYPE_CHECKING

from unitclass import __version__
from unitclass.errors import FileError
from unitclass.io import cached_pieces
from unitclass.io.cache_file import open_cache
from unitclass.io.cached_session import CachedSession
from unitclass.io.codec import layout_digest
from unitclass.io.store_text import storable
from unitclass.records import SessionResult

if TYPE_CHECKING:
    from unitclass.io.condition_table import ConditionTable

_PIECES_AT_ONCE = 32


@lru_cache(maxsize=1)
def program_stamp() -> str:
    """Return what tells apart this program from one whose code has been changed since."""
    told = sorted(_sources(str(Path(__file__).parent.parent)))
    return hashlib.sha256(repr(told).encode()).hexdigest()[:12]


def _sources(folder: str) -> Iterator[tuple[str, int, int]]:
    """Yield name, size and time of every source file; this runs before the first unit is shown."""
    with os.scandir(folder) as entries:
        for entry in entries:
            if entry.name.endswith(".py"):
                found = entry.stat()
                yield entry.name, found.st_size, found.st_mtime_ns
            elif entry.name != "__pycache__" and entry.is_dir():
                yield from _sources(entry.path)


@dataclass(frozen=True)
class FileStamp:
    """Which state of a file results belong to. Take it before the analysis reads the file."""

    path: str
    size: int
    mtime_ns: int

    @classmethod
    def of(cls, path: str | Path) -> FileStamp:
        """Return the stamp of a file as it is now; raises OSError when it cannot be read."""
        found = os.stat(path)
        return cls(storable(os.path.realpath(path)), found.st_size, found.st_mtime_ns)


@dataclass(frozen=True)
class CacheKey:
    """All besides the file and its cycle edits that shapes results.

    `options` is any text that tells apart runs with different options (nerve, conditions, ...).
    """

    settings_digest: str
    template_digest: str
    options: str = ""
    program: str = field(default_factory=lambda: f"{__version__} {layout_digest()} {program_stamp()}")


def cache_options(nerve: str, condition_column: str, only: str, conditions: ConditionTable | None, *,
                  is_cycles_only: bool = False) -> str:
    """Return the text for `CacheKey.options`: the command's words, and the table of conditions in full."""
    rows = conditions.rows if conditions is not None else ()
    return repr((nerve, condition_column, only, rows, is_cycles_only))


class ResultCache:
    """A cache of session results. Nothing here ever raises because of the cache file itself.

    Parameters
    ----------
    path : Path
        Made with its folder when missing, made anew when damaged.
    max_bytes : int
        Above this the sessions used longest ago are dropped.
    """

    def __init__(self, path: Path | str, *, max_bytes: int = 2_000_000_000) -> None:
        self.path = Path(path)
        self._max_bytes = max_bytes
        self._lock = threading.RLock()
        self._db = open_cache(self.path)

    def close(self) -> None:
        """Close the file."""
        with self._lock:
            if self._db is not None:
                self._db.close()
                self._db = None

    def find(self, path: str | Path, key: CacheKey, *,
             edits_digest_of: Callable[[str, str], str] | None = None) -> CachedSession | None:
        """Return the results of a file as it is now, or None when they must be made.

        Parameters
        ----------
        path : str or Path
            As given by the user; the results will show it.
        edits_digest_of : callable, optional
            NWB identifier and object id to the digest of the session's cycle edits, for instance
            `DecisionStore.edits_digest`. Without it only results without edits are found.
        """
        try:
            stamp = FileStamp.of(path)
            with self._lock:
                return self._found(str(path), stamp, key, edits_digest_of)
        except (OSError, sqlite3.Error, ValueError, FileError):
            return None

    def put(self, result: SessionResult, stamp: FileStamp, key: CacheKey, *, edits_digest: str = "") -> bool:
        """Keep a session's results in place of older ones; return whether that worked."""
        try:
            with self._lock:
                if self._db is None:
                    return False
                self._drop_older(self._db, stamp, key, edits_digest)
                self._write(self._db, result, stamp, key, edits_digest)
                self._make_room(self._db)
            return True
        except (sqlite3.Error, OSError):
            return False

    def _found(self, path: str, stamp: FileStamp, key: CacheKey,
               edits_digest_of: Callable[[str, str], str] | None) -> CachedSession | None:
        if self._db is None:
            return None
        rows = self._db.execute(
            "SELECT id, edits_digest, used_on FROM sessions WHERE is_complete AND path = ? AND size = ? AND"
            " mtime_ns = ? AND settings_digest = ? AND template_digest = ? AND program = ? AND options = ?"
            " ORDER BY id DESC", (*_stamped(stamp), *_keyed(key))).fetchall()
        for number, edits_digest, used_on in rows:
            session = CachedSession(self._db, self._lock, number, path)
            wanted = edits_digest_of(session.head.identifier, session.head.object_id) if edits_digest_of else ""
            if edits_digest == wanted and session.units is not None:  # reads, and so checks, the list
                self._mark_used(number, used_on)
                return session
        return None

    def _mark_used(self, number: int, used_on: str) -> None:
        if self._db is not None and used_on != _today():
            try:
                self._db.execute("UPDATE sessions SET used_on = ? WHERE id = ?", (_today(), number))
            except sqlite3.OperationalError:
                return  # a cache that cannot be written can still be read

    def _drop_older(self, db: sqlite3.Connection, stamp: FileStamp, key: CacheKey, edits_digest: str) -> None:
        db.execute("DELETE FROM sessions WHERE path = ? AND is_complete AND NOT (size = ? AND mtime_ns = ?)",
                   _stamped(stamp))
        db.execute("DELETE FROM sessions WHERE is_complete AND path = ? AND size = ? AND mtime_ns = ? AND"
                   " settings_digest = ? AND template_digest = ? AND program = ? AND options = ? AND"
                   " edits_digest = ?", (*_stamped(stamp), *_keyed(key), edits_digest))
        db.execute("DELETE FROM sessions WHERE NOT is_complete AND used_on < ?", (_today(),))

    def _write(self, db: sqlite3.Connection, result: SessionResult, stamp: FileStamp, key: CacheKey,
               edits_digest: str) -> None:
        """Write in short transactions, so that a reader never waits long; complete at the end."""
        row = (*_stamped(stamp), storable(result.object_id), *_keyed(key), edits_digest, _today())
        number = db.execute(
            "INSERT INTO sessions (path, size, mtime_ns, object_id, settings_digest, template_digest, program,"
            " options, edits_digest, used_on, is_complete) VALUES (?, ?, ?, ?, ?, ?, ?, ?, ?, ?, 0)", row).lastrowid
        for pieces in _grouped(cached_pieces.pieces_of(result)):
            with db:
                db.execute("BEGIN IMMEDIATE")
                db.executemany("INSERT INTO pieces (session, kind, unit, condition, content)"
                               " VALUES (?, ?, ?, ?, ?)", [(number, *piece) for piece in pieces])
        db.execute("UPDATE sessions SET is_complete = 1 WHERE id = ?", (number,))

    def _make_room(self, db: sqlite3.Connection) -> None:
        while _used_bytes(db) > self._max_bytes:
            oldest = db.execute("SELECT id FROM sessions WHERE is_complete ORDER BY used_on, id").fetchall()
            if len(oldest) < 2:
                return
            db.execute("DELETE FROM sessions WHERE id = ?", oldest[0])


def _grouped(pieces: Iterator[cached_pieces.Piece]) -> Iterator[list[cached_pieces.Piece]]:
    while group := list(islice(pieces, _PIECES_AT_ONCE)):
        yield group


def _stamped(stamp: FileStamp) -> tuple[str, int, int]:
    return stamp.path, stamp.size, stamp.mtime_ns


def _keyed(key: CacheKey) -> tuple[str, str, str, str]:
    return key.settings_digest, key.template_digest, key.program, key.options


def _used_bytes(db: sqlite3.Connection) -> int:
    size, pages, free = (int(db.execute(f"PRAGMA {name}").fetchone()[0])
                         for name in ("page_size", "page_count", "freelist_count"))
    return size * (pages - free)


def _today() -> str:
    return datetime.now(UTC).date().isoformat()
