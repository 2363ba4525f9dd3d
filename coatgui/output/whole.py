"""Files written whole or not at all: beside the target, flushed, then put in its place."""

from __future__ import annotations

import os
import secrets
import shutil
from collections.abc import Callable
from contextlib import suppress
from pathlib import Path
from typing import IO


def write_whole(path: Path, writer: Callable[[IO[bytes]], object]) -> None:
    """Let `writer` fill a file that takes the place of `path` only when it is whole. Whatever goes
    wrong, a former file stays as it was and nothing is left beside it. The file may be read by
    whom the former one could, or else by whom the system lets read new files. Raises OSError, or
    what `writer` raises."""
    # A short name of its own: with the target's in it, a long one would become too long.
    partial = path.with_name(f".{secrets.token_hex(8)}.part")
    try:
        with partial.open("xb") as file:
            writer(file)
            file.flush()
            os.fsync(file.fileno())
        with suppress(FileNotFoundError):
            shutil.copymode(path, partial)
        partial.replace(path)
    except BaseException:
        partial.unlink(missing_ok=True)
        raise
