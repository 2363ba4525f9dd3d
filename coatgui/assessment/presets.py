"""Exposure regimes and electrolytes as presets, from `resources/`. A panel keeps its own text and
temperature; a preset only fills them in."""

from __future__ import annotations

from dataclasses import dataclass

from coatgui.assessment.rules import table


@dataclass(frozen=True, slots=True)
class Electrolyte:
    electrolyte_id: str
    name: str
    resistivity_ohm_cm: float | None
    source: str


@dataclass(frozen=True, slots=True)
class Regime:
    """`cycle_h` is the length of one cycle, `duration_h` the usual ends of the exposure."""

    regime_id: str
    name: str
    conditions: str
    electrolyte: Electrolyte | None
    temperature_c: float | None
    cycle_h: float | None
    duration_h: tuple[float, float] | None
    source: str


def electrolytes() -> tuple[Electrolyte, ...]:
    return tuple(
        Electrolyte(e["id"], e["name"], e.get("resistivity_ohm_cm"), e["source"])
        for e in table("electrolytes")["electrolyte"]
    )


def regimes() -> tuple[Regime, ...]:
    """The presets in the order of the data. Raises KeyError where one names an electrolyte that
    there is not."""
    known = {e.electrolyte_id: e for e in electrolytes()}
    return tuple(
        Regime(
            r["id"],
            r["name"],
            r["conditions"],
            known[r["electrolyte"]] if "electrolyte" in r else None,
            r.get("temperature_c"),
            r.get("cycle_h"),
            (r["duration_h"][0], r["duration_h"][1]) if "duration_h" in r else None,
            r["source"],
        )
        for r in table("regimes")["regime"]
    )
