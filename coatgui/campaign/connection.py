"""How a campaign file is reached: looked at first, then connected to with care.

A campaign file may come by mail from anybody. So its header is read before SQLite is let near it,
its schema must be exactly ours, and SQLite is told to trust nothing in it. The rollback journal
(DELETE) with full synchronisation is used because it is sound on network folders and removable
disks too, and leaves one whole file; a file that comes with a write-ahead log is turned back.
"""

from __future__ import annotations

import getpass
import os
import secrets
import sqlite3
import threading
from collections import Counter
from collections.abc import Callable, Iterator
from contextlib import contextmanager, suppress
from datetime import UTC, datetime
from functools import cache
from pathlib import Path

from coatgui.campaign import schema
from coatgui.campaign.errors import (
    CampaignDamaged,
    CampaignFileError,
    FileGone,
    OperationRefused,
    StorageFailed,
)

_HEADER = b"SQLite format 3\x00"
_APPLICATION_ID_AT = 68  # place of the application id in the file header, 4 bytes, big-endian
_PATIENCE_S = 5.0  # how long to wait for another program that is writing
# What SQLite may be made to handle. Own choice: several times what the program itself ever needs.
_LIMITS = {
    sqlite3.SQLITE_LIMIT_ATTACHED: 0,
    sqlite3.SQLITE_LIMIT_LENGTH: 500_000_000,
    sqlite3.SQLITE_LIMIT_SQL_LENGTH: 100_000,
    sqlite3.SQLITE_LIMIT_COLUMN: 100,
    sqlite3.SQLITE_LIMIT_EXPR_DEPTH: 50,
    sqlite3.SQLITE_LIMIT_COMPOUND_SELECT: 10,
    sqlite3.SQLITE_LIMIT_FUNCTION_ARG: 10,
    sqlite3.SQLITE_LIMIT_VARIABLE_NUMBER: 200,
    sqlite3.SQLITE_LIMIT_TRIGGER_DEPTH: 1,
    sqlite3.SQLITE_LIMIT_WORKER_THREADS: 0,
}

# Campaign files open in this process. POSIX drops SQLite's locks on a file when *any* handle on it
# is closed, so a file that is open here must not be looked into by other means.
_open_here: Counter[str] = Counter()
_open_here_lock = threading.Lock()


@contextmanager
def plain_words(path: Path) -> Iterator[None]:
    """Turn what SQLite and the system say into one CampaignFileError."""
    try:
        yield
    except sqlite3.IntegrityError as problem:
        raise OperationRefused(
            f"The change breaks a rule of the campaign and was not made ({problem})."
        ) from problem
    except sqlite3.OperationalError as problem:
        raise _in_words(path, problem) from problem
    except sqlite3.DataError as problem:
        raise OperationRefused(
            "This is more than a campaign file can take at once: bring it in in smaller parts."
        ) from problem
    except MemoryError as problem:
        raise CampaignFileError(
            f"The computer's memory is not enough for {path.name}: close other programs first."
        ) from problem
    except sqlite3.Error as problem:
        raise CampaignDamaged(
            f"{path.name} is damaged ({_one_line(problem)}): go back to a copy of it, or have "
            "recovered what can be read."
        ) from problem
    except UnicodeDecodeError as problem:
        raise _no_text(path) from problem
    except UnicodeEncodeError as problem:
        raise OperationRefused(
            "A text holds characters that cannot be stored: please write it differently."
        ) from problem
    except OSError as problem:
        raise CampaignFileError(
            f"{path} cannot be used: {problem.strerror or problem}."
        ) from problem


def _in_words(path: Path, problem: sqlite3.OperationalError) -> CampaignFileError:
    name = getattr(problem, "sqlite_errorname", "") or ""
    said = str(problem)
    if said.startswith("Could not decode"):
        return _no_text(path)
    if "locked" in said:
        return CampaignFileError(
            f"{path.name} is being written by another program: try again when it is done."
        )
    if name == "SQLITE_READONLY_DBMOVED":
        return FileGone(gone(path))
    if "readonly" in said:
        return CampaignFileError(
            f"{path.name} or its folder is write-protected: save a copy elsewhere to change it."
        )
    if name == "SQLITE_FULL":
        return StorageFailed(
            f"The disk with {path.name} is full, so the last change was not made; all before it is "
            "kept. Make room, or save a copy elsewhere."
        )
    if name.startswith("SQLITE_IOERR"):
        return StorageFailed(
            f"The disk or network folder with {path.name} does not answer as it should, so the "
            "last change was not made; all before it is kept. Save a copy elsewhere."
        )
    if name.startswith("SQLITE_CANTOPEN"):
        return StorageFailed(
            f"{path.name} cannot be reached or its folder cannot be written to. Look whether the "
            "disk or network folder is there, or save a copy elsewhere."
        )
    return CampaignFileError(f"{path.name} cannot be used: {_one_line(problem)}.")


