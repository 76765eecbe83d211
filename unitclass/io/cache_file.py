"""The SQLite file under the result cache: may be deleted at any time, and makes itself anew."""

from __future__ import annotations

import sqlite3
from pathlib import Path

_LAYOUT = 1

# AUTOINCREMENT: the number of a dropped session is never given to another one.
_TABLES = """
CREATE TABLE sessions (
    id INTEGER PRIMARY KEY AUTOINCREMENT, path TEXT NOT NULL, size INTEGER NOT NULL, mtime_ns INTEGER NOT NULL,
    object_id TEXT NOT NULL, settings_digest TEXT NOT NULL, template_digest TEXT NOT NULL,
    program TEXT NOT NULL, options TEXT NOT NULL, edits_digest TEXT NOT NULL,
    is_complete INTEGER NOT NULL, used_on TEXT NOT NULL);
CREATE INDEX sessions_by_path ON sessions(path);
CREATE TABLE pieces (
    id INTEGER PRIMARY KEY, session INTEGER NOT NULL REFERENCES sessions(id) ON DELETE CASCADE,
    kind TEXT NOT NULL, unit TEXT NOT NULL, condition TEXT NOT NULL, content BLOB NOT NULL);
CREATE UNIQUE INDEX pieces_by_name ON pieces(session, kind, unit, condition);
"""


def open_cache(path: Path, *, busy_timeout_s: float = 10.0) -> sqlite3.Connection | None:
    """Open the cache, making it anew if it is damaged or of another layout.

    Returns None where no file can be kept: the program then works without a cache.
    """
    try:
        path.parent.mkdir(parents=True, exist_ok=True)
        return _opened(path, busy_timeout_s)
    except sqlite3.DatabaseError:
        return _made_anew(path, busy_timeout_s)
    except OSError:
        return None


def _made_anew(path: Path, busy_timeout_s: float) -> sqlite3.Connection | None:
    try:
        for suffix in ("", "-journal"):
            path.with_name(path.name + suffix).unlink(missing_ok=True)
        return _opened(path, busy_timeout_s)
    except (OSError, sqlite3.DatabaseError):
        return None


def _opened(path: Path, busy_timeout_s: float) -> sqlite3.Connection:
    db = sqlite3.connect(path, timeout=busy_timeout_s, isolation_level=None, check_same_thread=False)
    try:
        # Lost with the power it is only computed again; without syncs readers hardly ever wait.
        db.execute("PRAGMA synchronous = OFF")
        db.execute("PRAGMA foreign_keys = ON")
        _set_up(db)
    except BaseException:
        db.close()
        raise
    return db


def _set_up(db: sqlite3.Connection) -> None:
    if _layout(db) == _LAYOUT:
        return
    db.execute("BEGIN IMMEDIATE")
    if _layout(db) != _LAYOUT:
        if db.execute("SELECT count(*) FROM sqlite_master").fetchone()[0]:
            raise sqlite3.DatabaseError("another layout")
        for statement in _TABLES.split(";"):
            db.execute(statement)
        db.execute(f"PRAGMA user_version = {_LAYOUT}")
    db.execute("COMMIT")


def _layout(db: sqlite3.Connection) -> int:
    return int(db.execute("PRAGMA user_version").fetchone()[0])
