"""A change to a campaign as data: rows before and after, so that every change knows its inverse."""

from __future__ import annotations

import json
from collections.abc import Iterable, Mapping
from dataclasses import dataclass, field
from typing import Any

from coatgui.records import Spectrum

Cell = str | int | float | None
Row = Mapping[str, Cell]


@dataclass(frozen=True, slots=True)
class RowChange:
    """One row of one table. `before` is None where the row is new, `after` where it goes away;
    where it stays, both hold only the columns that change."""

    table: str
    key: str
    before: Row | None
    after: Row | None

    def inverse(self) -> RowChange:
        return RowChange(self.table, self.key, self.after, self.before)


@dataclass(frozen=True, slots=True)
class Operation:
    """One thing a person does, named in words, as the rows it changes.

    `spectra` and `raw` (SHA-256 to bytes) are what the new rows refer to. They are stored under
    their content and never taken away again, so an inverse needs only the rows.
    """

    name: str
    changes: tuple[RowChange, ...]
    spectra: tuple[Spectrum, ...] = ()
    raw: Mapping[str, bytes] = field(default_factory=dict)
    reason: str = ""
    """Why, in the person's words, where a reason is asked for."""


@dataclass(frozen=True, slots=True)
class Change:
    """What an applied operation touched: `kinds` are among campaign, settings, formulations,
    panels, readings, open_lead, refused, ratings and photographs; empty where there was nothing
    to change."""

    kinds: frozenset[str]
    name: str


@dataclass(frozen=True, slots=True)
class HistoryEntry:
    """One line of the audit trail.

    `action` is create, edit, undo or redo; an undo or redo names in `of_entry` the edit it is
    about. `state` says how an edit stands today: done, undone (redo brings it back) or abandoned
    (undone, and then something else was done instead); it is empty for the other actions.
    """

    entry_id: int
    action: str
    of_entry: int | None
    name: str
    who: str
    when_utc: str
    changes: tuple[RowChange, ...]
    state: str
    reason: str = ""
    chain: str = ""
    """The hash that this line and all before it lead to, see `seal`."""


def inverse(changes: Iterable[RowChange]) -> tuple[RowChange, ...]:
    """The changes that take these back, last one first."""
    return tuple(change.inverse() for change in reversed(tuple(changes)))


# Made once: `json.dumps` makes one for every call.
_written = json.JSONEncoder(ensure_ascii=False, allow_nan=False).encode


def to_text(changes: Iterable[RowChange]) -> str:
    """The changes as the JSON text of the column history.changes."""
    return _written(
        [{"table": c.table, "key": c.key, "before": c.before, "after": c.after} for c in changes]
    )


def from_text(text: str) -> tuple[RowChange, ...]:
    """The inverse of `to_text`. Raises ValueError where the text is something else."""
    try:
        return tuple(
            RowChange(_text(c["table"]), _text(c["key"]), _row(c["before"]), _row(c["after"]))
            for c in json.loads(text)
        )
    except (KeyError, TypeError, RecursionError) as problem:
        raise ValueError("This is not a list of row changes.") from problem


def _text(value: Any) -> str:
    if not isinstance(value, str):
        raise TypeError(value)
    return value


def _row(value: Any) -> Row | None:
    if value is None:
        return None
    if not (isinstance(value, dict) and all(isinstance(v, Cell) for v in value.values())):
        raise TypeError(value)
    return value
