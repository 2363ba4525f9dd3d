"""A report of an error that should not happen, and the log: local files, no measurement data.

A report holds the versions, the places in the program's code that the error went through, and what
kinds of edit came before. It holds no values, no names of panels and no message of the error, as a
message may quote what was being read. Nothing is sent anywhere.
"""

from __future__ import annotations

import json
import logging
import os
import platform
import secrets
import sqlite3
import sys
import threading
import traceback
from collections import deque
from contextlib import suppress
from datetime import UTC, datetime
from logging.handlers import RotatingFileHandler
from pathlib import Path
from typing import Any

from coatgui import __version__
from coatgui.campaign.changes import Change
from coatgui.campaign.user_data import user_data_folder

# Own choice: enough to see what led to an error, little enough to read.
_LAST_OPERATIONS = 50
_REPORTS_KEPT = 20
_LOG_BYTES = 500_000
_HEADING = "crash "

_log = logging.getLogger("coatgui")
_last: deque[str] = deque(maxlen=_LAST_OPERATIONS)
_last_lock = threading.Lock()


def note_operation(what: str, change: Change | None = None) -> None:
    """Remember what was done, for a report and the log. `what` is a word of the program's own, such
    as "undo" or "open"; of a change only the kinds of thing it touched are kept."""
    kinds = "" if change is None else " " + ", ".join(sorted(change.kinds))
    told = f"{datetime.now(UTC):%H:%M:%S} {what}{kinds}"
    with _last_lock:
        _last.append(told)
    _log.info("%s%s", what, kinds)


def write_crash_report(error: BaseException, folder: Path | None = None) -> Path | None:
    """Write a report and return its path; None where it cannot be written. Never raises: it is
    called when something has gone wrong already."""
    try:
        place = folder or user_data_folder() / "reports"
        place.mkdir(parents=True, exist_ok=True)
        with _last_lock:
            last = list(_last)
        told = {
            "coatgui": __version__,
            "python": platform.python_version(),
            "sqlite": sqlite3.sqlite_version,
            "system": f"{sys.platform} {platform.release()} {platform.machine()}",
            "when_utc": f"{datetime.now(UTC):%Y-%m-%dT%H:%M:%SZ}",
            "error": _stack(error),
            "last_operations": last,
        }
        name = f"{_HEADING}{datetime.now(UTC):%Y-%m-%d %H%M%S} {secrets.token_hex(3)}.json"
        beside = place / f"{name}.part"
        with beside.open("x", encoding="utf-8") as file:
            json.dump(told, file, indent=1)
            file.flush()
            os.fsync(file.fileno())
        beside.replace(place / name)
        for old in sorted(place.glob(f"{_HEADING}*.json"))[:-_REPORTS_KEPT]:
            with suppress(OSError):
                old.unlink()
        _log.error("%s; see the report %s", type(error).__name__, name)
        return place / name
    except Exception:
        return None


def _stack(error: BaseException) -> list[dict[str, Any]]:
    """The chain of errors, the last one first, each with the places it went through."""
    told = []
    seen: set[int] = set()
    current: BaseException | None = error
    while current is not None and id(current) not in seen:
        seen.add(id(current))
        frames = [
            f"{_plain_path(frame.filename)}:{frame.lineno} in {frame.name}"
            for frame in traceback.extract_tb(current.__traceback__)
        ]
        told.append({"kind": type(current).__name__, "places": frames})
        current = current.__cause__ or current.__context__
    return told


def _plain_path(file: str) -> str:
    """A file of the program or a library without the folders above, which name a person."""
    parts = Path(file).parts
    for start in ("coatgui", "site-packages"):
        if start in parts:
            last = len(parts) - 1 - parts[::-1].index(start)
            return "/".join(parts[last:])
    return parts[-1] if parts else ""


def start_log(folder: Path | None = None) -> Path | None:
    """Write a log from now on, in three files of limited size. Returns the newest one's path, or
    None where none can be written."""
    try:
        place = folder or user_data_folder()
        place.mkdir(parents=True, exist_ok=True)
        path = place / "log.txt"
        handler = RotatingFileHandler(path, maxBytes=_LOG_BYTES, backupCount=2, encoding="utf-8")
    except OSError:
        return None
    handler.setFormatter(logging.Formatter("%(asctime)s %(levelname)s %(message)s"))
    for old in list(_log.handlers):
        _log.removeHandler(old)
        old.close()
    _log.addHandler(handler)
    _log.setLevel(logging.INFO)
    _log.propagate = False
    _log.info("coatgui %s, %s", __version__, sys.platform)
    return path
