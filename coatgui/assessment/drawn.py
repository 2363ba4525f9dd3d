"""What has been drawn from one reading so far: the working record of an assessment.

`conducts`: the pores carry more than the film's capacitance at the low end of the window, by a
resistance that the data hold from both sides, leads included.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

from coatgui.records import (
    ActiveArea,
    BoolArray,
    Breakpoint,
    Finding,
    Fit,
    Modulus,
    Parameter,
    Quantity,
    Reading,
    WaterUptake,
)


@dataclass(slots=True)
class Drawn:
    """What has been drawn from one reading so far; `assess` fills it step by step. `left_out` maps
    the place of each point left out to the reason; at `crossing_hz` the phase passes −45°."""

    reading: Reading
    used: BoolArray
    left_out: Mapping[int, str]
    counts: bool
    temperature_c: float
    area_cm2: float | None
    findings: list[Finding]
    fit: Fit | None = None
    moduli: tuple[Modulus, ...] = ()
    parameters: tuple[Parameter, ...] = ()
    coating_capacitance: Quantity | None = None
    measured_capacitance: Quantity | None = None
    pore_resistance: Quantity | None = None
    conducts: bool = False
    crossing_hz: float | None = None
    interface_capacitance: Quantity | None = None
    water_uptake: WaterUptake | None = None
    relative_permittivity: Quantity | None = None
    film_resistivity: Quantity | None = None
    breakpoint: Breakpoint | None = None
    active_area: ActiveArea | None = None

    def modulus_at(self, frequency_hz: float) -> Modulus | None:
        return next((m for m in self.moduli if m.frequency_hz == frequency_hz), None)
