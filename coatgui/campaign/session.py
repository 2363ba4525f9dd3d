"""Notes on sessions, so that the next start can offer to go on where a crash ended one.

Every running window has a note of its own, which goes away when it is closed in order. The note is
locked by the system while the program lives, so one that nobody locks is left from a crash. Edits
are not in it: each is in the campaign file as soon as it is made.
"""

from __future__ import annotations

import json
import os
import secrets
from contextlib import suppress
from dataclasses import dataclass
from pathlib import Path

from coatgui.campaign import connection as database
from coatgui.campaign import lock
from coatgui.campaign.user_data import user_data_folder

_ENDING = ".session"
_LONGEST = 100_000


@dataclass(frozen=True, slots=True)
class Unfinished:
    """A session that was not closed. `campaign` is the file that was open; `is_unsaved` says that
    it lay in a temporary place and was never given a name by a person; `reading_id` and `place` are
    where the window stood."""

    note: Path
    campaign: Path
    is_unsaved: bool
    reading_id: str
    place: str
    since_utc: str

    def forget(self) -> None:
        """The person has decided: do not offer it again."""
        with suppress(OSError):
            self.note.unlink()


class Session:
    """The note of this window. Nothing here raises: a note that cannot be written is none."""

    def __init__(self, folder: Path | None = None) -> None:
        self._folder = folder or user_data_folder() / "sessions"
        self._path = self._folder / f"{os.getpid()}-{secrets.token_hex(4)}{_ENDING}"
        self._lock: lock.WriteLock | None = None
        self._since = database.now_utc()
        with suppress(OSError, lock.InUse):
            self._folder.mkdir(parents=True, exist_ok=True)
            self._lock = lock.take(self._path)

    def note(
        self,
        campaign: Path | None,
        *,
        is_unsaved: bool = False,
        reading_id: str = "",
        place: str = "",
    ) -> None:
        """Say what is open now; None where nothing is."""
        if campaign is None:
            with suppress(OSError):
                self._path.unlink(missing_ok=True)
            return
        told = {
            "campaign": str(campaign.absolute()),
            "is_unsaved": is_unsaved,
            "reading_id": reading_id,
            "place": place,
            "since_utc": self._since,
        }
        beside = self._path.with_suffix(".part")
        with suppress(OSError):
            beside.write_text(json.dumps(told), encoding="utf-8")
            beside.replace(self._path)

    def end(self) -> None:
        """The window is closed in order."""
        with suppress(OSError):
            self._path.unlink(missing_ok=True)
        if self._lock is not None:
            self._lock.release()


def unfinished_sessions(folder: Path | None = None) -> tuple[Unfinished, ...]:
    """Sessions that a crash ended and whose campaign is still there, newest first."""
    place = folder or user_data_folder() / "sessions"
    found = []
    with suppress(OSError):
        for note in place.glob(f"*{_ENDING}"):
            one = _left_behind(note)
            if one is not None:
                found.append(one)
    return tuple(sorted(found, key=lambda one: one.since_utc, reverse=True))


def _left_behind(note: Path) -> Unfinished | None:
    try:
        lock.take(note).release()
    except (lock.InUse, OSError):
        return None  # its window is open
    try:
        if note.stat().st_size > _LONGEST:
            raise ValueError("This is no note.")
        told = json.loads(note.read_text(encoding="utf-8"))
        one = Unfinished(
            note,
            Path(str(told["campaign"])),
            bool(told["is_unsaved"]),
            str(told["reading_id"]),
            str(told["place"]),
            str(told["since_utc"]),
        )
    except (OSError, ValueError, KeyError, TypeError, RecursionError):
        with suppress(OSError):
            note.unlink()
        return None
    if not one.campaign.is_file():
        one.forget()
        return None
    return one