def _no_text(path: Path) -> CampaignFileError:
    return CampaignDamaged(
        f"{path.name} is damaged (a text in it is none): go back to a copy of it, or have "
        "recovered what can be read."
    )


def _one_line(problem: Exception) -> str:
    """What SQLite says may quote whole tables of a damaged file."""
    said = " ".join(str(problem).split())
    return said if len(said) <= 120 else f"{said[:120]}…"


def gone(path: Path) -> str:
    return (
        f"{path.name} is no longer in its place: it was moved, removed or replaced while it was "
        "open. All that was done is still at hand: save it elsewhere."
    )


def connect(path: Path) -> sqlite3.Connection:
    """A connection to a campaign file, after looking at its header; its schema is not looked at.

    Nothing can be written through it until `allow_writing`. Transactions are ours to begin and
    end. The connection may be used from any thread, by one at a time. Close it with `disconnect`.
    Raises CampaignFileError.
    """
    with plain_words(path):
        if not path.is_file():
            raise CampaignFileError(f"There is no campaign file {path}.")
        here = str(path.resolve())
        with _open_here_lock:
            if not _open_here[here]:
                _look_at_header(path)
            _open_here[here] += 1
        connection = None
        try:
            connection = _connect(path)
            # Asked again: a file that was open here was not looked into.
            if _pragma(connection, "application_id") != schema.APPLICATION_ID:
                raise _not_a_campaign(path)
            connection.execute("PRAGMA foreign_keys = ON")
            connection.execute("PRAGMA query_only = ON")
            return connection
        except BaseException:
            if connection is not None:
                connection.close()
            _forget(here)
            raise


def disconnect(connection: sqlite3.Connection, path: Path) -> None:
    connection.close()
    _forget(str(path.resolve()))


def is_open_here(path: Path) -> bool:
    with _open_here_lock:
        return _open_here[str(path.resolve())] > 0


def connect_new(path: Path) -> sqlite3.Connection:
    """A connection to a new, empty campaign file without tables at `path`."""
    connection = _connect(path)
    connection.execute(f"PRAGMA application_id = {schema.APPLICATION_ID}")
    _set_up(connection)
    return connection


def copy_in_memory(connection: sqlite3.Connection) -> sqlite3.Connection:
    """The same content in memory, where it can be changed without touching the file."""
    copy = _connect(":memory:")
    connection.backup(copy)
    copy.execute("PRAGMA foreign_keys = ON")
    return copy


def connect_without_locks(path: Path) -> sqlite3.Connection:
    """As `connect`, for a place where the system has no locks: SQLite then makes a folder beside
    the file as its lock. Only for whoever holds the campaign's `WriteLock`; a folder left by a
    crash is taken away."""
    with plain_words(path), suppress(FileNotFoundError):
        path.with_name(path.name + ".lock").rmdir()
    with plain_words(path):
        connection = _connect(f"{path.absolute().as_uri()}?vfs=unix-dotfile", uri=True)
        with _open_here_lock:
            _open_here[str(path.resolve())] += 1
        connection.execute("PRAGMA foreign_keys = ON")
        connection.execute("PRAGMA query_only = ON")
        return connection


def allow_writing(connection: sqlite3.Connection) -> None:
    """Writing from here on, each commit on the disk when it ends. Raises sqlite3.Error where the
    file cannot be written to."""
    connection.execute("PRAGMA query_only = OFF")
    _set_up(connection)
    connection.execute("BEGIN IMMEDIATE")
    connection.execute("ROLLBACK")


