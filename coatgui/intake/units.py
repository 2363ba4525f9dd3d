"""Units as they are written in headings, rows of units and preambles."""

from __future__ import annotations

import re
import tomllib
import unicodedata
from dataclasses import dataclass
from functools import cache, lru_cache
from typing import Any

from coatgui.shipped import resource

_WITH_PREFIX = (
    "frequency",
    "angular_frequency",
    "impedance",
    "admittance",
    "capacitance",
    "angle",
    "potential",
)
_TIMES_AREA = re.compile(r"[\s*·.×x]*(c?m)\s*\^?2$")
_PER_AREA = re.compile(r"(?:/\s*\(?|[\s*·.×x]*)(c?m)\s*\^?(-?)2\)?$")
_SQUARE_METRE_IN_CM2 = 1e4


@dataclass(frozen=True, slots=True)
class Unit:
    """`factor` turns a written number into Hz, rad/s, Ω, S, F, rad, h, °C (or K) or mV; where
    `per_area`, into Ω cm², S/cm² or F/cm². `sure` is False where "m" may be milli or mega."""

    kind: str
    written: str
    factor: float
    per_area: bool = False
    sure: bool = True


@cache
def data() -> dict[str, Any]:
    """The words of resources/headings.toml."""
    return tomllib.loads(resource("headings.toml").read_text(encoding="utf-8"))


def kind_of(role: str) -> str:
    """The kind of unit a role has, "" where it has none."""
    if role in ("real", "imaginary", "modulus"):
        return "impedance"
    if role in ("phase", "admittance_phase"):
        return "angle"
    if role.startswith(("admittance", "capacitance")):
        return role.split("_")[0]
    if role.startswith(("parallel", "series")):
        return "capacitance" if role.endswith("capacitance") else "impedance"
    own = ("frequency", "angular_frequency", "time", "temperature", "potential")
    return role if role in own else ""


@lru_cache(maxsize=5000)
def unit_of(text: str, kind: str) -> Unit | None:
    """The unit, where the text is one of this kind; else None."""
    written = unicodedata.normalize("NFKC", text).strip().strip("[](){}").strip()
    bare = written.replace("−", "-").replace("^", "").replace("⋅", "·").replace("Ω", "Ω")
    per_area = False
    scale = 1.0
    if kind in ("impedance", "admittance", "capacitance"):
        found = (_TIMES_AREA if kind == "impedance" else _PER_AREA).search(bare)
        if found and found.start() > 0:
            metres = found[1] == "m"
            scale = _SQUARE_METRE_IN_CM2 if metres else 1.0
            scale = scale if kind == "impedance" else 1.0 / scale
            bare, per_area = bare[: found.start()].rstrip("*·./ "), True
    known = data()["unit"].get(kind, {})
    for length in range(min(5, len(bare)) + 1):
        # Length 0 is the unit alone; otherwise the first letters are a prefix.
        prefix, base = bare[:length], re.sub(r"[\s.]+", "", bare[length:]).casefold()
        if length and kind not in _WITH_PREFIX:
            break
        if base not in known:
            continue
        factor = 1.0 if not length else _prefix(prefix)
        if factor is None:
            continue
        # All in small letters, "mhz" and "mohm" are written for milli and for mega alike.
        unsure = prefix == "m" and kind in ("frequency", "impedance") and bare[1:2].islower()
        unsure = unsure and not bare[1:].startswith("Ω") and bare[1:2] != "Ω"
        return Unit(kind, written, factor * scale * known[base], per_area, not unsure)
    return None


def _prefix(text: str) -> float | None:
    letters, words = data()["prefix"]["letter"], data()["prefix"]["word"]
    text = text.replace("µ", "μ")
    found = letters.get(text) if len(text) == 1 else words.get(text.strip(" -").casefold())
    return None if found is None else float(found)
