"""What single values must be like. Each raises OperationRefused, with one sentence, where one is
not."""

from __future__ import annotations

import math
from collections.abc import Iterable
from dataclasses import fields
from functools import cache
from typing import Any

from coatgui.campaign.errors import OperationRefused

LONGEST_TEXT = 20_000
"""Characters of a remark or another text. Own choice: four printed pages, and no campaign file
grows by a text pasted by mistake."""


def right_types(record: Any) -> None:
    """Texts must be texts and numbers finite numbers: SQLite would convert some others."""
    for name, kind in _typed_fields(record.__class__):
        value = getattr(record, name)
        words = name.replace("_", " ")
        if isinstance(value, str):
            no_long_texts((value,))
        if kind == "str" and not isinstance(value, str):
            raise OperationRefused(f"The {words} must be a text, not {value!r}.")
        if kind == "float" or (kind == "float | None" and value is not None):
            finite(value, f"The {words}")


@cache
def _typed_fields(kind: type) -> tuple[tuple[str, str], ...]:
    """The fields of a record, each with "str", "float", "float | None", …"""
    return tuple((f.name, getattr(f.type, "__name__", str(f.type))) for f in fields(kind))


def no_long_texts(values: Iterable[Any]) -> None:
    for value in values:
        if isinstance(value, str) and len(value) > LONGEST_TEXT:
            raise OperationRefused(
                f"A text of {len(value)} characters is too long: {LONGEST_TEXT} are kept at most. "
                f"It begins “{value[:40]}”."
            )


def named(name: str, what: str, fact: str = "name") -> None:
    if not name.strip():
        raise OperationRefused(f"{what} needs a {fact} that is not empty.")


def finite(value: Any, what: str) -> float:
    if isinstance(value, bool) or not isinstance(value, int | float) or not math.isfinite(value):
        raise OperationRefused(f"{what} must be a number, not {value!r}.")
    return value


def positive(value: float | None, what: str) -> None:
    if value is not None and finite(value, what) <= 0:
        raise OperationRefused(f"{what} must be greater than 0, not {value:g}.")


def not_negative(value: float, what: str) -> None:
    if finite(value, what) < 0:
        raise OperationRefused(f"{what} must be 0 or more, not {value:g}.")
