"""The store's tables, how they came to be, and a connection that keeps its promises.

The rollback journal (not write-ahead logging) works on network shares; PERSIST with
synchronous=FULL syncs the journal and the file before a commit returns.
"""

from __future__ import annotations

import sqlite3
from collections.abc import Iterator
from contextlib import closing, contextmanager
from pathlib import Path

from unitclass.errors import FileError, TargetError, UnitclassError

APPLICATION_ID = 0x756E6974  # "unit" in ASCII; tells the store from any other SQLite file

_UNIT_COLUMNS = """
    act INTEGER NOT NULL REFERENCES acts(seq),
    identifier TEXT NOT NULL, object_id TEXT NOT NULL,
    unit TEXT NOT NULL, digest TEXT NOT NULL, condition TEXT NOT NULL,
    reviewer TEXT NOT NULL"""

_TABLES = ("acts", "decisions", "notes", "later_marks", "cycle_edits")

_FIRST = f"""
CREATE TABLE acts (
    seq INTEGER PRIMARY KEY AUTOINCREMENT,
    reviewer TEXT NOT NULL, made_at TEXT NOT NULL, kind TEXT NOT NULL,
    target INTEGER REFERENCES acts(seq));
CREATE TABLE decisions (
    seq INTEGER PRIMARY KEY AUTOINCREMENT, {_UNIT_COLUMNS},
    type TEXT NOT NULL, decided_at TEXT NOT NULL, how TEXT NOT NULL, note TEXT NOT NULL,
    suggested_type TEXT NOT NULL, suggested_probability REAL,
    settings_digest TEXT NOT NULL, template_digest TEXT NOT NULL);
CREATE TABLE notes (
    seq INTEGER PRIMARY KEY AUTOINCREMENT, {_UNIT_COLUMNS}, text TEXT NOT NULL);
CREATE TABLE later_marks (
    seq INTEGER PRIMARY KEY AUTOINCREMENT, {_UNIT_COLUMNS}, is_later INTEGER NOT NULL);
CREATE TABLE cycle_edits (
    seq INTEGER PRIMARY KEY AUTOINCREMENT,
    act INTEGER NOT NULL REFERENCES acts(seq),
    identifier TEXT NOT NULL, object_id TEXT NOT NULL, condition TEXT NOT NULL,
    action TEXT NOT NULL, at_s REAL, value REAL,
    reviewer TEXT NOT NULL, made_at TEXT NOT NULL, note TEXT NOT NULL);
CREATE INDEX acts_by_target ON acts(target) WHERE target IS NOT NULL;
""" + "".join(f"""
CREATE INDEX {table}_by_object ON {table}(object_id);
CREATE INDEX {table}_by_act ON {table}(act);
""" for table in _TABLES[1:]) + """
CREATE INDEX decisions_by_identifier ON decisions(identifier);
""" + "".join(f"""
CREATE TRIGGER {table}_{verb.lower()} BEFORE {verb} ON {table}
BEGIN SELECT RAISE(ABORT, 'the store is append-only'); END;
""" for table in _TABLES for verb in ("UPDATE", "DELETE"))

MIGRATIONS: tuple[str, ...] = (_FIRST,)
"""Script i brings a store from schema version i to i + 1. Never edit one that was released."""


def open_connection(path: Path, *, is_read_only: bool, busy_timeout_s: float) -> sqlite3.Connection:
    """Open the store at `path`, create it or bring it to the present schema.

    Raises
    ------
    TargetError
        If it cannot be created or written (read-only folder, full disk, locked too long).
    FileError
        If the file is no store of this program, is damaged, or is of a newer version.
    """
    with translated_errors(path):
        if is_read_only:
            _finish_interrupted_write(path, busy_timeout_s)
        connection = _connected(path, is_read_only, busy_timeout_s)
        try:
            connection.execute("PRAGMA foreign_keys = ON")
            if not is_read_only:
                connection.execute("PRAGMA journal_mode = PERSIST")
                connection.execute("PRAGMA synchronous = FULL")
                connection.execute("PRAGMA fullfsync = ON")  # where a plain sync does not reach the disk
                _migrate(connection, path)
            _check(connection, path)
        except BaseException:
            connection.close()
            raise
    return connection


