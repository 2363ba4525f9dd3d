"""The tables of a campaign file, how they came to be, and the test that a file has just those.

A migration is a named function that takes the file from one schema version to the next. Each runs
in one transaction together with the version number it leads to, so a file is always at a whole
version. A released migration is never edited; a change of the tables is a new one at the end. New
columns need a default, because the audit trail holds rows from before; a migration that renames a
table or column must do so in the JSON of `history.changes` too, or old edits cannot be undone.
"""

from __future__ import annotations

import sqlite3
from collections.abc import Callable
from contextlib import closing
from functools import cache

from coatgui.campaign import seal
from coatgui.campaign.errors import CampaignDamaged, CampaignTooNew

APPLICATION_ID = 0x434F4154  # "COAT"

# The tables that operations may change, each with its key column.
KEYS = {
    "campaign": "campaign_id",
    "settings": "campaign_id",
    "formulations": "formulation_id",
    "panels": "panel_id",
    "readings": "reading_id",
    "open_lead": "campaign_id",
    "refused": "refusal_id",
    "ratings": "rating_id",
    "photographs": "photograph_id",
}
# Those of them that hold several rows in an order of their own, kept in the column `place`.
ORDERED = ("formulations", "panels", "readings", "refused", "ratings", "photographs")
# From this version on the trail carries hashes.
SEALED_FROM = 3


def lay_the_first_tables(connection: sqlite3.Connection) -> None:
    for statement in _FIRST_TABLES:
        connection.execute(statement)


_FIRST_TABLES = (
    """CREATE TABLE campaign (
    campaign_id TEXT NOT NULL PRIMARY KEY,
    title TEXT NOT NULL CHECK (title <> ''),
    remark TEXT NOT NULL DEFAULT ''
) STRICT""",
    """CREATE TABLE settings (
    campaign_id TEXT NOT NULL PRIMARY KEY
        REFERENCES campaign DEFERRABLE INITIALLY DEFERRED,
    temperature_c REAL NOT NULL,
    modulus_frequencies_hz TEXT NOT NULL, -- JSON: [0.1, 0.01]
    capacitance_frequency_hz REAL NOT NULL CHECK (capacitance_frequency_hz > 0),
    mains_hz REAL NOT NULL CHECK (mains_hz > 0),
    criteria TEXT NOT NULL DEFAULT '[]', -- JSON: [{"name", "frequency_hz", "ohm_cm2", "source"}]
    thresholds TEXT NOT NULL DEFAULT '[]' -- JSON: [[name, value]]
) STRICT""",
    """CREATE TABLE formulations (
    formulation_id TEXT NOT NULL PRIMARY KEY,
    place INTEGER NOT NULL UNIQUE,
    name TEXT NOT NULL UNIQUE CHECK (name <> ''),
    remark TEXT NOT NULL DEFAULT ''
) STRICT""",
    """CREATE TABLE panels (
    panel_id TEXT NOT NULL PRIMARY KEY,
    place INTEGER NOT NULL UNIQUE,
    name TEXT NOT NULL UNIQUE CHECK (name <> ''),
    formulation_id TEXT NOT NULL
        REFERENCES formulations DEFERRABLE INITIALLY DEFERRED,
    area_cm2 REAL CHECK (area_cm2 > 0),
    thickness_um REAL CHECK (thickness_um > 0),
    substrate TEXT NOT NULL DEFAULT '',
    electrolyte TEXT NOT NULL DEFAULT '',
    temperature_c REAL,
    regime TEXT NOT NULL DEFAULT '',
    remark TEXT NOT NULL DEFAULT '',
    notes TEXT NOT NULL DEFAULT '[]' -- JSON: [[heading, text]]
) STRICT""",
    """CREATE INDEX panels_of_formulation ON panels (formulation_id)""",
    """CREATE TABLE spectra (
    spectrum_id TEXT NOT NULL PRIMARY KEY, -- SHA-256 of the numbers
    frequency_hz TEXT NOT NULL, -- JSON array, from the highest to the lowest
    real_ohm TEXT NOT NULL, -- JSON array, same order, per specimen
    imaginary_ohm TEXT NOT NULL -- JSON array, same order; negative for a capacitor
) STRICT""",
    """CREATE TABLE readings (
    reading_id TEXT NOT NULL PRIMARY KEY,
    place INTEGER NOT NULL UNIQUE,
    panel_id TEXT NOT NULL
        REFERENCES panels DEFERRABLE INITIALLY DEFERRED,
    exposure_h REAL NOT NULL CHECK (exposure_h >= 0),
    spectrum_id TEXT NOT NULL
        REFERENCES spectra DEFERRABLE INITIALLY DEFERRED,
    file TEXT NOT NULL,
    sha256 TEXT NOT NULL, -- of the bytes in raw_files
    part TEXT NOT NULL DEFAULT '',
    dialect TEXT, -- JSON: how the file's columns were read
    temperature_c REAL,
    amplitude_mv REAL,
    potential_mv REAL,
    remark TEXT NOT NULL DEFAULT '',
    left_out TEXT NOT NULL DEFAULT '[]', -- JSON: [[point, reason]], points count from 0
    kept_in TEXT NOT NULL DEFAULT '[]', -- JSON: [point]
    pinned_model TEXT NOT NULL DEFAULT '',
    overruled_because TEXT NOT NULL DEFAULT ''
) STRICT""",
    """CREATE INDEX readings_of_panel ON readings (panel_id, exposure_h)""",
    """CREATE TABLE open_lead (
    campaign_id TEXT NOT NULL PRIMARY KEY
        REFERENCES campaign DEFERRABLE INITIALLY DEFERRED,
    spectrum_id TEXT NOT NULL
        REFERENCES spectra DEFERRABLE INITIALLY DEFERRED,
    file TEXT,
    sha256 TEXT,
    part TEXT,
    dialect TEXT
) STRICT""",
    """CREATE TABLE refused (
    refusal_id TEXT NOT NULL PRIMARY KEY,
    place INTEGER NOT NULL UNIQUE,
    file TEXT NOT NULL,
    reason TEXT NOT NULL
) STRICT""",
    """CREATE TABLE raw_files (
    sha256 TEXT NOT NULL PRIMARY KEY,
    bytes BLOB NOT NULL -- the imported file, unchanged
) STRICT""",
    """CREATE TABLE history (
    entry_id INTEGER PRIMARY KEY AUTOINCREMENT,
    action TEXT NOT NULL CHECK (action IN ('create', 'edit', 'undo', 'redo')),
    of_entry INTEGER REFERENCES history,
    name TEXT NOT NULL,
    who TEXT NOT NULL,
    when_utc TEXT NOT NULL,
    changes TEXT NOT NULL -- JSON: [{"table", "key", "before", "after"}]
) STRICT""",
    """CREATE TABLE cached_results (
    result_key TEXT NOT NULL PRIMARY KEY, -- SHA-256 of all that the result was computed from
    result BLOB NOT NULL
) STRICT""",
)


