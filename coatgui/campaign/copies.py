"""Rolling copies of a campaign file, made while it is open and kept by their age.

Of the last day every copy stays, of the last two weeks one a day, of the last three months one a
week, from before one a month. A copy is made with SQLite's backup interface a piece at a time, so
that edits can go on meanwhile, written under another name and renamed when it is whole.
"""

from __future__ import annotations

import hashlib
import shutil
import sqlite3
import threading
import time
from collections.abc import Iterable
from contextlib import closing, suppress
from dataclasses import replace
from datetime import UTC, datetime, timedelta
from pathlib import Path

from coatgui.campaign import connection as database
from coatgui.campaign import writing
from coatgui.records import Campaign

FOLDER_ENDING = " copies"
_PAGES_AT_ONCE = 500
_STAMP = "%Y-%m-%d %H%M%S"
# Own choice: the ages up to which one copy is kept for each span of time.
_KEPT = (
    (timedelta(days=1), timedelta(0)),
    (timedelta(days=14), timedelta(days=1)),
    (timedelta(days=92), timedelta(days=7)),
    (timedelta.max, timedelta(days=30)),
)


def folder_beside(path: Path) -> Path:
    return path.with_name(path.stem + FOLDER_ENDING)


def copies_of(path: Path, folder: Path | None = None) -> tuple[tuple[datetime, Path], ...]:
    """The rolling copies of a campaign file with the times they were made, newest first."""
    place = folder or folder_beside(path)
    found = []
    with suppress(OSError):
        for copy in place.iterdir():
            made = _made(path, copy)
            if made is not None:
                found.append((made, copy))
    return tuple(sorted(found, reverse=True))


def superfluous(made: Iterable[datetime], now: datetime) -> frozenset[datetime]:
    """Those of the copies, by the times they were made, that need not be kept. Of each span the
    oldest stays, so that what is kept does not move with the clock."""
    seen: set[tuple[timedelta, int]] = set()
    unneeded = set()
    for moment in sorted(made):
        span = next(span for up_to, span in _KEPT if now - moment <= up_to)
        if not span:
            continue
        slot = (span, int(moment.timestamp() // span.total_seconds()))
        if slot in seen:
            unneeded.add(moment)
        seen.add(slot)
    return frozenset(unneeded)


def keep(
    connection: sqlite3.Connection,
    path: Path,
    folder: Path | None,
    chain: str,
    lock: threading.RLock | None = None,
    now: datetime | None = None,
) -> Path | None:
    """Make a copy and remove superfluous ones. None where the newest copy ends with the same
    line of history, known by its `chain`.
    Raises CampaignFileError or OSError."""
    place = folder or folder_beside(path)
    there = copies_of(path, place)
    if there and _chain_in(there[0][1]) == chain:
        return None
    now = now or datetime.now(UTC)
    place.mkdir(exist_ok=True)
    target = place / f"{path.stem} {now.strftime(_STAMP)}{path.suffix}"
    if target.exists():
        return None
    database.write_whole_file(
        target, lambda beside: back_up(connection, beside, lock), replace=False
    )
    old = dict(copies_of(path, place))
    for moment in superfluous(old, now):
        with suppress(OSError):
            old[moment].unlink()
    return target


def before_migration(connection: sqlite3.Connection, path: Path, version: int) -> None:
    """The copy that stays of a file before it is brought up to date."""
    target = path.with_name(f"{path.stem} (file version {version}){path.suffix}")
    if not target.exists():
        database.write_whole_file(target, lambda beside: back_up(connection, beside), replace=False)


def back_up(
    connection: sqlite3.Connection, target: Path, lock: threading.RLock | None = None
) -> None:
    """The whole database to a new file. With the caller's `lock`, others have a turn after each
    piece. Raises sqlite3.Error."""

    def give_others_a_turn(_status: int, _remaining: int, _total: int) -> None:
        if lock is not None:
            lock.release()
            time.sleep(0)
            lock.acquire()

    with closing(sqlite3.connect(target)) as copy:
        copy.execute("PRAGMA journal_mode = OFF")  # a copy that is cut off is thrown away
        connection.backup(copy, pages=_PAGES_AT_ONCE, progress=give_others_a_turn)


def copy_with_journal(path: Path, target: Path, chain: str) -> bool:
    """A copy of a file whose disk no longer lets SQLite take back a change that failed: the bytes
    are copied together with the journal, and the change is taken back in the copy. False, and no
    file, where the copy does not end with the line of history of that `chain`."""
    journal = target.with_name(f"{target.name}-journal")
    try:
        shutil.copyfile(path, target)
        with suppress(FileNotFoundError):
            shutil.copyfile(path.with_name(f"{path.name}-journal"), journal)
        if _chain_in(target) == chain:
            return True
    except OSError:
        pass
    target.unlink(missing_ok=True)
    journal.unlink(missing_ok=True)
    return False


def fill_from_memory(
    connection: sqlite3.Connection, campaign: Campaign, target: Path
) -> tuple[str, ...]:
    """A new file from the campaign in memory and those imported files that can still be read.
    Returns sentences on what is missing."""
    raw = {}
    wanted = {r.source.sha256: r.source.file for r in campaign.readings}
    wanted |= {p.sha256: p.file or "a photograph" for p in campaign.photographs}
    lost = []
    for sha256, name in wanted.items():
        content = None
        with suppress(sqlite3.Error):
            row = connection.execute(
                "SELECT bytes FROM raw_files WHERE sha256 = ?", (sha256,)
            ).fetchone()
            content = None if row is None else row[0]
        if isinstance(content, bytes) and hashlib.sha256(content).hexdigest() == sha256:
            raw[sha256] = content
        else:
            lost.append(name)
    gone = {p.sha256 for p in campaign.photographs} - raw.keys()
    kept = tuple(p for p in campaign.photographs if p.sha256 not in gone)
    writing.fill(target, replace(campaign, photographs=kept), raw, "Save what was in memory")
    missing = ["The history before this is missing: the file could no longer be read."]
    if lost:
        missing.append(f"The bytes of {len(lost)} imported files are missing, such as {lost[0]}.")
    return tuple(missing)


def _made(path: Path, copy: Path) -> datetime | None:
    if copy.suffix != path.suffix or not copy.stem.startswith(f"{path.stem} "):
        return None
    try:
        stamp = datetime.strptime(copy.stem.removeprefix(f"{path.stem} "), _STAMP)
    except ValueError:
        return None
    return stamp.replace(tzinfo=UTC)


def _chain_in(copy: Path) -> str:
    """The hash of the last line of a copy's history, "" where that cannot be read."""
    with suppress(sqlite3.Error), closing(sqlite3.connect(copy)) as connection:
        row = connection.execute(
            "SELECT chain FROM history ORDER BY entry_id DESC LIMIT 1"
        ).fetchone()
        return "" if row is None else str(row[0])
    return ""
