"""What a person asks of an assessment, beyond what is always answered. All of it can be stored.

A quantity is named by its code: modulus (with a frequency), coating_capacitance, pore_resistance,
water_uptake.
"""

from __future__ import annotations

from dataclasses import dataclass
from enum import StrEnum

from coatgui.records.campaign import Criterion, VisualRating


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


@dataclass(frozen=True, slots=True)
class Questions:
    """`limits` stand beside the campaign's own criteria."""

    limits: tuple[Limit, ...] = ()
    comparisons: tuple[Question, ...] = ()
    projections: tuple[ProjectionWanted, ...] = ()
    ratings: tuple[VisualRating, ...] = ()
