"""The campaign file: one SQLite database that holds a campaign, its raw files and its history.

Every change goes through one door, `CampaignFile._carry_out`: one transaction that checks each row
against what the change expects, changes it and writes the line of the audit trail. Undo is the
inverse of an edit through the same door, redo the edit itself; so both survive closing the file.

One connection serves all threads, each in its turn behind a lock. A second connection for the
background would wait for the first at file level instead, and could find it locked. The lock is
held while a transaction is written, never while something is computed.
"""

from __future__ import annotations

import hashlib
import sqlite3
import threading
from collections.abc import Iterable, Iterator, Mapping
from contextlib import contextmanager, suppress
from pathlib import Path
from types import TracebackType
from typing import Any

from coatgui.campaign import changes as changes_of
from coatgui.campaign import connection as database
from coatgui.campaign import rows, rules, schema
from coatgui.campaign.changes import Change, HistoryEntry, Operation, Row, RowChange
from coatgui.campaign.errors import CampaignFileError, OperationRefused
from coatgui.campaign.snapshot import Snapshot
from coatgui.campaign.trail import Trail
from coatgui.records import Campaign, Spectrum


class CampaignFile:
    """An open campaign file. Make one with `create` or `open`; close it, or use it in `with`.

    Edits, undo and redo belong to one thread, as their order matters. The methods of the cache
    may be called from any thread. Every method raises CampaignFileError, with one sentence, where
    it cannot do its work; then nothing has changed.
    """

    def __init__(self, path: Path, connection: sqlite3.Connection) -> None:
        """For `open` only: `connection` is to a file found sound and of the newest version."""
        self.path = path.absolute()
        self._connection = connection
        self._lock = threading.RLock()
        self._closed = False
        self._snapshot = Snapshot(connection)
        self._trail = Trail(connection)

    @classmethod
    def create(
        cls, path: Path, campaign: Campaign, raw: Mapping[str, bytes], *, replace: bool = False
    ) -> CampaignFile:
        """Write a campaign to a new file and open it. `raw` maps SHA-256 to the bytes of the files
        that the campaign was read from. An existing file is overwritten only where `replace`."""
        database.write_whole_file(
            path, lambda beside: _fill(beside, campaign, raw), replace=replace
        )
        return cls.open(path)

    @classmethod
    def open(cls, path: Path) -> CampaignFile:
        """Open a campaign file, bringing one of an older version up to date."""
        connection = database.connect(path)
        try:
            with database.plain_words(path):
                problems = schema.unexpected_structure(connection)
                if problems:
                    raise CampaignFileError(f"{path.name} cannot be trusted: {problems[0]}")
                schema.migrate(connection)
                return cls(path, connection)
        except BaseException:
            database.disconnect(connection, path)
            raise

    def close(self) -> None:
        """Release the file. Closing twice does no harm."""
        with self._lock:
            if not self._closed:
                self._closed = True
                database.disconnect(self._connection, self.path)

    def __enter__(self) -> CampaignFile:
        return self

    def __exit__(
        self,
        kind: type[BaseException] | None,
        value: BaseException | None,
        trace: TracebackType | None,
    ) -> None:
        self.close()

    @property
    def campaign(self) -> Campaign:
        """The campaign as it is now; it stays as it is when the file changes."""
        return self._snapshot.campaign

    # -----------------------------------------------------------------------------------------
    # Changes

    def apply(self, operation: Operation) -> Change:
        """Make a change and remember how to take it back. An operation without row changes does
        nothing."""
        if not operation.changes:
            return Change(frozenset(), operation.name)
        return self._carry_out(
            "edit", None, operation.name, operation.changes, operation.spectra, operation.raw
        )

    def undo(self) -> Change | None:
        """Take back the newest edit that stands; None where there is none."""
        return self._again("undo", self._trail.to_undo)

    def redo(self) -> Change | None:
        """Make the edit again that was undone last; None where there is none."""
        return self._again("redo", self._trail.to_redo)

    @property
    def step(self) -> int | None:
        """The newest edit that stands, by its number in the history."""
        return self._trail.to_undo

    @property
    def undo_name(self) -> str | None:
        """The name of the edit that `undo` would take back."""
        return self._trail.name(self._trail.to_undo)

    @property
    def redo_name(self) -> str | None:
        """The name of the edit that `redo` would make again."""
        return self._trail.name(self._trail.to_redo)

    def history(self, *, with_changes: bool = True) -> tuple[HistoryEntry, ...]:
        """The audit trail, oldest line first; quicker without the changed rows."""
        with self._using():
            return self._trail.entries(with_changes)

    def _again(self, action: str, entry_id: int | None) -> Change | None:
        if entry_id is None:
            return None
        with self._using():
            name, changes = self._trail.edit(entry_id)
        if action == "undo":
            changes = changes_of.inverse(changes)
        return self._carry_out(action, entry_id, name, changes)

    def _carry_out(
        self,
        action: str,
        of_entry: int | None,
        name: str,
        changes: Iterable[RowChange],
        spectra: tuple[Spectrum, ...] = (),
        raw: Mapping[str, bytes] | None = None,
    ) -> Change:
        """The one door for every change."""
        with self._using():
            with database.transaction(self._connection):
                self._trail.refuse_if_behind()
                _keep_spectra(self._connection, spectra)
                _keep_raw(self._connection, raw or {})
                done = tuple(_change_row(self._connection, change) for change in changes)
                entry_id = self._trail.write(action, of_entry, name, done)
                touched = self._snapshot.read_again(((c.table, c.key) for c in done), spectra)
            self._trail.adopt(entry_id, action, of_entry, name)
            self._snapshot.adopt(touched)
            return Change(frozenset(change.table for change in done), name)

    # -----------------------------------------------------------------------------------------
    # Raw files, copies, cached results

    def raw(self, sha256: str) -> bytes | None:
        """The unchanged bytes of an imported file, or None where the file does not hold them.
        Raises CampaignFileError where they no longer are what their SHA-256 says."""
        with self._using():
            row = self._connection.execute(
                "SELECT bytes FROM raw_files WHERE sha256 = ?", (sha256,)
            ).fetchone()
        if row is None:
            return None
        content = bytes(row["bytes"])
        if hashlib.sha256(content).hexdigest() != sha256:
            raise CampaignFileError(
                f"{self.path.name} is damaged: the stored bytes of an imported file "
                f"(SHA-256 {sha256[:12]}…) have changed."
            )
        return content

    def save_copy(self, path: Path, *, replace: bool = False) -> None:
        """Write the whole campaign file, history and all, to another name; this one stays open."""

        def fill(beside: Path) -> None:
            copy = sqlite3.connect(beside)
            try:
                self._connection.backup(copy)
            finally:
                copy.close()

        with self._using():
            database.write_whole_file(path, fill, replace=replace)

    def cached_results(self, keys: Iterable[str]) -> dict[str, bytes]:
        """Those of the results that were kept under these keys. From any thread."""
        with self._using():
            found = {}
            for key in keys:
                row = self._connection.execute(
                    "SELECT result FROM cached_results WHERE result_key = ?", (key,)
                ).fetchone()
                if row is not None:
                    found[key] = bytes(row["result"])
            return found

    def keep_results(self, results: Mapping[str, bytes]) -> None:
        """Keep results under their keys. From any thread. Where the file is write-protected or
        busy they are not kept, which costs time later and nothing else."""
        if not results:
            return
        refused = suppress(sqlite3.OperationalError)
        with self._using(), refused, database.transaction(self._connection):
            self._connection.executemany(
                "INSERT OR REPLACE INTO cached_results VALUES (?, ?)", results.items()
            )

    @contextmanager
    def _using(self) -> Iterator[None]:
        with self._lock:
            if self._closed:
                raise CampaignFileError(f"{self.path.name} has been closed.")
            with database.plain_words(self.path):
                yield


