"""Rows into the tables: a whole new file, or single rows of a change, each against what is there.

Every function says by how much the state of the file (see `seal`) grows.
"""

from __future__ import annotations

import hashlib
import sqlite3
from collections.abc import Iterable, Mapping
from pathlib import Path
from typing import Any

from coatgui.campaign import connection as database
from coatgui.campaign import rows, rules, schema, seal
from coatgui.campaign.changes import Row, RowChange
from coatgui.campaign.errors import CampaignFileError, OperationRefused
from coatgui.campaign.trail import Trail
from coatgui.records import Campaign, Spectrum


def fill(path: Path, campaign: Campaign, raw: Mapping[str, bytes], name: str) -> None:
    """Write a campaign to a new file, with `name` as the first line of its history."""
    connection = database.connect_new(path)
    try:
        schema.migrate(connection)
        with database.transaction(connection):
            keep_spectra(connection, rules.all_spectra(campaign))
            keep_raw(connection, raw)
            for table, row in rules.all_rows(campaign):
                insert(connection, table, row)
            state = seal.state_of(connection, schema.KEYS)
            Trail(connection, is_new=True).write("create", None, name, (), state)
    finally:
        connection.close()


def keep_spectra(connection: sqlite3.Connection, spectra: Iterable[Spectrum]) -> int:
    grown = 0
    for spectrum in spectra:
        row = rows.spectrum_row(spectrum)
        kept = connection.execute(
            "INSERT OR IGNORE INTO spectra VALUES "
            "(:spectrum_id, :frequency_hz, :real_ohm, :imaginary_ohm)",
            dict(row),
        )
        if kept.rowcount:
            grown += seal.content_digest("spectra", str(row["spectrum_id"]))
    return grown


def keep_raw(connection: sqlite3.Connection, raw: Mapping[str, bytes]) -> int:
    grown = 0
    for sha256, content in raw.items():
        if hashlib.sha256(content).hexdigest() != sha256:
            raise CampaignFileError("The bytes of an imported file do not fit their SHA-256.")
        kept = connection.execute(
            "INSERT OR IGNORE INTO raw_files VALUES (?, ?)", (sha256, content)
        )
        if kept.rowcount:
            grown += seal.content_digest("raw_files", sha256)
    return grown


def change_rows(
    connection: sqlite3.Connection, changes: Iterable[RowChange]
) -> tuple[tuple[RowChange, ...], int]:
    """Change rows. Returns the changes with all that their inverses need, and by how much the state
    grows where all rows that are there afterwards count nothing: add theirs."""
    lost: dict[tuple[str, str], int] = {}
    done = []
    for change in changes:
        made, present = _change_row(connection, change)
        done.append(made)
        was = 0 if present is None else seal.row_digest(change.table, dict(present))
        lost.setdefault((change.table, change.key), was)
    return tuple(done), -sum(lost.values())


def _change_row(
    connection: sqlite3.Connection, change: RowChange
) -> tuple[RowChange, sqlite3.Row | None]:
    """Change one row. Returns the change with all that its inverse needs, the place of a row that
    goes away, and the row as it was."""
    _refuse_unknown_names(change)
    table, key = change.table, change.key
    is_key = f"{schema.KEYS[table]} = ?"
    present = connection.execute(f"SELECT * FROM {table} WHERE {is_key}", (key,)).fetchone()
    if change.before is None:
        if present is not None or change.after is None:
            raise OperationRefused(f"This is already in the campaign's {_words(table)}.")
        if change.after.get(schema.KEYS[table]) != key:
            raise OperationRefused("A new row does not carry the key that it goes by.")
        insert(connection, table, change.after)
        return change, None
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
        whole = dict(zip(present.keys(), present, strict=True))
        return RowChange(table, key, whole, None), present
    settings = ", ".join(f"{column} = ?" for column in change.after)
    connection.execute(
        f"UPDATE {table} SET {settings} WHERE {is_key}", (*change.after.values(), key)
    )
    return change, present


def insert(connection: sqlite3.Connection, table: str, row: Row) -> None:
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
