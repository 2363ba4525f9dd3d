"""Hashes by which the audit trail and the rows of a campaign file hold each other.

Every line of the trail carries `state`, a digest of all that the file holds after that line, and
`chain`, the SHA-256 of the line itself, its `state` and the `chain` of the line before it. A line
that is altered, taken out or put in breaks the chain from there on; a row that is altered from
outside no longer fits the state of the last line. There is no secret in it: whoever computes all
of it anew can forge a file, and only a copy or a printed hash kept elsewhere shows that.

The state is the sum, modulo 2^256, of the SHA-256 of every row. A sum needs no order and can be
carried on by the rows that a change touches, so an edit of a large campaign stays cheap.
"""

from __future__ import annotations

import hashlib
import json
import sqlite3
from collections.abc import Iterable, Mapping
from typing import Any

_MODULUS = 1 << 256
# Tables whose rows are stored under the SHA-256 of their content: the key says it all.
BY_CONTENT = {"spectra": "spectrum_id", "raw_files": "sha256"}
BEFORE_THE_FIRST = ""

_LINE = "entry_id, action, of_entry, name, who, when_utc, reason, changes, state"


# Made once: `json.dumps` makes one for every row.
_told = json.JSONEncoder(ensure_ascii=False, default=repr).encode


def row_digest(table: str, row: Mapping[str, Any]) -> int:
    """The part that one row has in the state; `row` holds all its columns."""
    return _number(_told([table, *sorted(row.items())]))


def content_digest(table: str, key: str) -> int:
    """The part that a row of one of the tables `BY_CONTENT` has in the state: the same as of a row
    with this one column."""
    return _number(f'["{table}", ["{BY_CONTENT[table]}", {_told(key)}]]')


def _number(told: str) -> int:
    return int.from_bytes(hashlib.sha256(told.encode("utf-8", "surrogatepass")).digest())


def content_total(connection: sqlite3.Connection) -> int:
    """The sum of the parts of all spectra and raw files."""
    return sum(
        content_digest(table, key)
        for table, column in BY_CONTENT.items()
        for (key,) in connection.execute(f"SELECT {column} FROM {table}")
    )


def rows_total(connection: sqlite3.Connection, tables: Iterable[str]) -> int:
    """The sum of the parts of all rows of these tables."""
    total = 0
    for table in tables:
        found = connection.execute(f"SELECT * FROM {table}")
        names = [column[0] for column in found.description]
        total += sum(row_digest(table, dict(zip(names, row, strict=True))) for row in found)
    return total


def state_text(total: int) -> str:
    """The sum as the trail writes it."""
    return f"{total % _MODULUS:064x}"


def state_of(connection: sqlite3.Connection, tables: Iterable[str]) -> str:
    """The state of a file, from all its rows."""
    return state_text(rows_total(connection, tables) + content_total(connection))


def link(before: str, line: Iterable[Any]) -> str:
    """The chain hash of a line, from that of the line before and the cells from `entry_id` to
    `state`. Every cell goes in with its length, so that none can run into the next."""
    digest = hashlib.sha256(before.encode("ascii", "replace"))
    for cell in line:
        told = b"" if cell is None else str(cell).encode("utf-8", "surrogatepass")
        digest.update(b"%d:" % len(told))
        digest.update(told)
    return digest.hexdigest()


def result_hash(key: str, result: Any) -> str:
    """What is kept with a cached result, to see that it is still what was kept."""
    if not isinstance(result, bytes):  # in a damaged file
        return ""
    return hashlib.sha256(str(key).encode("utf-8") + b":" + result).hexdigest()


def broken_link(connection: sqlite3.Connection) -> int | None:
    """The first line of the trail whose chain hash is wrong, None where all are right."""
    before = BEFORE_THE_FIRST
    for *line, chain in connection.execute(f"SELECT {_LINE}, chain FROM history ORDER BY entry_id"):
        if link(before, line) != chain:
            return int(line[0])
        before = chain
    return None


def seal_again(connection: sqlite3.Connection, tables: Iterable[str]) -> None:
    """Inside a migration: lines without a hash get theirs, and the last line the state of the rows
    as they are now."""
    entries = connection.execute(f"SELECT {_LINE}, chain FROM history ORDER BY entry_id")
    before = BEFORE_THE_FIRST
    lines = entries.fetchall()
    for number, (*line, chain) in enumerate(lines):
        last = number == len(lines) - 1
        if last:
            line[-1] = state_of(connection, tables)
        if last or not chain:
            chain = link(before, line)
            connection.execute(
                "UPDATE history SET state = ?, chain = ? WHERE entry_id = ?",
                (line[-1], chain, line[0]),
            )
        before = chain