# ---------------------------------------------------------------------------------------------
# Writing rows


def _fill(path: Path, campaign: Campaign, raw: Mapping[str, bytes]) -> None:
    connection = database.connect_new(path)
    try:
        schema.migrate(connection)
        with database.transaction(connection):
            _keep_spectra(connection, rules.all_spectra(campaign))
            _keep_raw(connection, raw)
            for table, row in rules.all_rows(campaign):
                _insert(connection, table, row)
            Trail(connection).write("create", None, "Create the campaign", ())
    finally:
        connection.close()


def _keep_spectra(connection: sqlite3.Connection, spectra: Iterable[Spectrum]) -> None:
    connection.executemany(
        "INSERT OR IGNORE INTO spectra VALUES "
        "(:spectrum_id, :frequency_hz, :real_ohm, :imaginary_ohm)",
        map(rows.spectrum_row, spectra),
    )


def _keep_raw(connection: sqlite3.Connection, raw: Mapping[str, bytes]) -> None:
    for sha256, content in raw.items():
        if hashlib.sha256(content).hexdigest() != sha256:
            raise CampaignFileError("The bytes of an imported file do not fit their SHA-256.")
        connection.execute("INSERT OR IGNORE INTO raw_files VALUES (?, ?)", (sha256, content))


def _change_row(connection: sqlite3.Connection, change: RowChange) -> RowChange:
    """Change one row. Returns the change with all that its inverse needs: the place of a row that
    goes away."""
    _refuse_unknown_names(change)
    table, key = change.table, change.key
    is_key = f"{schema.KEYS[table]} = ?"
    present = connection.execute(f"SELECT * FROM {table} WHERE {is_key}", (key,)).fetchone()
    if change.before is None:
        if present is not None or change.after is None:
            raise OperationRefused(f"This is already in the campaign's {_words(table)}.")
        if change.after.get(schema.KEYS[table]) != key:
            raise OperationRefused("A new row does not carry the key that it goes by.")
        _insert(connection, table, change.after)
        return change
    if present is None:
        raise OperationRefused(
            f"This is no longer in the campaign's {_words(table)}: it was removed meanwhile."
        )
    if any(present[column] != value for column, value in change.before.items()):
        raise OperationRefused(
            f"This was changed meanwhile in the campaign's {_words(table)}: look at it and try "
            "again."
        )
    if change.after is None:
        connection.execute(f"DELETE FROM {table} WHERE {is_key}", (key,))
        return RowChange(table, key, dict(zip(present.keys(), present, strict=True)), None)
    settings = ", ".join(f"{column} = ?" for column in change.after)
    connection.execute(
        f"UPDATE {table} SET {settings} WHERE {is_key}", (*change.after.values(), key)
    )
    return change


def _insert(connection: sqlite3.Connection, table: str, row: Row) -> None:
    """Add a row; one of an ordered table that names no place goes to the end."""
    values: dict[str, Any] = dict(row)
    if table in schema.ORDERED and "place" not in values:
        last = connection.execute(f"SELECT MAX(place) FROM {table}").fetchone()[0]
        values["place"] = 0 if last is None else last + 1
    connection.execute(
        f"INSERT INTO {table} ({', '.join(values)}) VALUES ({', '.join('?' * len(values))})",
        tuple(values.values()),
    )


def _refuse_unknown_names(change: RowChange) -> None:
    """Tables and columns become part of SQL text: only our own may."""
    named = {*(change.before or ()), *(change.after or ())}
    if change.table not in schema.KEYS or not named <= schema.columns(change.table):
        raise OperationRefused("The change names a table or column that a campaign does not have.")


def _words(table: str) -> str:
    return table.replace("_", "-")
