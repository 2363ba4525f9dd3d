"""The ratings list of a folder: what was seen on panels, by scales of `resources/ratings.toml`."""

from __future__ import annotations

import re
import tomllib
from collections.abc import Iterable
from functools import cache
from typing import Any

from coatgui.intake.errors import Unreadable
from coatgui.intake.lists import list_rows, row_number
from coatgui.records import FoundRating
from coatgui.shipped import resource


@cache
def _scales() -> dict[str, dict[str, Any]]:
    data = tomllib.loads(resource("ratings.toml").read_text(encoding="utf-8"))
    return {str(scale["id"]): scale for scale in data["scale"]}


def scale_ids() -> tuple[str, ...]:
    """The ids of the rating scales, in the order of the data."""
    return tuple(_scales())


def read_ratings(data: bytes, name: str) -> tuple[FoundRating, ...]:
    """The rows of a ratings list. Raises Unreadable with the line."""
    return ratings_of(list_rows(data, name, "panel"), name)


def ratings_of(rows: Iterable[dict[str, str]], name: str) -> tuple[FoundRating, ...]:
    """Ratings from rows by heading; the headings stand in line 1. A scale is named by its id or its
    name."""
    found = []
    for line, row in enumerate(rows, start=2):
        if not row["panel"]:
            raise Unreadable(f"Line {line} names no panel.")
        exposure_h = row_number(row, "exposure_h", line)
        if exposure_h is None or exposure_h < 0:
            raise Unreadable(f"Line {line}: a rating needs exposure_h, 0 h or more.")
        scale_id = _scale(row.get("scale", ""), line)
        value = row.get("rating", "")
        scale = _scales()[scale_id]
        if re.fullmatch(str(scale["pattern"]), value) is None:
            raise Unreadable(
                f"Line {line}: “{value[:40]}” is no rating by {scale['name']}: "
                f"{scale['example']} is meant."
            )
        others = (row.get(heading, "") for heading in ("edition", "rater", "remark"))
        found.append(FoundRating(name, row["panel"], exposure_h, scale_id, value, *others))
    return tuple(found)


def _scale(said: str, line: int) -> str:
    for scale_id, scale in _scales().items():
        if said.casefold() in (scale_id, str(scale["name"]).casefold()):
            return scale_id
    raise Unreadable(
        f"Line {line}: there is no rating scale “{said[:40]}”. Known are {', '.join(_scales())}."
    )
