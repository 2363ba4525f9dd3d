"""Where the program keeps what belongs to the person at the computer, and not to a campaign."""

from __future__ import annotations

import os
import sys
from pathlib import Path

_NAME = "coatgui"


def user_data_folder() -> Path:
    """The folder for reports, notes on sessions and the log: `COATGUI_DATA` where that is set, else
    what the system provides for. It need not exist."""
    told = os.environ.get("COATGUI_DATA")
    if told:
        return Path(told)
    if sys.platform == "win32":
        local = os.environ.get("LOCALAPPDATA")
        return (Path(local) if local else Path.home() / "AppData" / "Local") / _NAME
    if sys.platform == "darwin":
        return Path.home() / "Library" / "Application Support" / _NAME
    shared = os.environ.get("XDG_DATA_HOME")
    # A relative path there is to be ignored (XDG Base Directory Specification).
    home = Path(shared) if shared and Path(shared).is_absolute() else Path.home() / ".local/share"
    return home / _NAME