def add_the_input_and_own_models(connection: sqlite3.Connection) -> None:
    for column in (
        "input_resistance_ohm REAL CHECK (input_resistance_ohm > 0)",
        "input_capacitance_f REAL CHECK (input_capacitance_f > 0)",
        "take_leads_away INTEGER NOT NULL DEFAULT 0 CHECK (take_leads_away IN (0, 1))",
        "own_models TEXT NOT NULL DEFAULT '[]'",
    ):
        connection.execute(f"ALTER TABLE settings ADD COLUMN {column}")


def seal_the_trail_and_take_what_is_seen(connection: sqlite3.Connection) -> None:
    """The trail is chained by hashes; results carry theirs; ratings, photographs, the names on a
    summary, what is asked, and what changed within a sweep have a place. `migrate` fills in the
    hashes of the lines that are there."""
    for column in ("reason", "state", "chain"):
        connection.execute(f"ALTER TABLE history ADD COLUMN {column} TEXT NOT NULL DEFAULT ''")
    # Kept results may go at any time; those from before have no hash.
    connection.execute("DELETE FROM cached_results")
    connection.execute("ALTER TABLE cached_results ADD COLUMN sha256 TEXT NOT NULL DEFAULT ''")
    for column in ("laboratory", "customer", "order_number", "author", "reviewer"):
        connection.execute(f"ALTER TABLE campaign ADD COLUMN {column} TEXT NOT NULL DEFAULT ''")
    connection.execute("ALTER TABLE campaign ADD COLUMN standards TEXT NOT NULL DEFAULT '[]'")
    for column in ("limits", "comparisons", "projections", "electrolytes", "regimes"):
        connection.execute(f"ALTER TABLE settings ADD COLUMN {column} TEXT NOT NULL DEFAULT '[]'")
    connection.execute(
        "ALTER TABLE settings ADD COLUMN uptake_from_high_frequency INTEGER NOT NULL DEFAULT 0 "
        "CHECK (uptake_from_high_frequency IN (0, 1))"
    )
    for column in (
        "temperature_low_c",
        "temperature_high_c",
        "potential_low_mv",
        "potential_high_mv",
    ):
        connection.execute(f"ALTER TABLE readings ADD COLUMN {column} REAL")
    for statement in _TABLES_OF_WHAT_IS_SEEN:
        connection.execute(statement)