def _connect(path: Path | str, *, uri: bool = False) -> sqlite3.Connection:
    connection = sqlite3.connect(
        path, timeout=_PATIENCE_S, isolation_level=None, check_same_thread=False, uri=uri
    )
    connection.row_factory = sqlite3.Row
    for limit, most in _LIMITS.items():
        connection.setlimit(limit, most)
    # Before anything is read: nothing in the file may call functions with effects, and its pages
    # are checked as they are read.
    connection.execute("PRAGMA trusted_schema = OFF")
    connection.execute("PRAGMA cell_size_check = ON")
    connection.execute("PRAGMA mmap_size = 0")
    return connection


def _set_up(connection: sqlite3.Connection) -> None:
    connection.execute("PRAGMA foreign_keys = ON")
    connection.execute("PRAGMA synchronous = FULL")
    if _pragma(connection, "journal_mode") != "delete":
        connection.execute("PRAGMA journal_mode = DELETE")


def _pragma(connection: sqlite3.Connection, name: str) -> object:
    return connection.execute(f"PRAGMA {name}").fetchone()[0]


def _look_at_header(path: Path) -> None:
    with path.open("rb") as file:
        header = file.read(100)
    named = header[_APPLICATION_ID_AT : _APPLICATION_ID_AT + 4]
    if not header.startswith(_HEADER) or int.from_bytes(named) != schema.APPLICATION_ID:
        raise _not_a_campaign(path)


def _not_a_campaign(path: Path) -> CampaignFileError:
    return CampaignFileError(f"{path.name} is not a campaign file of coatgui.")


def _forget(here: str) -> None:
    with _open_here_lock:
        _open_here[here] -= 1
        if _open_here[here] <= 0:
            del _open_here[here]


@contextmanager
def transaction(connection: sqlite3.Connection) -> Iterator[None]:
    """All or nothing, on disk when it ends."""
    connection.execute("BEGIN IMMEDIATE")
    try:
        yield
        connection.execute("COMMIT")
    except BaseException:
        # Some errors have already rolled back by themselves.
        if connection.in_transaction:
            # A disk that fails may fail here, too: the journal then does it at the next opening.
            with suppress(sqlite3.Error):
                connection.execute("ROLLBACK")
        raise


def write_whole_file(path: Path, fill: Callable[[Path], None], *, replace: bool) -> None:
    """Let `fill` write a database beside `path`, and give it the name `path` when it is whole.

    Raises CampaignFileError where `path` exists and `replace` is False, where it is open in this
    program, or where it cannot be written; then nothing is left behind.
    """
    with plain_words(path):
        if is_open_here(path):
            raise CampaignFileError(f"{path.name} is open in this program: choose another name.")
        if path.is_dir():
            raise CampaignFileError(f"{path} is a folder: choose another name.")
        if path.exists() and not replace:
            raise CampaignFileError(f"There is already a file {path}: choose another name.")
        if not path.parent.is_dir():
            raise CampaignFileError(f"The folder {path.parent} does not exist: make it first.")
        beside = path.with_name(f"{path.name}.{secrets.token_hex(4)}.part")
        try:
            fill(beside)
            # A journal left by a crash belongs to the file that goes away. SQLite would play it
            # back into the new one.
            for ending in ("-journal", "-wal", "-shm"):
                path.with_name(path.name + ending).unlink(missing_ok=True)
            _flush(beside)
            beside.replace(path)
            _flush_folder(path.parent)
        finally:
            beside.unlink(missing_ok=True)
            beside.with_name(beside.name + "-journal").unlink(missing_ok=True)


def _flush(path: Path) -> None:
    with path.open("rb+") as file:
        os.fsync(file.fileno())


def _flush_folder(folder: Path) -> None:
    """Make a new name last a power cut, where the system can do that for folders."""
    with suppress(OSError):
        handle = os.open(folder, os.O_RDONLY)
        try:
            os.fsync(handle)
        finally:
            os.close(handle)


@cache
def who() -> str:
    """The name of the person at the computer, for the audit trail. Asked for once: some systems ask
    a server."""
    try:
        return getpass.getuser()
    except (OSError, KeyError, ImportError):  # no account name, as in some containers
        return "unknown"


def now_utc() -> str:
    return datetime.now(UTC).strftime("%Y-%m-%dT%H:%M:%SZ")
