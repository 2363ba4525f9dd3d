"""Opening, checking and one edit of a campaign file beside plain SQLite doing the same.

    PYTHONPATH=.:tests/benchmarks python tests/benchmarks/campaign.py [SPECTRA]

Plain SQLite has the same settings and does the same reads and writes: the page check, every row of
the same tables, the numbers of the spectra as arrays, their SHA-256; for the check the integrity
and foreign-key checks and the bytes with their hashes; for the edit the row and a line of history
of the same size in one transaction, in a copy of the same file. Alternating; opening and checking
the best of several runs by the time of the processor, as the machine may be busy; edits the median
of 300 by the clock, as most of an edit is waiting for the disk. The printed figure is the ratio.
"""

from __future__ import annotations

import hashlib
import json
import sqlite3
import statistics
import sys
import tempfile
import time
from collections.abc import Callable
from contextlib import closing
from pathlib import Path

import numpy as np

from coatgui.campaign import (
    CampaignFile,
    Operation,
    campaign_from_found,
    check_file,
    operations,
    schema,
)
from coatgui.records import Found, FoundPanel, FoundReading, Source, Spectrum

_TABLES = tuple(schema.KEYS)


def make(path: Path, spectra: int) -> None:
    frequency = np.logspace(5, -2, 60)
    random = np.random.default_rng(1)
    readings, raw = [], {}
    for number in range(spectra):
        z = 1e3 + 1e9 / (1 + 2j * np.pi * frequency * random.uniform(0.1, 1))
        z *= 1 + 0.01 * random.normal(size=60)
        content = (
            "\n".join(
                f"{f:.5e};{v.real:.5e};{v.imag:.5e}" for f, v in zip(frequency, z, strict=True)
            )
        ).encode()
        sha256 = hashlib.sha256(content).hexdigest()
        raw[sha256] = content
        source = Source(f"P{number % 200}_{number // 200}h.csv", sha256)
        readings.append(
            FoundReading(Spectrum(frequency, z), source, f"P{number % 200}", number // 200)
        )
    panels = tuple(FoundPanel(f"P{k}", f"F{k // 10}", 10.0, 60.0) for k in range(200))
    found = Found(panels, tuple(readings), None, (), raw)
    CampaignFile.create(path, campaign_from_found(found, "Large"), raw).close()


def plain(path: Path) -> sqlite3.Connection:
    connection = sqlite3.connect(path, isolation_level=None)
    for setting in ("trusted_schema = OFF", "cell_size_check = ON", "foreign_keys = ON"):
        connection.execute(f"PRAGMA {setting}")
    connection.execute("PRAGMA synchronous = FULL")
    return connection


def plain_spectra(connection: sqlite3.Connection) -> None:
    for key, *texts in connection.execute(
        "SELECT spectrum_id, frequency_hz, real_ohm, imaginary_ohm FROM spectra"
    ):
        frequency, real, imaginary = (np.array(json.loads(text)) for text in texts)
        digest = hashlib.sha256(frequency.tobytes() + (real + 1j * imaginary).tobytes())
        assert digest.hexdigest() == key


def plain_open(path: Path, *, numbers: bool = True) -> None:
    with closing(plain(path)) as connection:
        connection.execute("PRAGMA quick_check").fetchall()
        for table in (*_TABLES, "history"):
            connection.execute(f"SELECT * FROM {table}").fetchall()
        connection.execute("SELECT spectrum_id FROM spectra").fetchall()
        connection.execute("SELECT sha256 FROM raw_files").fetchall()
        if numbers:
            plain_spectra(connection)
        else:
            connection.execute("SELECT * FROM spectra").fetchall()


def plain_check(path: Path) -> None:
    with closing(plain(path)) as connection:
        connection.execute("PRAGMA integrity_check").fetchall()
        connection.execute("PRAGMA foreign_key_check").fetchall()
        for table in (*_TABLES, "history", "cached_results"):
            connection.execute(f"SELECT * FROM {table}").fetchall()
        for sha256, content in connection.execute("SELECT sha256, bytes FROM raw_files"):
            assert hashlib.sha256(content).hexdigest() == sha256
        plain_spectra(connection)


def best(times: int, *works: Callable[[], object]) -> list[float]:
    took = [[] for _ in works]  # type: list[list[float]]
    for _ in range(times):
        for number, work in enumerate(works):
            began = time.process_time()
            work()
            took[number].append(time.process_time() - began)
    return [min(t) for t in took]


def main(spectra: int) -> None:
    with tempfile.TemporaryDirectory() as place:
        path = Path(place) / "large.coatgui"
        make(path, spectra)
        print(f"{spectra} spectra, {path.stat().st_size / 1e6:.0f} MB")
        ours, rows_only, same = best(
            2,
            lambda: CampaignFile.open(path).close(),
            lambda: plain_open(path, numbers=False),
            lambda: plain_open(path),
        )
        print(f"open  {ours:.2f} s, plain {same:.2f} s: {ours / same:.2f} times", end="")
        print(f" (plain without making numbers of the texts: {rows_only:.2f} s)")
        ours, same = best(2, lambda: check_file(path), lambda: plain_check(path))
        print(f"check {ours:.2f} s, plain {same:.2f} s: {ours / same:.2f} times")
        assert check_file(path) == ()
        edits(path)


def edits(path: Path) -> None:
    """Edits of a panel and of a reading; plain SQLite makes them in a copy of the same file."""
    with CampaignFile.open(path) as file:
        file.save_copy(path.with_name("copy.coatgui"))
        panel = file.campaign.panels[3].panel_id
        reading = file.campaign.readings[len(file.campaign.readings) // 2].reading_id
        cases = (
            ("panels", "panel_id", panel, "area_cm2", operations.edit_panel),
            ("readings", "reading_id", reading, "potential_mv", operations.edit_reading),
        )
        with closing(plain(path.with_name("copy.coatgui"))) as other:
            for case in cases:
                _edit(file, other, *case)


def _edit(
    file: CampaignFile,
    other: sqlite3.Connection,
    table: str,
    key: str,
    identity: str,
    column: str,
    make: Callable[..., Operation],
) -> None:
    state = {"value": 10.0}

    def ours() -> None:
        state["value"] += 0.5
        file.apply(make(file.campaign, identity, **{column: state["value"]}))

    def same() -> None:
        other.execute("BEGIN IMMEDIATE")
        other.execute(f"SELECT * FROM {table} WHERE {key} = ?", (identity,)).fetchone()
        other.execute(
            f"UPDATE {table} SET {column} = ? WHERE {key} = ?", (state["value"], identity)
        )
        other.execute(
            "INSERT INTO history (action, name, who, when_utc, changes, reason, state, chain) "
            "VALUES ('edit', ?, 'somebody', '2026-01-01T00:00:00Z', ?, '', ?, ?)",
            ("x" * 24, "x" * 130, "x" * 64, "x" * 64),
        )
        other.execute("COMMIT")

    took: tuple[list[float], list[float]] = ([], [])
    for _ in range(300):
        for work, times in zip((ours, same), took, strict=True):
            began = time.perf_counter()
            work()
            times.append(time.perf_counter() - began)
    one, plain_one = (statistics.median(times) for times in took)
    least, plain_least = (min(times) for times in took)
    print(
        f"edit of {table}  {one * 1e3:.2f} ms, plain {plain_one * 1e3:.2f} ms: "
        f"{one / plain_one:.2f} times (at best {least * 1e3:.2f} and {plain_least * 1e3:.2f} ms)"
    )


if __name__ == "__main__":
    main(int(sys.argv[1]) if len(sys.argv) > 1 else 10_000)