_TABLES_OF_WHAT_IS_SEEN = (
    """CREATE TABLE ratings (
    rating_id TEXT NOT NULL PRIMARY KEY,
    place INTEGER NOT NULL UNIQUE,
    panel_id TEXT NOT NULL
        REFERENCES panels DEFERRABLE INITIALLY DEFERRED,
    exposure_h REAL NOT NULL CHECK (exposure_h >= 0),
    scale TEXT NOT NULL CHECK (scale <> ''), -- id of a scale in resources/ratings.toml
    grade TEXT NOT NULL CHECK (grade <> ''), -- as that scale writes it
    edition TEXT NOT NULL DEFAULT '',
    rater TEXT NOT NULL DEFAULT '',
    remark TEXT NOT NULL DEFAULT ''
) STRICT""",
    """CREATE INDEX ratings_of_panel ON ratings (panel_id, exposure_h)""",
    """CREATE TABLE photographs (
    photograph_id TEXT NOT NULL PRIMARY KEY,
    place INTEGER NOT NULL UNIQUE,
    panel_id TEXT NOT NULL
        REFERENCES panels DEFERRABLE INITIALLY DEFERRED,
    exposure_h REAL CHECK (exposure_h >= 0),
    sha256 TEXT NOT NULL -- of the bytes in raw_files
        REFERENCES raw_files DEFERRABLE INITIALLY DEFERRED,
    media_type TEXT NOT NULL CHECK (media_type IN ('image/png', 'image/jpeg')),
    caption TEXT NOT NULL DEFAULT '',
    file TEXT NOT NULL DEFAULT ''
) STRICT""",
    """CREATE INDEX photographs_of_panel ON photographs (panel_id)""",
)


MIGRATIONS: tuple[Callable[[sqlite3.Connection], None], ...] = (
    lay_the_first_tables,
    add_the_input_and_own_models,
    seal_the_trail_and_take_what_is_seen,
)


def version(connection: sqlite3.Connection) -> int:
    """The schema version of a file. Raises CampaignTooNew where this program does not know it."""
    found = int(connection.execute("PRAGMA user_version").fetchone()[0])
    if found > len(MIGRATIONS):
        raise CampaignTooNew(
            f"This campaign was saved by a newer coatgui (file version {found}, this program "
            f"knows up to {len(MIGRATIONS)}): install the newer program to open it."
        )
    if found < 0:
        raise CampaignDamaged(f"This campaign file is damaged: its version is {found}.")
    return found


def migrate(connection: sqlite3.Connection, up_to: int | None = None) -> None:
    """Bring a file (or an empty database) to the newest version, one transaction for each step.

    The connection must leave transactions to us (`isolation_level=None`).
    """
    last = len(MIGRATIONS) if up_to is None else up_to
    for step in range(version(connection), last):
        connection.execute("BEGIN IMMEDIATE")
        try:
            MIGRATIONS[step](connection)
            if step + 1 >= SEALED_FROM:
                # The rows look different now, so what the last line says of them is said anew.
                seal.seal_again(connection, KEYS)
            connection.execute(f"PRAGMA user_version = {step + 1}")
            connection.execute("COMMIT")
        except BaseException:
            connection.execute("ROLLBACK")
            raise


def unexpected_structure(connection: sqlite3.Connection) -> tuple[str, ...]:
    """Sentences on tables, columns, indexes, triggers or views that are missing, altered or not
    ours, for the version the file says it has. A file with any is not worked with: a trigger or
    view could make our own statements do something else."""
    wanted = _structure(version(connection))
    present = _read_structure(connection)
    problems = [
        f"The file holds a {kind} '{name}' that coatgui does not make."
        for kind, name in sorted(present.keys() - wanted.keys())
    ]
    problems += [
        f"The {kind} '{name}' is missing." for kind, name in sorted(wanted.keys() - present.keys())
    ]
    problems += [
        f"The {kind} '{name}' is not as coatgui makes it."
        for kind, name in sorted(wanted.keys() & present.keys())
        if wanted[kind, name] != present[kind, name]
    ]
    return tuple(problems)


@cache
def columns(table: str) -> frozenset[str]:
    """The columns of one of the tables in `KEYS`, in the newest version."""
    return frozenset(columns_in_order(table))


@cache
def columns_in_order(table: str) -> tuple[str, ...]:
    """The columns of a table in the newest version, in the order in which a row stores them."""
    with closing(sqlite3.connect(":memory:", isolation_level=None)) as model:
        migrate(model)
        return tuple(row[1] for row in model.execute(f"PRAGMA table_info({table})"))


def _structure(at_version: int) -> dict[tuple[str, str], str | None]:
    return _structure_by(MIGRATIONS, at_version)


@cache
def _structure_by(migrations: object, at_version: int) -> dict[tuple[str, str], str | None]:
    """What a sound file of that version holds, found by making one. `migrations` are named only to
    keep one answer for each set of them."""
    with closing(sqlite3.connect(":memory:", isolation_level=None)) as model:
        migrate(model, at_version)
        return _read_structure(model)


def _read_structure(connection: sqlite3.Connection) -> dict[tuple[str, str], str | None]:
    rows = connection.execute("SELECT type, name, sql FROM sqlite_schema")
    return {(str(kind), str(name)): sql for kind, name, sql in rows}
