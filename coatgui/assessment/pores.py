"""The pore resistance: how well the film keeps ions out.

It comes from the fit where the model has a resistance beside the film's capacitance. Where the fit
leaves it open, or the leads' own resistance lies within a factor of ten, it is a lower bound: leads
in parallel can only make a resistance look smaller, so 1/(1/low + 1/R_leads) is safe whether or not
the fit took the leads away.

A closed film has no such resistance in its model. Any resistance in parallel would show as
|Y| ≥ 1/R, so the film's is at least the largest |Z| at the low end of the used points.
"""

from __future__ import annotations

import math
from functools import lru_cache

import numpy as np

from coatgui.assessment.amounts import NORMAL_95, at_least, held_by_leads, per_area
from coatgui.assessment.capacitance import has_film
from coatgui.assessment.modulus import relative_scatter, used_points
from coatgui.assessment.words import hertz, power_of_ten
from coatgui.quality import leads_admittance
from coatgui.records import Bound, Fit, Quantity, Spectrum


@lru_cache(maxsize=64)
def leads_resistance(open_lead: Spectrum | None, frequency_hz: float) -> float | None:
    """Parallel resistance of the open leads at a frequency, Ω; None where they have none."""
    if open_lead is None:
        return None
    conductance = float(leads_admittance(open_lead, np.array([frequency_hz]))[0].real)
    return 1 / conductance if conductance > 0 else None


def pore_resistance(
    fit: Fit, spectrum: Spectrum, area_cm2: float | None, open_lead: Spectrum | None = None
) -> Quantity | None:
    """Pore resistance, Ω cm² (Ω without area); None for a model without a film."""
    used_hz, _ = used_points(spectrum, fit.used)
    if not used_hz or not has_film(fit):
        return None
    lowest = used_hz[0]
    leads_ohm = leads_resistance(open_lead, lowest)
    fitted = _fitted(fit)
    if fitted is None:
        modulus = float(abs(spectrum.impedance_ohm[fit.used][-1]))
        spread = math.exp(NORMAL_95 * relative_scatter(spectrum, fit.used, fit, lowest))
        return per_area(
            at_least(
                modulus / spread,
                "Ω",
                f"no pores seen: at least |Z| at the lowest used frequency, {hertz(lowest)}",
            ),
            area_cm2,
        )
    return per_area(_bounded_by_leads(fitted, leads_ohm), area_cm2)


def _fitted(fit: Fit) -> Quantity | None:
    pores = fit.parameter("R_po")
    if pores is not None:
        return pores if pores.value is not None else None
    layers = [r for symbol in ("R_1", "R_2") if (r := fit.parameter(symbol)) is not None]
    lows = [r.low for r in layers if r.low is not None]
    if not layers or len(lows) < len(layers):
        return None
    method = "sum of both layers' resistances"
    if all(r.bound is Bound.TWO_SIDED for r in layers):
        return Quantity(
            sum(r.value or 0.0 for r in layers),
            sum(lows),
            sum(r.high or 0.0 for r in layers),
            Bound.TWO_SIDED,
            "Ω",
            method,
        )
    return at_least(sum(lows), "Ω", method)


def _bounded_by_leads(fitted: Quantity, leads_ohm: float | None) -> Quantity:
    value = fitted.value if fitted.low is None else fitted.low
    if leads_ohm is None or value is None or fitted.bound is Bound.AT_MOST:
        return fitted
    if not held_by_leads(fitted.value or value, leads_ohm):
        return fitted
    return at_least(
        1 / (1 / value + 1 / leads_ohm),
        "Ω",
        f"from the fit; the open leads' own {power_of_ten(leads_ohm)} Ω lies within a factor of "
        "ten, so this is the least that the film can have",
    )
