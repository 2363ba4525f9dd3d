"""Opening a campaign file: looked over before it is trusted, locked, brought up to date."""

from __future__ import annotations

import sqlite3
import sys
from contextlib import suppress
from dataclasses import dataclass
from pathlib import Path

from coatgui.campaign import connection as database
from coatgui.campaign import copies, schema, seal
from coatgui.campaign.errors import CampaignDamaged, CampaignFileError
from coatgui.campaign.lock import Holder, InUse, WriteLock, take
from coatgui.campaign.snapshot import Snapshot
from coatgui.campaign.trail import Trail

# Up to this size a file is checked page by page, and its trail line by line, each time it is
# opened. Own choice: a second or two; above, that is left to `check_file`.
THOROUGH_UP_TO_BYTES = 300_000_000
_SMALL_TABLES = (*schema.KEYS, "history")


@dataclass
class Opened:
    """A connection to a file found sound and of the newest version, with the right to write to it
    or the reason why there is none."""

    path: Path
    connection: sqlite3.Connection
    lock: WriteLock | None
    read_only_because: str
    holder: Holder | None
    identity: tuple[int, int]
    thorough: bool

    def is_in_place(self) -> bool:
        """Whether the file that is open is still the one that goes by its name."""
        return _identity(self.path) == self.identity

    def close(self) -> None:
        database.disconnect(self.connection, self.path)
        if self.lock is not None:
            self.lock.release()


def open_file(path: Path, *, read_only: bool) -> Opened:
    """Raises CampaignFileError."""
    # A relative path would mean another file once the working folder changes.
    path = path.absolute()
    connection = database.connect(path)
    lock: WriteLock | None = None
    holder: Holder | None = None
    try:
        with database.plain_words(path):
            thorough = path.stat().st_size <= THOROUGH_UP_TO_BYTES
            _refuse_damaged(connection, path, thorough=thorough)
            because = f"{path.name} was opened for reading only." if read_only else ""
            if not because:
                lock, holder, because = _take_lock(path)
            if lock is not None and not lock.by_system and sys.platform != "win32":
                database.disconnect(connection, path)
                connection = database.connect_without_locks(path)
            if not because:
                because = _allow_writing(connection, path)
            if schema.version(connection) < len(schema.MIGRATIONS):
                connection = _brought_up_to_date(connection, path, because)
            if because and lock is not None:
                lock.release()
                lock = None
            return Opened(path, connection, lock, because, holder, _identity(path), thorough)
    except BaseException:
        database.disconnect(connection, path)
        if lock is not None:
            lock.release()
        raise


def verified_total(opened: Opened, snapshot: Snapshot, trail: Trail) -> int:
    """The sum behind the state of the file (see `seal`). Raises CampaignDamaged where the rows, or
    the lines of the trail, are not as the program left them."""
    total = snapshot.total + seal.content_total(opened.connection)
    if seal.state_text(total) != trail.state:
        raise _damaged(opened.path, "what it holds is not what its history says of it")
    if opened.thorough:
        line = seal.broken_link(opened.connection)
        if line is not None:
            raise _damaged(opened.path, f"line {line} of its history was altered")
    return total


def _refuse_damaged(connection: sqlite3.Connection, path: Path, *, thorough: bool) -> None:
    problems = schema.unexpected_structure(connection)
    if problems:
        raise CampaignFileError(f"{path.name} cannot be trusted: {problems[0]}")
    # A database of an older version does not have all of them.
    present = {row[0] for row in connection.execute("SELECT name FROM sqlite_schema")}
    checks = [""] if thorough else [f"({table})" for table in _SMALL_TABLES if table in present]
    for of in checks:
        for (said,) in connection.execute(f"PRAGMA quick_check{of}"):
            if said != "ok":
                raise _damaged(path, f"SQLite says “{' '.join(str(said).split())}”")


def _damaged(path: Path, why: str) -> CampaignDamaged:
    return CampaignDamaged(
        f"{path.name} is damaged ({why}): go back to a copy of it, or have recovered what can be "
        "read."
    )


def _take_lock(path: Path) -> tuple[WriteLock | None, Holder | None, str]:
    """The lock, or who has it, or why there is none."""
    try:
        return take(path), None, ""
    except InUse as used:
        said = f"{path.name} is open for writing by {used.holder}: it can only be read here."
        return None, used.holder, said
    except OSError:
        return (
            None,
            None,
            f"The folder of {path.name} is write-protected: save a copy elsewhere to change it.",
        )


def _allow_writing(connection: sqlite3.Connection, path: Path) -> str:
    """ "" or why nothing can be written."""
    try:
        database.allow_writing(connection)
    except sqlite3.Error as problem:
        connection.execute("PRAGMA query_only = ON")
        if "readonly" in str(problem):
            return f"{path.name} is write-protected: save a copy elsewhere to change it."
        return f"{path.name} cannot be written to ({problem}): save a copy elsewhere to change it."
    return ""


def _brought_up_to_date(
    connection: sqlite3.Connection, path: Path, because: str
) -> sqlite3.Connection:
    """The file itself, after a copy was made; or, where it can only be read, its content in
    memory."""
    if not because:
        copies.before_migration(connection, path, schema.version(connection))
        schema.migrate(connection)
        return connection
    copy = database.copy_in_memory(connection)
    try:
        schema.migrate(copy)
        copy.execute("PRAGMA query_only = ON")
    except BaseException:
        copy.close()
        raise
    connection.close()
    return copy


def _identity(path: Path) -> tuple[int, int]:
    with suppress(OSError):
        found = path.stat()
        return found.st_dev, found.st_ino
    return -1, -1
