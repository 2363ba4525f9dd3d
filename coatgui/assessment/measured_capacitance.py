"""The film's capacitance straight from the data at one frequency: parallel C = −Z″/(ω|Z|²), series
C = −1/(ωZ″), after taking away the admittance of the open leads."""

from __future__ import annotations

import math
from collections.abc import Sequence

import numpy as np

from coatgui.assessment.amounts import from_logarithm
from coatgui.assessment.modulus import Grid, neighbours
from coatgui.assessment.rules import rule
from coatgui.assessment.words import hertz, power_of_ten
from coatgui.quality import leads_admittance
from coatgui.records import Finding, Quantity, Severity, Spectrum


def measured_capacitances(
    on: Sequence[Grid],
    frequency_hz: float,
    area_cm2: Sequence[float | None],
    open_lead: Spectrum | None = None,
) -> list[tuple[Quantity | None, Finding | None]]:
    """Parallel capacitance at one frequency from the used points of readings on their grids, in the
    order of `area_cm2`, and a note where the phase is so small that it is not the film's alone. The
    series value stands beside it in the method.

    None where the frequency is not within the used points or the current does not lead.
    """
    found: list[tuple[Quantity | None, Finding | None]] = [(None, None)] * len(area_cm2)
    leads = None
    if open_lead is not None:
        leads = complex(leads_admittance(open_lead, np.array([frequency_hz]))[0])
    within = rule("modulus.measured_within")
    for grid in on:
        frequency = grid.frequency
        if len(frequency) < 2 or not (
            frequency[0] * (1 - within) <= frequency_hz <= frequency[-1] * (1 + within)
        ):
            continue
        inside = min(max(frequency_hz, frequency[0]), frequency[-1])
        beside = neighbours(frequency, inside)
        assert beside is not None
        first, second = grid.impedance[:, beside].T
        above, below = (frequency[i] for i in beside)
        share = 0.0 if above == below else math.log(above / inside) / math.log(above / below)
        # Where |Z| is zero nothing comes out but NaN, and that is passed over.
        with np.errstate(divide="ignore", invalid="ignore"):
            modulus = np.abs(first) ** (1 - share) * np.abs(second) ** share
            phase = np.angle(first) + share * np.angle(second / first)
            admittance = (np.cos(phase) - 1j * np.sin(phase)) / modulus
        spread = grid.scatter(frequency_hz)
        for place, one, deviation in zip(
            grid.places, admittance.tolist(), spread.tolist(), strict=True
        ):
            found[place] = _one(one, leads, deviation, frequency_hz, area_cm2[place])
    return found


def _one(
    admittance: complex,
    leads: complex | None,
    deviation: float,
    frequency_hz: float,
    area_cm2: float | None,
) -> tuple[Quantity | None, Finding | None]:
    method = f"measured at {hertz(frequency_hz)}, parallel"
    if leads is not None:
        admittance -= leads
        method += ", without the open leads"
    omega = 2 * math.pi * frequency_hz
    parallel = admittance.imag / omega
    if not 0 < parallel < math.inf:
        return None, None
    series = abs(admittance) ** 2 / (admittance.imag * omega)
    degrees = math.degrees(math.atan2(admittance.imag, admittance.real))
    unit_area = 1.0 if area_cm2 is None else area_cm2
    unit = "F" if area_cm2 is None else "F/cm²"
    method += f" (series {power_of_ten(series / unit_area, 3)} {unit}, phase −{degrees:.1f}°)"
    quantity = from_logarithm(parallel / unit_area, deviation, unit, method)
    if degrees >= rule("capacitance.phase_deg"):
        return quantity, None
    note = Finding(
        "capacitance_phase",
        Severity.NOTE,
        f"At {hertz(frequency_hz)} the phase is only −{degrees:.0f}°: the capacitance read there "
        "is not that of the film alone.",
        evidence=(("phase_deg", -degrees),),
    )
    return quantity, note
