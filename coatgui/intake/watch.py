"""A folder that is watched while a campaign runs: which files are new, and written to the end."""

from __future__ import annotations

import time
from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path

from coatgui.intake.folder import UnreadableFolder, files_in

QUIET_S = 5.0
"""How long a file must not have changed before it is taken for whole. Own choice: instruments that
write while they measure add a point every few seconds at high frequencies; at low ones they may
pause for minutes, and then a spectrum that grew is proposed again as a corrected export."""


@dataclass(frozen=True, slots=True)
class _Seen:
    size: int
    changed_ns: int
    since_s: float


class FolderWatch:
    """Ask `settled` now and then; it never waits and never reads a file's content.

    Files that are there at the start are taken as known where `known_now`.
    """

    def __init__(
        self,
        folder: Path,
        *,
        known_now: bool = True,
        quiet_s: float = QUIET_S,
        clock: Callable[[], float] = time.monotonic,
    ) -> None:
        self._folder, self._quiet_s, self._clock = folder, quiet_s, clock
        self._seen: dict[Path, _Seen] = {}
        self._told: dict[Path, tuple[int, int]] = {}
        if known_now:
            self._told = {path: (s.size, s.changed_ns) for path, s in self._look().items()}

    def settled(self) -> tuple[Path, ...]:
        """Files that are new, or have changed, since they were last named here, and have rested
        for a while; each is named once for each state. A folder that is away for the moment, such
        as a network drive, has none."""
        now = self._look()
        result = []
        for path, seen in now.items():
            state = (seen.size, seen.changed_ns)
            if self._told.get(path) == state or not seen.size:
                continue
            if self._clock() - seen.since_s >= self._quiet_s:
                self._told[path] = state
                result.append(path)
        self._seen = now
        return tuple(result)

    def _look(self) -> dict[Path, _Seen]:
        """Size and time of change of every file, and since when they have been so."""
        found = {}
        try:
            for path in files_in(self._folder):
                try:
                    status = path.stat()
                except OSError:
                    continue  # it went away meanwhile
                before = self._seen.get(path)
                same = before is not None and (before.size, before.changed_ns) == (
                    status.st_size,
                    status.st_mtime_ns,
                )
                since = before.since_s if before is not None and same else self._clock()
                found[path] = _Seen(status.st_size, status.st_mtime_ns, since)
        except (UnreadableFolder, OSError):
            return dict(self._seen)
        return found
