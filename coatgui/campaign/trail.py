"""The audit trail: one line for every edit, undo and redo, never changed and never removed.

What can be undone and redone is not stored, it follows from the lines: an edit goes on the pile of
those that stand, an undo moves the top of that pile to the pile of those undone, a redo moves it
back. A new edit turns what was undone into something abandoned; it stays readable in the trail.
"""

from __future__ import annotations

import sqlite3
from collections.abc import Iterable

from coatgui.campaign import changes as changes_of
from coatgui.campaign import connection as database
from coatgui.campaign.changes import HistoryEntry, RowChange
from coatgui.campaign.errors import CampaignFileError


class Trail:
    """The trail of one file, with what it says can be undone and redone."""

    def __init__(self, connection: sqlite3.Connection) -> None:
        """Read the trail. Raises CampaignFileError where its lines contradict each other."""
        self._connection = connection
        self._names: dict[int, str] = {}
        self._done: list[int] = []
        self._undone: list[int] = []
        self._abandoned: set[int] = set()
        self._last = 0
        for entry_id, action, of_entry, name in connection.execute(
            "SELECT entry_id, action, of_entry, name FROM history ORDER BY entry_id"
        ):
            self.adopt(entry_id, action, of_entry, name)

    @property
    def to_undo(self) -> int | None:
        return self._done[-1] if self._done else None

    @property
    def to_redo(self) -> int | None:
        return self._undone[-1] if self._undone else None

    def name(self, entry_id: int | None) -> str | None:
        return None if entry_id is None else self._names[entry_id]

    def adopt(self, entry_id: int, action: str, of_entry: int | None, name: str) -> None:
        """Take a line that is in the file into account."""
        if action == "edit":
            self._abandoned.update(self._undone)
            self._undone.clear()
            self._done.append(entry_id)
            self._names[entry_id] = name
        elif action == "undo":
            self._move(of_entry, self._done, self._undone)
        elif action == "redo":
            self._move(of_entry, self._undone, self._done)
        self._last = entry_id

    def _move(self, entry_id: int | None, pile: list[int], other: list[int]) -> None:
        if not pile or pile[-1] != entry_id:
            raise CampaignFileError(
                "This campaign file is damaged: its history contradicts itself."
            )
        other.append(pile.pop())

    def refuse_if_behind(self) -> None:
        """Inside a transaction: refuse where another program has written to the trail."""
        last = self._connection.execute("SELECT MAX(entry_id) FROM history").fetchone()[0]
        if (last or 0) != self._last:
            raise CampaignFileError(
                "The campaign was changed by another program since it was opened here: open it "
                "again, then repeat the change."
            )

    def write(
        self, action: str, of_entry: int | None, name: str, changes: Iterable[RowChange]
    ) -> int:
        """Add a line, inside the transaction that makes the changes; `adopt` it afterwards."""
        written = self._connection.execute(
            "INSERT INTO history (action, of_entry, name, who, when_utc, changes) "
            "VALUES (?, ?, ?, ?, ?, ?)",
            (
                action,
                of_entry,
                name,
                database.who(),
                database.now_utc(),
                changes_of.to_text(changes),
            ),
        )
        return int(written.lastrowid or 0)

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
            )
            for row in self._connection.execute(
                f"SELECT entry_id, action, of_entry, name, who, when_utc, {changes} "
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
        raise CampaignFileError(
            f"This campaign file is damaged: line {entry_id} of its history cannot be read."
        ) from problem
