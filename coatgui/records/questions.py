"""What a person asks of an assessment, beyond what is always answered. A campaign's `Settings` keep
it. A quantity is named by one of the codes of `QUANTITIES`.
"""

from __future__ import annotations

from dataclasses import dataclass
from enum import StrEnum
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from coatgui.records.campaign import Criterion

QUANTITIES = {
    "modulus": "Ω cm²",
    "coating_capacitance": "F/cm²",
    "pore_resistance": "Ω cm²",
    "water_uptake": "vol-%",
    "relative_permittivity": "",
    "film_resistivity": "Ω cm",
}
"""Codes of quantities, each with its unit where panels have an area. The modulus goes with a
frequency, the others without."""


class Side(StrEnum):
    """On which side of its value a limit is broken."""

    BELOW = "below"
    ABOVE = "above"


@dataclass(frozen=True, slots=True)
class Limit:
    """A limit on any quantity; `frequency_hz` belongs to the modulus and is None for the others.
    `value` is per area, in `unit`."""

    name: str
    quantity: str
    value: float
    unit: str
    source: str
    side: Side = Side.BELOW
    frequency_hz: float | None = None

    @classmethod
    def of_criterion(cls, criterion: Criterion) -> Limit:
        return cls(
            criterion.name,
            "modulus",
            criterion.ohm_cm2,
            "Ω cm²",
            criterion.source,
            frequency_hz=criterion.frequency_hz,
        )


class Judge(StrEnum):
    """By what formulations are compared."""

    AT_TIME = "at_time"
    AREA_UNDER_COURSE = "area_under_course"
    TIME_TO_LIMIT = "time_to_limit"
    RATING = "rating"


class Method(StrEnum):
    """How pairs of formulations are tested."""

    WELCH = "welch"
    TUKEY = "tukey"
    GAMES_HOWELL = "games_howell"
    DUNNETT = "dunnett"
    RANKS = "ranks"
    DUNN = "dunn"


@dataclass(frozen=True, slots=True)
class Question:
    """A comparison that is asked for. `exposure_h` None: the last inspection that all share, or all
    of the course. `limit` belongs to TIME_TO_LIMIT, `scale` to RATING, `reference` (a formulation's
    name) to DUNNETT."""

    quantity: str = "modulus"
    frequency_hz: float | None = 0.1
    judge: Judge = Judge.AT_TIME
    method: Method = Method.WELCH
    exposure_h: float | None = None
    limit: Limit | None = None
    scale: str = ""
    reference: str = ""


@dataclass(frozen=True, slots=True)
class ProjectionWanted:
    """A course to be carried on to an exposure time beyond the last reading."""

    quantity: str
    until_h: float
    frequency_hz: float | None = None
