"""The film's capacitance straight from the data at one frequency: parallel C = −Z″/(ω|Z|²), series
C = −1/(ωZ″), after taking away the admittance of the open leads."""

from __future__ import annotations

import cmath
import math

import numpy as np

from coatgui.assessment.amounts import from_logarithm, per_area
from coatgui.assessment.modulus import Scatter, neighbours, used_points
from coatgui.assessment.rules import rule
from coatgui.quality import leads_admittance
from coatgui.records import BoolArray, Finding, Fit, Quantity, Severity, Spectrum


def measured_capacitance(
    spectrum: Spectrum,
    used: BoolArray,
    fit: Fit | None,
    frequency_hz: float,
    area_cm2: float | None,
    open_lead: Spectrum | None = None,
    scatter: Scatter | None = None,
) -> tuple[Quantity | None, Finding | None]:
    """Parallel capacitance at one frequency from the used points, and a note where the phase is so
    small that it is not the film's alone. The series value stands beside it in the method.

    None where the frequency is not within the used points or the current does not lead.
    """
    frequency, places = used_points(spectrum, used)
    within = rule("modulus.measured_within")
    if len(frequency) < 2 or not (
        frequency[0] * (1 - within) <= frequency_hz <= frequency[-1] * (1 + within)
    ):
        return None, None
    inside = min(max(frequency_hz, frequency[0]), frequency[-1])
    beside = neighbours(frequency, inside)
    assert beside is not None
    first, second = (complex(spectrum.impedance_ohm[places[i]]) for i in beside)
    if not (first and second):
        return None, None
    above, below = (frequency[i] for i in beside)
    share = 0.0 if above == below else math.log(above / inside) / math.log(above / below)
    modulus = abs(first) ** (1 - share) * abs(second) ** share
    phase = cmath.phase(first) + share * cmath.phase(second / first)
    admittance = complex(math.cos(phase), -math.sin(phase)) / modulus
    method = f"measured at {frequency_hz:g} Hz, parallel"
    if open_lead is not None:
        admittance -= complex(leads_admittance(open_lead, np.array([frequency_hz]))[0])
        method += ", without the open leads"
    omega = 2 * math.pi * frequency_hz
    parallel = admittance.imag / omega
    if parallel <= 0:
        return None, None
    series = abs(admittance) ** 2 / (admittance.imag * omega)
    degrees = math.degrees(math.atan2(admittance.imag, admittance.real))
    unit_area = 1.0 if area_cm2 is None else area_cm2
    unit = "F" if area_cm2 is None else "F/cm²"
    method += f" (series {series / unit_area:.3g} {unit}, phase −{degrees:.1f}°)"
    spread = (scatter or Scatter(spectrum, used, fit)).at(frequency_hz)
    quantity = per_area(from_logarithm(parallel, spread, "F", method), area_cm2)
    if degrees >= rule("capacitance.phase_deg"):
        return quantity, None
    note = Finding(
        "capacitance_phase",
        Severity.NOTE,
        f"At {frequency_hz:g} Hz the phase is only −{degrees:.0f}°: the capacitance read there is "
        "not that of the film alone.",
        evidence=(("phase_deg", -degrees),),
    )
    return quantity, note
