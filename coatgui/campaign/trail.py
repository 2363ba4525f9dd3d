"""The audit trail: one line for every edit, undo and redo, never changed and never removed.

What can be undone and redone is not stored, it follows from the lines: an edit goes on the pile of
those that stand, an undo moves the top of that pile to the pile of those undone, a redo moves it
back. A new edit turns what was undone into something abandoned; it stays readable in the trail.
The hashes by which the lines hold each other and the rows are those of `seal`.
"""

from __future__ import annotations

import sqlite3
from collections.abc import Iterable

from coatgui.campaign import changes as changes_of
from coatgui.campaign import connection as database
from coatgui.campaign import seal
from coatgui.campaign.changes import HistoryEntry, RowChange
from coatgui.campaign.errors import CampaignDamaged, CampaignFileError


class Trail:
    """The trail of one file, with what it says can be undone and redone."""

    def __init__(self, connection: sqlite3.Connection, *, is_new: bool = False) -> None:
        """Read the trail, which has a line unless the file `is_new`. Raises CampaignFileError
        where its lines contradict each other."""
        self._connection = connection
        self._names: dict[int, str] = {}
        self._done: list[int] = []
        self._undone: list[int] = []
        self._abandoned: set[int] = set()
        self._last = 0
        self.chain = seal.BEFORE_THE_FIRST
        self.state = ""
        """What the last line says of all that the file holds."""
        for entry_id, action, of_entry, name in connection.execute(
            "SELECT entry_id, action, of_entry, name FROM history ORDER BY entry_id"
        ):
            self._take(entry_id, action, of_entry, name)
        tail = self._tail()
        if tail is not None:
            self._last, self.chain, self.state = tail
        elif not is_new:
            raise CampaignDamaged("This campaign file is damaged: its history is missing.")

    @property
    def to_undo(self) -> int | None:
        return self._done[-1] if self._done else None

    @property
    def to_redo(self) -> int | None:
        return self._undone[-1] if self._undone else None

    def name(self, entry_id: int | None) -> str | None:
        return None if entry_id is None else self._names[entry_id]

    def adopt(self, written: HistoryEntry, state: str) -> None:
        """Take a line that is in the file now into account."""
        self._take(written.entry_id, written.action, written.of_entry, written.name)
        self._last, self.chain, self.state = written.entry_id, written.chain, state

    def _take(self, entry_id: int, action: str, of_entry: int | None, name: str) -> None:
        if action == "edit":
            self._abandoned.update(self._undone)
            self._undone.clear()
            self._done.append(entry_id)
            self._names[entry_id] = name
        elif action == "undo":
            self._move(of_entry, self._done, self._undone)
        elif action == "redo":
            self._move(of_entry, self._undone, self._done)

    def _move(self, entry_id: int | None, pile: list[int], other: list[int]) -> None:
        if not pile or pile[-1] != entry_id:
            raise CampaignDamaged("This campaign file is damaged: its history contradicts itself.")
        other.append(pile.pop())

    def _tail(self) -> tuple[int, str, str] | None:
        """Id, chain hash and state of the last line in the file."""
        row = self._connection.execute(
            "SELECT entry_id, chain, state FROM history ORDER BY entry_id DESC LIMIT 1"
        ).fetchone()
        return None if row is None else (row[0], row[1], row[2])

    def is_behind(self) -> bool:
        """Whether another program has written to the trail since it was read here."""
        return self._tail() != (self._last, self.chain, self.state)

    def ends_with(self, written: HistoryEntry) -> bool:
        """Whether a line is the last one in the file."""
        tail = self._tail()
        return tail is not None and tail[:2] == (written.entry_id, written.chain)

    def refuse_if_behind(self) -> None:
        """Inside a transaction: refuse where another program has written to the trail."""
        if self.is_behind():
            raise CampaignFileError(
                "The campaign was changed by another program since it was opened here: open it "
                "again, then repeat the change."
            )

    def write(
        self,
        action: str,
        of_entry: int | None,
        name: str,
        changes: Iterable[RowChange],
        state: str,
        reason: str = "",
    ) -> HistoryEntry:
        """Add a line, inside the transaction that makes the changes; `adopt` it afterwards.
        `state` is that of the file with the changes made."""
        done = tuple(changes)
        text = changes_of.to_text(done)
        who, when = database.who(), database.now_utc()
        entry_id = self._last + 1
        line = (entry_id, action, of_entry, name, who, when, reason, text, state)
        chain = seal.link(self.chain, line)
        self._connection.execute(
            "INSERT INTO history (entry_id, action, of_entry, name, who, when_utc, reason, "
            "changes, state, chain) VALUES (?, ?, ?, ?, ?, ?, ?, ?, ?, ?)",
            (*line, chain),
        )
        return HistoryEntry(entry_id, action, of_entry, name, who, when, done, "", reason, chain)

    def edit(self, entry_id: int) -> tuple[str, tuple[RowChange, ...]]:
        """Name and changes of an edit."""
        row = self._connection.execute(
            "SELECT name, changes FROM history WHERE entry_id = ?", (entry_id,)
        ).fetchone()
        return row["name"], _changes(row["changes"], entry_id)

    def entries(self, with_changes: bool = True) -> tuple[HistoryEntry, ...]:
        """Every line, oldest first. The rows of a large import are large, too: without them,
        `changes` is empty everywhere."""
        changes = "changes" if with_changes else "'[]' AS changes"
        return tuple(
            HistoryEntry(
                entry_id=row["entry_id"],
                action=row["action"],
                of_entry=row["of_entry"],
                name=row["name"],
                who=row["who"],
                when_utc=row["when_utc"],
                changes=_changes(row["changes"], row["entry_id"]),
                state=self._state(row["entry_id"]) if row["action"] == "edit" else "",
                reason=row["reason"],
                chain=row["chain"],
            )
            for row in self._connection.execute(
                f"SELECT entry_id, action, of_entry, name, who, when_utc, reason, chain, {changes} "
                "FROM history ORDER BY entry_id"
            )
        )

    def _state(self, entry_id: int) -> str:
        if entry_id in self._abandoned:
            return "abandoned"
        return "undone" if entry_id in self._undone else "done"


def _changes(text: str, entry_id: int) -> tuple[RowChange, ...]:
    try:
        return changes_of.from_text(text)
    except ValueError as problem:
        raise CampaignDamaged(
            f"This campaign file is damaged: line {entry_id} of its history cannot be read."
        ) from problem
