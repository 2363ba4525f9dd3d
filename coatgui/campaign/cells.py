"""What stands in a cell, written and read with its type checked."""

from __future__ import annotations

import json
import math
from typing import Any

UNREADABLE = (ValueError, TypeError, KeyError, OverflowError, RecursionError)
"""What reading raises where a cell or row is not as we write it."""


# Made once: `json.dumps` makes one for every call.
_written = json.JSONEncoder(ensure_ascii=False, allow_nan=False).encode


def to_json(value: Any) -> str:
    """Raises ValueError where a number is not finite."""
    return "[]" if value == () else _written(value)


def as_float(value: float | None) -> float | None:
    return None if value is None else float(value)


def list_of(cell: Any) -> list[Any]:
    if cell == "[]":
        return []
    value = json.loads(string(cell))
    if not isinstance(value, list):
        raise TypeError("A list was expected.")
    return value


def object_of(value: Any) -> dict[str, Any]:
    if not isinstance(value, dict):
        raise TypeError("A JSON object was expected.")
    return value


def string(value: Any) -> str:
    if not isinstance(value, str):
        raise TypeError("A text was expected.")
    return value


def number(value: Any) -> float:
    if not isinstance(value, int | float) or isinstance(value, bool):
        raise TypeError("A number was expected.")
    if not math.isfinite(value):
        raise ValueError("A finite number was expected.")
    return float(value)


def number_or_none(value: Any) -> float | None:
    return None if value is None else number(value)


def whole(value: Any) -> int:
    if not isinstance(value, int) or isinstance(value, bool):
        raise TypeError("A whole number was expected.")
    return value
