"""Electrolytes and exposure regimes that panels are filled in from. The program brings some; a
campaign can keep its own beside or in place of them."""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class Electrolyte:
    """`known_by` recognises it in a panel's own text: all words of one of the lists, in any case.
    `resistivity_ohm_cm` is that of the solution in the pores; None: not known, or hardly any
    conduction, so that no area is estimated from it."""

    electrolyte_id: str
    name: str
    resistivity_ohm_cm: float | None = None
    source: str = ""
    known_by: tuple[tuple[str, ...], ...] = ()


@dataclass(frozen=True, slots=True)
class Regime:
    """`electrolyte_id` is empty where the regime has none of its own, `cycle_h` the length of one
    cycle, `duration_h` the usual ends of the exposure."""

    regime_id: str
    name: str
    conditions: str = ""
    electrolyte_id: str = ""
    temperature_c: float | None = None
    cycle_h: float | None = None
    duration_h: tuple[float, float] | None = None
    source: str = ""
