"""Is a campaign file sound? Everything that can be verified is, and nothing is changed."""

from __future__ import annotations

import hashlib
import sqlite3
from collections.abc import Iterator
from contextlib import closing, suppress
from pathlib import Path

from coatgui.campaign import changes as changes_of
from coatgui.campaign import connection as database
from coatgui.campaign import schema, seal
from coatgui.campaign.errors import CampaignFileError
from coatgui.campaign.snapshot import Snapshot, read_spectra, record_of
from coatgui.campaign.trail import Trail
from coatgui.records import Spectrum


def check_file(path: Path) -> tuple[str, ...]:
    """What is wrong with a campaign file, one sentence each; empty where it is sound.

    Structure, SQLite's own integrity, references, hashes of raw files and spectra, every record
    and every line of the history are verified. A file that is no campaign at all, is too new or
    cannot be read gives the one sentence that says so.
    """
    try:
        connection = database.connect(path)
    except CampaignFileError as problem:
        return (str(problem),)
    try:
        with database.plain_words(path):
            return tuple(_on_one_line(said) for said in _problems(connection))
    except CampaignFileError as problem:
        return (str(problem),)
    finally:
        database.disconnect(connection, path)


def _on_one_line(said: str) -> str:
    """A sentence may name what stands in a damaged file: anything, line ends and the like too."""
    return "".join(
        letter if letter.isprintable() else "\N{REPLACEMENT CHARACTER}" for letter in said
    )


def _problems(connection: sqlite3.Connection) -> Iterator[str]:
    structure = schema.unexpected_structure(connection)
    if structure:
        # Queries on tables that are not ours could mean anything.
        yield from structure
        return
    for (said,) in connection.execute("PRAGMA integrity_check"):
        if said != "ok":
            yield f"SQLite finds the file damaged: {' '.join(str(said).split())}."
    for table, row, target, _ in connection.execute("PRAGMA foreign_key_check"):
        yield f"Row {row} of {table} refers to a row of {target} that is missing."
    yield from _raw_problems(connection)
    found = schema.version(connection)
    if found == len(schema.MIGRATIONS):
        yield from _content_problems(connection)
        return
    if found >= schema.SEALED_FROM:
        yield from _seal_problems(connection, None)
    # The records of an older version are read after bringing a copy up to date.
    with closing(sqlite3.connect(":memory:", isolation_level=None)) as copy:
        copy.row_factory = sqlite3.Row
        connection.backup(copy)
        schema.migrate(copy)
        yield from _content_problems(copy)


def _raw_problems(connection: sqlite3.Connection) -> Iterator[str]:
    for sha256, content in connection.execute("SELECT sha256, bytes FROM raw_files"):
        if not isinstance(content, bytes) or hashlib.sha256(content).hexdigest() != sha256:
            yield f"The stored bytes of an imported file are not what its SHA-256 {sha256} says."
    for table in ("readings", "open_lead"):
        for (file,) in connection.execute(
            f"SELECT DISTINCT file FROM {table} WHERE sha256 IS NOT NULL "
            "AND sha256 NOT IN (SELECT sha256 FROM raw_files)"
        ):
            yield f"The bytes of {file}, which {table.replace('_', '-')} came from, are missing."


def _seal_problems(connection: sqlite3.Connection, snapshot: Snapshot | None) -> Iterator[str]:
    """Whether the trail is whole and what the file holds is what the trail says. `snapshot` is of
    all its rows, where they could be read."""
    line = seal.broken_link(connection)
    if line is not None:
        yield f"Line {line} of the history, or one before it, was altered, taken out or put in."
    row = connection.execute(
        "SELECT entry_id, state FROM history ORDER BY entry_id DESC LIMIT 1"
    ).fetchone()
    if row is None:
        yield "The history is missing."
    elif _state(connection, snapshot) != row["state"]:
        yield (
            f"What the file holds is not what line {row['entry_id']} of its history says of it: "
            "something was changed from outside."
        )
    if row is not None:
        last = connection.execute("SELECT seq FROM sqlite_sequence WHERE name = 'history'")
        if [seq for (seq,) in last] != [row["entry_id"]]:
            yield "Lines at the end of the history are missing."
    for key, result, sha256 in connection.execute("SELECT * FROM cached_results"):
        if not sha256 or seal.result_hash(key, result) != sha256:
            yield f"The kept result {str(key)[:12]}… was altered; it will be computed again."


def _state(connection: sqlite3.Connection, snapshot: Snapshot | None) -> str:
    if snapshot is not None:
        return seal.state_text(snapshot.total + seal.content_total(connection))
    # A database of an older version does not have all tables.
    present = {row[0] for row in connection.execute("SELECT name FROM sqlite_schema")}
    return seal.state_of(connection, [table for table in schema.KEYS if table in present])


def _content_problems(connection: sqlite3.Connection) -> Iterator[str]:
    spectra, unreadable = _spectra(connection)
    snapshot = None
    # All at once is quicker; where that fails, one by one tells which.
    with suppress(CampaignFileError):
        snapshot = Snapshot(connection, spectra)
    yield from _seal_problems(connection, snapshot)
    yield from unreadable
    if snapshot is None:
        yield from _row_problems(connection, spectra)
    yield from _trail_problems(connection)


def _spectra(connection: sqlite3.Connection) -> tuple[dict[str, Spectrum], list[str]]:
    """The spectra that can be read, also those that no reading has any more, by their ids, and
    sentences on the others."""
    spectra: dict[str, Spectrum] = {}
    problems = []
    with suppress(CampaignFileError):
        spectra = read_spectra(connection)
    for (spectrum_id,) in connection.execute("SELECT spectrum_id FROM spectra").fetchall():
        if spectrum_id in spectra:
            continue
        try:
            spectra.update(read_spectra(connection, spectrum_id))
        except CampaignFileError as problem:
            problems.append(str(problem))
    return spectra, problems


def _row_problems(connection: sqlite3.Connection, spectra: dict[str, Spectrum]) -> Iterator[str]:
    readable = True
    for table in schema.ORDERED:
        for row in connection.execute(f"SELECT * FROM {table}"):
            try:
                record_of(table, row, spectra)
            except CampaignFileError as problem:
                readable = False
                yield str(problem)
    if readable:
        try:
            Snapshot(connection, spectra)
        except CampaignFileError as problem:
            yield str(problem)


def _trail_problems(connection: sqlite3.Connection) -> Iterator[str]:
    for entry_id, changes in connection.execute("SELECT entry_id, changes FROM history"):
        try:
            changes_of.from_text(changes)
        except ValueError:
            yield f"Line {entry_id} of the history cannot be read."
    try:
        Trail(connection)
    except CampaignFileError as problem:
        yield str(problem)
