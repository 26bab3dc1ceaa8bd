"""Opens session files: for the one program that appends to it, or for reading alone; each complaint is one sentence."""

import os
import sqlite3
import uuid
from datetime import UTC, datetime
from pathlib import Path

from wattproof.core.errors import WrongUseError
from wattproof.store.chain import START, link
from wattproof.store.migrations import migrated, require_way, step_up
from wattproof.store.schema import APPLICATION_ID, PAGE_BYTES, SCHEMA, VERSION
from wattproof.store.session_values import Kind
from wattproof.store.trouble import STORE_ERRORS, DamagedError, explained
from wattproof.store.values import canonical
from wattproof.store.versions import versions

BUSY_S = 0.2  # how long another program is waited for: it holds the file for a whole session, so longer helps nobody
_LEFT_BESIDE = ("-wal", "-journal")
_LEAST_SQLITE = (3, 38, 0)  # STRICT tables came with 3.37, the operator ->> with 3.38


def open_for_appending(path: Path) -> sqlite3.Connection:
    """Open a session file, made new where there is none, and hold it against every other program.

    While it is open SQLite keeps a write-ahead log beside it.

    Raises:
        WrongUseError: the line names the file and the way out.
    """
    _require_sqlite()
    if path.exists():
        _put_in_order(path)
    is_new = not path.exists() or path.stat().st_size == 0
    if not is_new:
        check_head(path)
        if not os.access(path, os.W_OK):
            raise explained(path, sqlite3.OperationalError("attempt to write a readonly database"))
        _probe(path)
    try:
        connection = sqlite3.connect(path, timeout=BUSY_S, isolation_level=None, check_same_thread=False)
    except STORE_ERRORS as error:
        raise explained(path, error) from error
    try:
        connection.execute("PRAGMA locking_mode = EXCLUSIVE")
        if is_new:
            _make(connection)
        _written_ahead(path, connection)
        connection.execute("PRAGMA foreign_keys = ON")
        connection.execute("BEGIN IMMEDIATE")
        connection.execute("COMMIT")
        migrated(connection, path)
    except STORE_ERRORS as error:
        connection.close()
        raise explained(path, error) from error
    except BaseException:
        connection.close()
        raise
    return connection


def open_for_reading(path: Path) -> sqlite3.Connection:
    """Open a session file to read it; one from an earlier version is read as a copy in memory.

    Raises:
        WrongUseError: no such file, no session file, from a newer program, in use, or damaged.
    """
    _require_sqlite()
    if not path.is_file():
        raise WrongUseError(f"{path}: there is no such file; give a session file (NAME.wattproof)")
    _put_in_order(path)
    check_head(path)
    try:
        connection = sqlite3.connect(
            f"{path.absolute().as_uri()}?mode=ro",
            uri=True,
            timeout=BUSY_S,
            isolation_level=None,
            check_same_thread=False,
        )
    except STORE_ERRORS as error:
        raise explained(path, error) from error
    try:
        version = connection.execute("PRAGMA user_version").fetchone()[0]
        connection.execute("SELECT count(*) FROM sqlite_schema").fetchone()
        if version < VERSION:
            connection = _brought_up(connection, path, version)
        connection.execute("PRAGMA query_only = ON")
    except STORE_ERRORS as error:
        connection.close()
        raise explained(path, error) from error
    except BaseException:
        connection.close()
        raise
    return connection


def _probe(path: Path) -> None:
    """Read a little of a file before anything of it is changed.

    Raises:
        DamagedError: it cannot be read.
        WrongUseError: another program has it open.
    """
    try:
        connection = sqlite3.connect(f"{path.absolute().as_uri()}?mode=ro", uri=True, timeout=BUSY_S)
        try:
            if connection.execute("PRAGMA user_version").fetchone()[0] == VERSION:
                connection.execute("SELECT * FROM record ORDER BY seq DESC LIMIT 1").fetchone()
        finally:
            connection.close()
    except STORE_ERRORS as error:
        raise explained(path, error) from error


def _brought_up(connection: sqlite3.Connection, path: Path, version: int) -> sqlite3.Connection:
    """Return a copy in memory, brought up to today's version: reading changes no file."""
    require_way(path, version)
    copy = sqlite3.connect(":memory:", isolation_level=None, check_same_thread=False)
    connection.backup(copy)
    connection.close()
    step_up(copy)
    return copy


