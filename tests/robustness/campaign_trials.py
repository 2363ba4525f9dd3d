"""Damaged campaign files through check and opening: no crash, no hang, none accepted as sound.

    PYTHONPATH=. python tests/robustness/campaign_trials.py [TRIALS] [SEED]

A file counts as damaged when anything that can be read out of it (every cell of every table, and
both marks in the header) differs from the file it was made from; bytes that nothing refers to, and
the counters by which SQLite knows that a file changed, may differ. The numbers of spectra count as
numbers, to the last bit: 1930.6977288832494 and 1930.6977288832495 are one. A damaged file must
not be called sound by `check_file`, and opening it must either be refused in a sentence or give
the campaign as it was. A trial that raises anything else, or takes longer than 20 s, is a failure
and is named by its number, from which it can be made again.
"""

from __future__ import annotations

import hashlib
import json
import signal
import sqlite3
import sys
import tempfile
import traceback
from collections import Counter
from contextlib import closing, suppress
from pathlib import Path
from random import Random
from types import FrameType

import numpy as np
from mutations import mutated
from repeatable import repeatable

from coatgui.campaign import (
    CampaignFile,
    CampaignFileError,
    campaign_from_found,
    check_file,
    operations,
)
from coatgui.records import Found, FoundPanel, FoundReading, Source, Spectrum, VisualRating

PATIENCE_S = 20
_TABLES = "SELECT name FROM sqlite_schema WHERE type = 'table' ORDER BY name"


def sample(path: Path) -> None:
    """A campaign with something in every table, edits, an undo and a redo."""
    raw = {}
    readings = []
    random = np.random.default_rng(4)
    for number in range(6):
        content = f"f;re;im\n{number}".encode()
        sha256 = hashlib.sha256(content).hexdigest()
        raw[sha256] = content
        z = random.normal(size=8) + 1j * random.normal(size=8)
        spectrum = Spectrum(np.logspace(4, -1, 8), z * 1e6)
        source = Source(f"A{number % 2}_{number}h.csv", sha256)
        readings.append(FoundReading(spectrum, source, f"A{number % 2}", float(number)))
    found = Found(
        (FoundPanel("A0", "Grey", 10.0, 60.0, remark="x"), FoundPanel("A1", "Blue", 10.0)),
        tuple(readings),
        (readings[0].spectrum, readings[0].source),
        (),
        raw,
    )
    with CampaignFile.create(path, campaign_from_found(found, "Trial"), raw, replace=True) as file:
        panel, reading = file.campaign.panels[0].panel_id, file.campaign.readings[2].reading_id
        seen = VisualRating(panel, 3.0, "astm_d610", "7-G")
        file.apply(operations.add_ratings(file.campaign, [seen]))
        file.apply(operations.leave_out_points(file.campaign, reading, [1, 3], "a drop"))
        file.apply(operations.edit_panel(file.campaign, panel, area_cm2=12.5))
        file.apply(operations.identify(file.campaign, laboratory="Own", order="17"))
        file.undo()
        file.undo()
        file.redo()
        file.keep_results({"a" * 64: b"kept" * 20, "b" * 64: b"result" * 9})


def content_of(path: Path) -> str | None:
    """A digest of all that can be read out of a file; None where not all of it can be."""
    try:
        with closing(sqlite3.connect(path)) as shell:
            digest = hashlib.sha256()
            for name in ("application_id", "user_version"):
                digest.update(repr(shell.execute(f"PRAGMA {name}").fetchone()).encode())
            wanted = ["SELECT type, name, sql FROM sqlite_schema"]
            wanted += [f'SELECT * FROM "{table}"' for (table,) in shell.execute(_TABLES)]
            for select in wanted:
                rows = sorted(repr(tuple(map(_as_read, row))) for row in shell.execute(select))
                digest.update(repr(rows).encode())
            return digest.hexdigest()
    except (sqlite3.Error, UnicodeError, MemoryError):
        return None


def _as_read(cell: object) -> object:
    """A list of numbers as the numbers, bit by bit; anything else as it stands."""
    if isinstance(cell, str) and cell.startswith("["):
        with suppress(ValueError, RecursionError):
            numbers = json.loads(cell)
            if numbers and all(type(number) is float for number in numbers):
                return [number.hex() for number in numbers]
    return cell


class TooLong(Exception):
    pass


def _too_long(_signal: int, _frame: FrameType | None) -> None:
    raise TooLong


class Trials:
    def __init__(self, folder: Path, seed: int) -> None:
        self._seed = seed
        self._sound = folder / "sound.coatgui"
        self._path = folder / "damaged.coatgui"
        with repeatable():
            sample(self._sound)
        self._bytes = self._sound.read_bytes()
        self._content = content_of(self._sound)
        with CampaignFile.open(self._sound, read_only=True) as file:
            self._campaign = file.campaign

    def trial(self, number: int) -> str:
        """What became of one damaged file."""
        random = Random(f"{self._seed}/{number}")
        damaged = mutated(self._bytes, random)
        self._path.write_bytes(damaged)
        is_damaged = damaged != self._bytes and content_of(self._path) != self._content
        # SQLite may have played back a journal or the like: what counts is what was written.
        self._path.write_bytes(damaged)
        try:
            problems = check_file(self._path)
            if any("\n" in said or not said.strip() for said in problems):
                return "NO SENTENCE"
            opened = self._opens()
        except TooLong:
            return "HANG"
        except Exception:
            return f"CRASH {traceback.format_exc()}"
        finally:
            for ending in ("-journal", "-wal", "-shm", ".in-use"):
                self._path.with_name(self._path.name + ending).unlink(missing_ok=True)
        if opened == "another campaign":
            return "OPENED AS ANOTHER CAMPAIGN"
        if is_damaged and not problems:
            return "ACCEPTED"
        if not is_damaged:
            return "unharmed, sound" if not problems else "unharmed, but refused"
        return f"found, {opened}"

    def _opens(self) -> str:
        try:
            with CampaignFile.open(self._path) as file:
                return "opens as it was" if file.campaign == self._campaign else "another campaign"
        except CampaignFileError as problem:
            return "does not open" if str(problem).strip() else "NO SENTENCE"


def trials(count: int, seed: int, folder: Path) -> tuple[Counter[str], list[str]]:
    """Counts of what happened, and the failures."""
    made = Trials(folder, seed)
    counts: Counter[str] = Counter()
    failures = []
    signal.signal(signal.SIGALRM, _too_long)
    for number in range(count):
        signal.alarm(PATIENCE_S)
        what = made.trial(number)
        signal.alarm(0)
        counts[what.splitlines()[0]] += 1
        if what[:2].isupper():
            failures.append(f"trial {number}: {what}")
        if (number + 1) % 2000 == 0:
            print(f"{number + 1}: {dict(counts)}", flush=True)
    return counts, failures


if __name__ == "__main__":
    wanted = int(sys.argv[1]) if len(sys.argv) > 1 else 100_000
    with tempfile.TemporaryDirectory() as place:
        shown, wrong = trials(wanted, int(sys.argv[2]) if len(sys.argv) > 2 else 1, Path(place))
    print(f"{wanted} damaged campaign files: {dict(shown)}")
    print("\n".join(wrong[:20]))
    sys.exit(bool(wrong))
