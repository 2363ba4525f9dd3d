"""Files written whole or not at all: beside the target, flushed, then put in its place."""

from __future__ import annotations

import os
import tempfile
from collections.abc import Callable
from pathlib import Path
from typing import IO


def write_whole(path: Path, writer: Callable[[IO[bytes]], object]) -> None:
    """Let `writer` fill a file that takes the place of `path` only when it is whole. Whatever goes
    wrong, a former file stays as it was and nothing is left beside it. Raises OSError, or what
    `writer` raises."""
    handle, name = tempfile.mkstemp(prefix=f".{path.name}.", suffix=".part", dir=path.parent)
    try:
        with os.fdopen(handle, "wb") as file:
            writer(file)
            file.flush()
            os.fsync(file.fileno())
        Path(name).replace(path)
    except BaseException:
        Path(name).unlink(missing_ok=True)
        raise
