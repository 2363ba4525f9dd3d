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

from coatgui.campaign import changes as changes_of
from coatgui.campaign import connection as database
from coatgui.campaign import copies, opening, seal, writing
from coatgui.campaign.changes import Change, HistoryEntry, Operation, RowChange
from coatgui.campaign.errors import CampaignFileError, FileGone, OperationRefused
from coatgui.campaign.lock import Holder
from coatgui.campaign.snapshot import Snapshot
from coatgui.campaign.trail import Trail
from coatgui.records import Campaign, Spectrum


class CampaignFile:
    """An open campaign file. Make one with `create` or `open`; close it, or use it in `with`.

    `read_only_because` says in a sentence why nothing can be changed, "" where it can; a change is
    then refused with that sentence. `holder` is who has it, where that is the reason. `left_open`
    is who had it open for writing before and did not close it, as after a crash.

    Edits, undo and redo belong to one thread, as their order matters. The methods of the cache
    may be called from any thread. Every method raises CampaignFileError, with one sentence, where
    it cannot do its work; then nothing has changed.
    """

    def __init__(self, opened: opening.Opened) -> None:
        """For `open` only."""
        self.path = opened.path
        self.read_only_because = opened.read_only_because
        self.holder: Holder | None = opened.holder
        self.left_open: Holder | None = opened.lock.left_behind if opened.lock else None
        self._opened = opened
        self._connection = opened.connection
        self._lock = threading.RLock()
        self._closed = False
        self._snapshot = Snapshot(opened.connection)
        self._trail = Trail(opened.connection)
        self._total = opening.verified_total(opened, self._snapshot, self._trail)

    @classmethod
    def create(
        cls, path: Path, campaign: Campaign, raw: Mapping[str, bytes], *, replace: bool = False
    ) -> CampaignFile:
        """Write a campaign to a new file and open it. `raw` maps SHA-256 to the bytes of the files
        that the campaign was read from. An existing file is overwritten only where `replace`."""
        database.write_whole_file(
            path,
            lambda beside: writing.fill(beside, campaign, raw, "Create the campaign"),
            replace=replace,
        )
        return cls.open(path)

    @classmethod
    def open(cls, path: Path, *, read_only: bool = False) -> CampaignFile:
        """Open a campaign file, bringing one of an older version up to date after a copy of it was
        made beside. Where somebody else has it, or it cannot be written to, it is opened for
        reading only. Raises CampaignDamaged where it is not as the program left it."""
        opened = opening.open_file(path, read_only=read_only)
        try:
            with database.plain_words(path):
                return cls(opened)
        except BaseException:
            opened.close()
            raise

    def close(self) -> None:
        """Release the file. Closing twice does no harm."""
        with self._lock:
            if not self._closed:
                self._closed = True
                self._opened.close()

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
            "edit",
            None,
            operation.name,
            operation.changes,
            operation.spectra,
            operation.raw,
            operation.reason,
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
        reason: str = "",
    ) -> Change:
        """The one door for every change."""
        with self._using():
            self._refuse_unless_writable()
            written: HistoryEntry | None = None
            try:
                with database.transaction(self._connection):
                    self._trail.refuse_if_behind()
                    total = self._total
                    total += writing.keep_spectra(self._connection, spectra)
                    total += writing.keep_raw(self._connection, raw or {})
                    done, grown = writing.change_rows(self._connection, changes)
                    touched = self._snapshot.read_again(((c.table, c.key) for c in done), spectra)
                    total += grown + touched.total
                    state = seal.state_text(total)
                    written = self._trail.write(action, of_entry, name, done, state, reason)
            except sqlite3.Error:
                # A disk may fail after the change was made, in telling so: then it is made.
                if written is None or not self._is_made(written):
                    raise
            self._trail.adopt(written, state)
            self._snapshot.adopt(touched)
            self._total = total
            return Change(frozenset(change.table for change in done), name)

    def _is_made(self, written: HistoryEntry) -> bool:
        with suppress(sqlite3.Error):
            return self._trail.ends_with(written)
        return False

    def changed_elsewhere(self) -> bool:
        """Whether somebody else has changed the file since it was opened here: what is shown is
        then no longer what it holds, and opening it again brings it up to date."""
        with self._using():
            return self._trail.is_behind()

    def _refuse_unless_writable(self) -> None:
        if self.read_only_because:
            raise OperationRefused(self.read_only_because)
        if not self._opened.is_in_place():
            raise FileGone(database.gone(self.path))

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
        content = row["bytes"]
        if not isinstance(content, bytes) or hashlib.sha256(content).hexdigest() != sha256:
            raise CampaignFileError(
                f"{self.path.name} is damaged: the stored bytes of an imported file "
                f"(SHA-256 {sha256[:12]}…) have changed."
            )
        return content

    def photographs(self) -> dict[str, bytes]:
        """The bytes of the campaign's photographs by their SHA-256. Raises CampaignFileError."""
        contents = {p.sha256: self.raw(p.sha256) for p in self.campaign.photographs}
        return {sha256: content for sha256, content in contents.items() if content is not None}

    def save_copy(self, path: Path, *, replace: bool = False) -> tuple[str, ...]:
        """Write the whole campaign file, history and all, to another name; this one stays open.

        Where the file can no longer be read, as when its disk was taken away, what is in memory is
        written. Returns sentences on what is then missing; usually none."""
        with self._using():
            missing: tuple[str, ...] = ()

            def fill(beside: Path) -> None:
                nonlocal missing
                try:
                    copies.back_up(self._connection, beside)
                except sqlite3.Error:
                    if not copies.copy_with_journal(self.path, beside, self._trail.chain):
                        missing = copies.fill_from_memory(self._connection, self.campaign, beside)

            database.write_whole_file(path, fill, replace=replace)
            return missing

    def keep_copy(self, folder: Path | None = None) -> Path | None:
        """Make the next of the rolling copies and remove those that age makes superfluous; see
        `copies`. `folder` None: the folder of copies beside the file. None where nothing changed
        since the newest copy. From any thread; edits can go on meanwhile."""
        with self._using():
            return copies.keep(self._connection, self.path, folder, self._trail.chain, self._lock)

    def cached_results(self, keys: Iterable[str]) -> dict[str, bytes]:
        """Those of the results that were kept under these keys. From any thread."""
        with self._using():
            found = {}
            for key in keys:
                row = self._connection.execute(
                    "SELECT result, sha256 FROM cached_results WHERE result_key = ?", (key,)
                ).fetchone()
                # One that was damaged on the disk is computed again.
                if row and seal.result_hash(key, row["result"]) == row["sha256"] != "":
                    found[key] = bytes(row["result"])
            return found

    def keep_results(self, results: Mapping[str, bytes]) -> None:
        """Keep results under their keys. From any thread. Where the file is write-protected or
        busy they are not kept, which costs time later and nothing else."""
        if not results or self.read_only_because:
            return
        refused = suppress(sqlite3.OperationalError)
        with self._using(), refused, database.transaction(self._connection):
            self._connection.executemany(
                "INSERT OR REPLACE INTO cached_results VALUES (?, ?, ?)",
                ((key, kept, seal.result_hash(key, kept)) for key, kept in results.items()),
            )

    @contextmanager
    def _using(self) -> Iterator[None]:
        with self._lock:
            if self._closed:
                raise CampaignFileError(f"{self.path.name} has been closed.")
            with database.plain_words(self.path):
                yield
