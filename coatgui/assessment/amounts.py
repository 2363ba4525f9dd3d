"""What the quantities have in common: limits on a logarithmic footing, areas, the leads.

A quantity that spans decades has a relative error, so its limits are value·exp(±1.96 s), where s is
the standard error of its natural logarithm. The other way round, s = ln(high/low)/(2·1.96).
"""

from __future__ import annotations

import math

from coatgui.assessment.rules import rule
from coatgui.records import Bound, Parameter, Quantity

NORMAL_95 = 1.959963984540054
"""97.5 % point of the normal distribution."""

_TIMES_AREA = {"Ω": "Ω cm²", "Ω·s^-½": "Ω cm²·s^-½"}
_PER_AREA = {"F": "F/cm²", "S·sⁿ": "S·sⁿ/cm²", "S": "S/cm²"}


def from_logarithm(value: float, deviation: float, unit: str, method: str) -> Quantity:
    """A two-sided quantity from its value and the standard error of its natural logarithm."""
    spread = math.exp(min(NORMAL_95 * deviation, 300.0))
    return Quantity(value, value / spread, value * spread, Bound.TWO_SIDED, unit, method)


def log_deviation(quantity: Quantity) -> float | None:
    """Standard error of the natural logarithm; 0 for a fixed one, None where not two-sided."""
    if quantity.bound is Bound.FIXED:
        return 0.0
    if quantity.bound is not Bound.TWO_SIDED or not quantity.low or not quantity.high:
        return None
    return math.log(quantity.high / quantity.low) / (2 * NORMAL_95)


def at_least(bound: float, unit: str, method: str) -> Quantity:
    """A quantity of which only a lower bound is known."""
    return Quantity(bound, bound, None, Bound.AT_LEAST, unit, method)


def scaled(quantity: Quantity, factor: float, unit: str) -> Quantity:
    """The quantity times a positive factor, in another unit."""
    value, low, high = quantity.value, quantity.low, quantity.high
    return Quantity(
        None if value is None else value * factor,
        None if low is None else low * factor,
        None if high is None else high * factor,
        quantity.bound,
        unit,
        quantity.method,
    )


def per_area_factor(unit: str, area_cm2: float | None) -> tuple[float, str]:
    """Factor and new unit by which a quantity is normalised by the area: resistances times it,
    capacitances divided by it. Quantities of other units, and all of a panel without an area, stay
    as they are, per specimen."""
    if area_cm2 is not None:
        if unit in _TIMES_AREA:
            return area_cm2, _TIMES_AREA[unit]
        if unit in _PER_AREA:
            return 1 / area_cm2, _PER_AREA[unit]
    return 1.0, unit


def per_area(quantity: Quantity, area_cm2: float | None) -> Quantity:
    """The quantity normalised by the area, see `per_area_factor`."""
    factor, unit = per_area_factor(quantity.unit, area_cm2)
    return quantity if unit == quantity.unit else scaled(quantity, factor, unit)


def parameters_per_area(
    parameters: tuple[Parameter, ...], area_cm2: float | None
) -> tuple[Parameter, ...]:
    if area_cm2 is None:
        return parameters
    into = {
        **{unit: (area_cm2, per) for unit, per in _TIMES_AREA.items()},
        **{unit: (1 / area_cm2, per) for unit, per in _PER_AREA.items()},
    }
    return tuple(
        Parameter(p.symbol, p.meaning, p.layer, scaled(p.quantity, *into[p.quantity.unit]))
        if p.quantity.unit in into
        else p
        for p in parameters
    )


def held_by_leads(ohm: float, leads_ohm: float | None) -> bool:
    """Whether an impedance is so close to that of the open leads that it only bounds the film."""
    return leads_ohm is not None and leads_ohm < rule("leads.factor") * ohm