def _finish_interrupted_write(path: Path, busy_timeout_s: float) -> None:
    """Roll back what a killed writer left half done; a reader alone may not, and would be refused."""
    with closing(_connected(path, True, busy_timeout_s)) as reader:
        try:
            _version(reader)
            return
        except sqlite3.OperationalError as error:
            if getattr(error, "sqlite_errorcode", 0) != sqlite3.SQLITE_READONLY_ROLLBACK:
                raise
    with closing(_connected(path, False, busy_timeout_s)) as writer:
        _version(writer)


def _connected(path: Path, is_read_only: bool, busy_timeout_s: float) -> sqlite3.Connection:
    target = f"{path.absolute().as_uri()}?mode=ro" if is_read_only else str(path)
    return sqlite3.connect(target, uri=is_read_only, timeout=busy_timeout_s, isolation_level=None,
                           check_same_thread=False)


@contextmanager
def transaction(connection: sqlite3.Connection, path: Path) -> Iterator[sqlite3.Connection]:
    """Run the block as one transaction that holds the write lock from its start."""
    with translated_errors(path):
        connection.execute("BEGIN IMMEDIATE")
        try:
            yield connection
            connection.execute("COMMIT")
        except BaseException:
            if connection.in_transaction:
                connection.execute("ROLLBACK")
            raise


@contextmanager
def translated_errors(path: Path) -> Iterator[None]:
    """Turn SQLite's errors into the program's own, each with what to do."""
    try:
        yield
    except sqlite3.Error as error:
        raise _translated(error, path) from error


def _migrate(connection: sqlite3.Connection, path: Path) -> None:
    if _version(connection) >= len(MIGRATIONS):
        return
    with transaction(connection, path):
        version = _version(connection)  # again, now under the lock
        if version == 0 and _is_foreign(connection):
            raise _not_a_store(path)
        for script in MIGRATIONS[version:]:
            for statement in _statements(script):
                connection.execute(statement)
        if version < len(MIGRATIONS):
            connection.execute(f"PRAGMA application_id = {APPLICATION_ID}")
            connection.execute(f"PRAGMA user_version = {len(MIGRATIONS)}")


def _statements(script: str) -> Iterator[str]:
    """Split a script; `executescript` would commit in the middle of the transaction."""
    statement = ""
    for piece in script.split(";"):
        statement += piece + ";"
        if sqlite3.complete_statement(statement):
            yield statement
            statement = ""


def _check(connection: sqlite3.Connection, path: Path) -> None:
    if connection.execute("PRAGMA application_id").fetchone()[0] != APPLICATION_ID:
        raise _not_a_store(path)
    if _version(connection) > len(MIGRATIONS):
        raise FileError("the store was written by a newer version of unitclass", where=str(path),
                        remedy="update unitclass, or name another file with --store")
    if _version(connection) < len(MIGRATIONS):
        raise FileError("the store is of an older version and cannot be brought up to date here",
                        where=str(path), remedy="make the file writable and open it once")


def _version(connection: sqlite3.Connection) -> int:
    return int(connection.execute("PRAGMA user_version").fetchone()[0])


def _is_foreign(connection: sqlite3.Connection) -> bool:
    return bool(connection.execute("SELECT count(*) FROM sqlite_master").fetchone()[0])


def _not_a_store(path: Path) -> FileError:
    return FileError("is no store of this program", where=str(path), remedy="name another file with --store")


def _translated(error: sqlite3.Error, path: Path) -> UnitclassError:
    code = getattr(error, "sqlite_errorcode", 0) & 0xFF
    if code in (sqlite3.SQLITE_NOTADB, sqlite3.SQLITE_CORRUPT):
        return FileError(f"is damaged or no store of this program ({error})", where=str(path),
                         remedy="restore it from a copy, or name another file with --store")
    what, remedy = {
        sqlite3.SQLITE_BUSY: ("another program holds the store", "wait a moment and try again"),
        sqlite3.SQLITE_LOCKED: ("another program holds the store", "wait a moment and try again"),
        sqlite3.SQLITE_FULL: ("the disk is full; nothing was saved", "free some space and try again"),
        sqlite3.SQLITE_READONLY: ("the store cannot be written",
                                  "make its folder writable or name another file with --store"),
        sqlite3.SQLITE_CANTOPEN: ("the store cannot be opened",
                                  "make its folder writable or name another file with --store"),
    }.get(code, (f"the store cannot be written ({error}); nothing was saved",
                 "free some space or name another file with --store"))
    return TargetError(what, where=str(path), remedy=remedy)
