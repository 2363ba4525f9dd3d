"""What a heading says: the role of a column, its unit, whether it counts the other way round."""

from __future__ import annotations

import re
import tomllib
import unicodedata
from dataclasses import dataclass
from functools import cache
from typing import Any

from coatgui.shipped import resource

_UNIT_IN_HEADING = re.compile(r"^(?P<name>.*?)[\s_]*[\[(/,]\s*(?P<unit>[^\[\]()]+?)\s*[\])]?\s*$")
_MINUS = "-−–"


@dataclass(frozen=True, slots=True)
class Meaning:
    """`factor` turns the written number into Hz, rad/s, Ω, rad or h; it is negative where the
    heading says that the sign is turned. `unit` is empty where the heading names none."""

    role: str
    unit: str
    factor: float


@cache
def _data() -> dict[str, Any]:
    return tomllib.loads(resource("headings.toml").read_text(encoding="utf-8"))


@cache
def _roles() -> dict[str, str]:
    return {word: role for role, words in _data()["role"].items() for word in words}


def _plain(text: str) -> str:
    return re.sub(r"[\s_.:]+", "", text).casefold()


def _unit_kind(role: str) -> str:
    return "impedance" if role in ("real", "imaginary", "modulus") else role


def unit_factor(role: str, unit: str) -> float | None:
    """Factor of a unit for a role, None where it is not one of the known units."""
    unit = unicodedata.normalize("NFKC", unit)  # the ohm sign becomes the Greek letter
    units = _data()["unit"]
    kind = _unit_kind(role)
    exact = units.get(f"{kind}_exact", {})
    if unit.strip() in exact:
        return float(exact[unit.strip()])
    found = units.get(kind, {}).get(_plain(unit))
    return None if found is None else float(found)


def meaning(heading: str) -> Meaning | None:
    """The meaning of a heading, or None where it is not one of the known ones."""
    text = heading.strip().strip('"').strip()
    for candidate, unit in _readings_of(text):
        negative = candidate[:1] in _MINUS and bool(candidate)
        role = _roles().get(_plain(candidate.lstrip(_MINUS)))
        if role is None:
            continue
        sign = -1.0 if negative and role in ("imaginary", "phase") else 1.0
        if not unit:
            return Meaning(role, "", sign)
        factor = unit_factor(role, unit)
        if factor is not None:
            return Meaning(role, unit, sign * factor)
    return None


def _readings_of(text: str) -> list[tuple[str, str]]:
    """Ways to part a heading into name and unit; the whole text as a name comes first."""
    ways = [(text, "")]
    found = _UNIT_IN_HEADING.match(text)
    if found:
        ways.append((found["name"], found["unit"]))
    if text.count("(") == 1 and not text.endswith(")"):
        return ways
    # "frequency_hz", "Zre ohm": the unit as the last word.
    pieces = re.split(r"[\s_]+", text)
    if len(pieces) > 1:
        ways.append(("".join(pieces[:-1]), pieces[-1]))
    return ways