def _put_in_order(path: Path) -> None:
    """Finish what a program that died left beside the file: SQLite's own log, whole transactions only.

    Raises:
        WrongUseError: another program has the file open, or the folder is read-only.
    """
    left = any(path.with_name(path.name + end).exists() for end in _LEFT_BESIDE)
    if not left or not _may_be_ours(path):
        return
    if not (os.access(path, os.W_OK) and os.access(path.parent, os.W_OK)):
        raise WrongUseError(
            f"{path}: a program that died left its log beside it, and the folder is read-only; copy both to a folder "
            "that can be written"
        )
    try:
        connection = sqlite3.connect(path, timeout=BUSY_S, isolation_level=None)
    except STORE_ERRORS as error:
        raise explained(path, error) from error
    try:
        connection.execute("PRAGMA locking_mode = EXCLUSIVE")
        connection.execute("SELECT count(*) FROM sqlite_schema").fetchone()
        connection.execute("PRAGMA journal_mode = DELETE")
    except STORE_ERRORS as error:
        raise explained(path, error) from error
    finally:
        connection.close()


def close_as_one_file(connection: sqlite3.Connection, path: Path) -> None:
    """Put the log into the file, drop free pages, and close: one file is left.

    Raises:
        WrongUseError: the disk or the folder does not take it; the log then stays beside the file, and nothing is lost.
    """
    try:
        if connection.execute("PRAGMA freelist_count").fetchone()[0]:
            connection.execute("VACUUM")
        connection.execute("PRAGMA journal_mode = DELETE")
    except STORE_ERRORS as error:
        raise explained(path, error) from error
    finally:
        connection.close()


def check_head(path: Path) -> None:
    """Look at the first bytes of a file: whether it is a session file that this program knows.

    Raises:
        WrongUseError: it is none, or from a newer program.
        DamagedError: it is too short to be one.
    """
    try:
        with path.open("rb") as file:
            head = file.read(100)
    except OSError as error:
        raise explained(path, error) from error
    application, version = int.from_bytes(head[68:72], "big"), int.from_bytes(head[60:64], "big")
    if not head.startswith(b"SQLite format 3\0") or len(head) < 100:
        raise DamagedError(f"{path}: it is no session file, or its beginning is damaged; give a session file")
    if application != APPLICATION_ID:
        raise DamagedError(f"{path}: it is a database of another program, or its head is damaged; give a session file")
    if version > VERSION:
        raise WrongUseError(
            f"{path}: it is from a newer program (version {version}, this one knows {VERSION}); update wattproof"
        )


def _require_sqlite() -> None:
    if sqlite3.sqlite_version_info < _LEAST_SQLITE:
        raise WrongUseError(
            f"SQLite {sqlite3.sqlite_version} is too old for session files; install Python with 3.38 or later"
        )


def _written_ahead(path: Path, connection: sqlite3.Connection) -> None:
    mode = connection.execute("PRAGMA journal_mode = WAL").fetchone()[0]
    if mode != "wal":
        raise WrongUseError(f"{path}: its disk takes no write-ahead log; give a file on a local disk")
    connection.execute("PRAGMA synchronous = FULL")  # what was committed also survives a power cut


def _may_be_ours(path: Path) -> bool:
    """Whether a file is a session, or the beginning of one: its mark stands in it, or nothing yet."""
    with path.open("rb") as file:
        head = file.read(100)
    mark = int.from_bytes(head[68:72], "big")
    return not head or (head.startswith(b"SQLite format 3\0") and mark in {0, APPLICATION_ID})


def _make(connection: sqlite3.Connection) -> None:
    """Make the tables in one transaction, before the log: the file's own head then names it from the first moment."""
    connection.execute(f"PRAGMA page_size = {PAGE_BYTES}")
    connection.execute("BEGIN IMMEDIATE")
    for statement in SCHEMA:
        connection.execute(statement)
    connection.execute(f"PRAGMA application_id = {APPLICATION_ID}")
    connection.execute(f"PRAGMA user_version = {VERSION}")
    connection.execute("INSERT INTO record VALUES (?, ?, ?, ?, ?, ?, ?)", _first_record())
    connection.execute("COMMIT")


def _first_record() -> tuple[int | str | None, ...]:
    """Return the record that every session begins with: a name of its own, and what made it."""
    at = datetime.now(UTC).isoformat(timespec="milliseconds")
    body = canonical({"id": uuid.uuid4().hex, "versions": dict(versions())})
    return 1, Kind.SESSION, None, 1, at, body, link(START, 1, Kind.SESSION, None, 1, at, body)
