"""Panel and exposure time from a file's name: `<panel>_<time><h|d>.<ext>`."""

from __future__ import annotations

import re
from pathlib import PurePosixPath

_NAME = re.compile(r"^(?P<panel>.+)_(?P<time>\d+(?:[.,]\d+)?)(?P<unit>[hd])$", re.IGNORECASE)


def panel_and_hours(file: str) -> tuple[str, float] | None:
    """Panel and exposure time in hours, or None where the name does not say."""
    found = _NAME.match(PurePosixPath(file).stem)
    if not found:
        return None
    time = float(found["time"].replace(",", "."))
    return found["panel"], time * (24.0 if found["unit"].lower() == "d" else 1.0)
