"""One writer for one campaign file: who has it, told to everybody else who opens it.

Beside the campaign lies a small file with the name of the holder, and the system holds a lock on it
for as long as the holder's process lives. So a lock left by a program that was killed is known at
once: nobody holds it. Where the system has no such locks, as on some network folders, the file
itself is the lock, and it is stale when its process on this computer has ended.
"""

from __future__ import annotations

import errno
import json
import os
import sys
from contextlib import suppress
from dataclasses import asdict, dataclass
from pathlib import Path

from coatgui.campaign import connection as database

ENDING = ".in-use"
_TRIES = 5
_NO_LOCKS_HERE = {errno.ENOLCK, errno.ENOSYS, errno.EOPNOTSUPP, errno.ENOTSUP, errno.EINVAL}
_LOCKED_BYTE = 1 << 30  # beyond what is written: on Windows a locked byte cannot be read
_LONGEST = 4096


@dataclass(frozen=True, slots=True)
class Holder:
    """Who has a campaign open for writing."""

    who: str
    computer: str
    process: int
    since_utc: str

    def __str__(self) -> str:
        since = self.since_utc.replace("T", " ").removesuffix("Z")
        return f"{self.who} on {self.computer} since {since} UTC"


UNKNOWN = Holder("somebody", "another computer", 0, "an unknown time")


class InUse(Exception):
    """Somebody else holds the lock."""

    def __init__(self, holder: Holder) -> None:
        super().__init__(str(holder))
        self.holder = holder


class WriteLock:
    """The right to write to one campaign file. Make one with `take`, give it back with `release`.

    `left_behind` names who had it before and never gave it back, as after a crash. `by_system` is
    False where the system has no locks for the place the file lies in.
    """

    def __init__(
        self, path: Path, handle: int, left_behind: Holder | None, *, by_system: bool
    ) -> None:
        self._path = path
        self._handle = handle
        self.left_behind = left_behind
        self.by_system = by_system

    def release(self) -> None:
        if self._handle < 0:
            return
        # Taken away before it is let go of, so that nobody can hold a file that is gone; Windows
        # takes no file away that is open.
        if sys.platform != "win32":
            with suppress(OSError):
                if _is_same(self._handle, self._path):
                    self._path.unlink(missing_ok=True)
        with suppress(OSError):
            os.close(self._handle)
        if sys.platform == "win32":
            with suppress(OSError):
                self._path.unlink(missing_ok=True)
        self._handle = -1


def take(campaign: Path) -> WriteLock:
    """The lock on a campaign file. Raises InUse where somebody has it, OSError where no lock can be
    made in its folder."""
    path = campaign.with_name(campaign.name + ENDING)
    for _ in range(_TRIES):
        handle, was_there = _open(path)
        try:
            try:
                by_system = _lock(handle)
            except BlockingIOError:
                raise InUse(_read(handle) or UNKNOWN) from None
            if not _is_same(handle, path):
                # It was taken away between opening and locking it.
                os.close(handle)
                continue
            left_behind = _read(handle) if was_there else None
            if not by_system and was_there and not _has_ended(left_behind):
                raise InUse(left_behind or UNKNOWN)
            _write(handle)
        except BaseException:
            with suppress(OSError):
                os.close(handle)
            raise
        return WriteLock(path, handle, left_behind, by_system=by_system)
    raise InUse(UNKNOWN)


def here() -> Holder:
    return Holder(database.who(), _computer(), os.getpid(), database.now_utc())


def _computer() -> str:
    if sys.platform == "win32":
        return os.environ.get("COMPUTERNAME", "this computer")
    return os.uname().nodename


def _open(path: Path) -> tuple[int, bool]:
    """A handle on the lock file and whether it was there."""
    flags = os.O_RDWR | os.O_CREAT | getattr(os, "O_NOFOLLOW", 0)
    try:
        return os.open(path, flags | os.O_EXCL, 0o666), False
    except FileExistsError:
        return os.open(path, flags, 0o666), True


def _lock(handle: int) -> bool:
    """Lock it; False where the system has no locks for it. Raises BlockingIOError."""
    if sys.platform == "win32":
        import msvcrt

        os.lseek(handle, _LOCKED_BYTE, os.SEEK_SET)
        try:
            msvcrt.locking(handle, msvcrt.LK_NBLCK, 1)
        except OSError as problem:
            raise BlockingIOError from problem
        return True
    import fcntl

    try:
        fcntl.flock(handle, fcntl.LOCK_EX | fcntl.LOCK_NB)
    except BlockingIOError:
        raise
    except OSError as problem:
        if problem.errno in _NO_LOCKS_HERE:
            return False
        raise
    return True


def _is_same(handle: int, path: Path) -> bool:
    try:
        there = path.stat()
    except OSError:
        return False
    mine = os.fstat(handle)
    return (there.st_dev, there.st_ino) == (mine.st_dev, mine.st_ino)


def _read(handle: int) -> Holder | None:
    """Who is named in the lock file. What stands there may be anybody's work."""
    try:
        os.lseek(handle, 0, os.SEEK_SET)
        told = json.loads(os.read(handle, _LONGEST).decode("utf-8"))
        holder = Holder(
            str(told["who"])[:80],
            str(told["computer"])[:80],
            int(told["process"]),
            str(told["since_utc"])[:20],
        )
    except (OSError, ValueError, KeyError, TypeError, RecursionError):
        return None
    return holder


def _write(handle: int) -> None:
    os.ftruncate(handle, 0)
    os.lseek(handle, 0, os.SEEK_SET)
    os.write(handle, json.dumps(asdict(here())).encode("utf-8"))


def _has_ended(holder: Holder | None) -> bool:
    """Whether the process of a holder on this computer is known to have ended."""
    if holder is None or holder.computer != _computer() or holder.process <= 0:
        return False
    try:
        os.kill(holder.process, 0)
    except ProcessLookupError:
        return True
    except OSError:
        return False
    return False
