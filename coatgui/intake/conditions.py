"""Columns that say under which conditions each point was measured: temperature and potential.

Such a column is taken only where its heading names a unit; everything else stays unused. Of what
it holds, a reading keeps the lowest and the highest within the sweep.
"""

from __future__ import annotations

import re
from functools import cache, lru_cache

import numpy as np

from coatgui.intake.headings import partings
from coatgui.intake.units import Unit, data, unit_of
from coatgui.records import Column, FloatArray

CONDITIONS = ("temperature", "potential")
_AGAINST = re.compile(r"\b(?:vs|versus|gegen|contre)\b.*$", re.IGNORECASE)
_KELVIN = ("k", "kelvin")
_ICE_K = 273.15


@cache
def _names() -> dict[str, str]:
    return {name: role for role, names in data()["condition"].items() for name in names}


@lru_cache(maxsize=5000)
def condition(heading: str, unit_below: str = "") -> tuple[str, Unit] | None:
    """The role, temperature or potential, and the unit of a heading such as "T / °C" or "E (V vs
    Ag/AgCl)", or of one with its unit in the row below; else None."""
    for name, unit_text, _ in (*partings(heading), (heading, unit_below, True)):
        plain = re.sub(r"[\s_.()\[\]/-]+", " ", _AGAINST.sub("", name)).strip().casefold()
        role = _names().get(plain)
        unit = unit_of(_AGAINST.sub("", unit_text).strip(" (["), role) if role else None
        if role and unit is not None:
            return role, unit
    return None


def span(column: Column, written: FloatArray) -> tuple[float, float] | None:
    """Lowest and highest of a column of conditions (R,), in °C or mV; None where fewer than two
    points have a number."""
    values = written[np.isfinite(written)] * column.factor
    if values.size < 2:
        return None
    if column.unit.strip(" []()").casefold() in _KELVIN:
        values = values - _ICE_K
    return float(values.min()), float(values.max())
