"""The same ids, person and time in every run, so that runs can be compared and made again."""

from __future__ import annotations

from collections.abc import Iterator
from contextlib import ExitStack, contextmanager
from random import Random
from unittest.mock import patch

from coatgui.campaign import build, connection, inspections, operations


@contextmanager
def repeatable() -> Iterator[None]:
    random = Random(7)

    def next_id() -> str:
        return f"{random.getrandbits(64):016x}"

    with ExitStack() as stack:
        for module in (build, operations, inspections):
            stack.enter_context(patch.object(module, "new_id", next_id))
        stack.enter_context(patch.object(connection, "who", lambda: "operator"))
        stack.enter_context(patch.object(connection, "now_utc", lambda: "2026-01-02T03:04:05Z"))
        yield
