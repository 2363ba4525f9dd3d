"""Water in the film, from its capacitance.

Brasher and Kingsbury (1954): mixing film and water at random gives ε = ε_film^(1−φ) ε_w^φ in the
form that leaves the polymer in place, so that C_t = C_0 ε_w^φ and

    φ = ln(C_t/C_0) / ln ε_w(T).

It assumes water spread evenly, no swelling and a purely capacitive film; what it gives is an
*apparent* uptake. ε_w(T) is the polynomial of Malmberg and Maryott (1956), coefficients in
`resources/water.toml`.
"""

from __future__ import annotations

import math
from functools import cache

import numpy as np
from numpy.typing import ArrayLike

from coatgui.assessment.rules import rule, table
from coatgui.records import Bound, Finding, FloatArray, Quantity, Severity


def water_permittivity(temperature_c: ArrayLike) -> FloatArray:
    """Static relative permittivity of water at `temperature_c` (any shape), by Malmberg and
    Maryott. NaN outside 0–100 °C, where the polynomial was not made for."""
    law = table("water")["permittivity"]
    t = np.asarray(temperature_c, dtype=np.float64)
    value = np.polynomial.polynomial.polyval(t, np.asarray(law["coefficients"], dtype=np.float64))
    inside = (t >= law["from_c"]) & (t <= law["to_c"])
    return np.where(inside, value, np.nan)


@cache
def _permittivity_at(temperature_c: float) -> float:
    return float(water_permittivity(temperature_c))


def brasher_kingsbury(capacitance: float, dry_capacitance: float, permittivity: float) -> float:
    """Apparent volume fraction of water; the two capacitances in one unit, both positive."""
    return math.log(capacitance / dry_capacitance) / math.log(permittivity)


def apparent_uptake(
    capacitance: Quantity, dry_capacitance: Quantity, temperature_c: float
) -> Quantity | None:
    """Apparent water uptake in volume-percent with its limits.

    The limits of the two capacitances are taken as independent and added in squares. Where the dry
    capacitance is only known from above (AT_MOST: it is that of a film already wet), the uptake is
    at least what comes out, and never less than nothing: that reading's own uptake is at least 0.
    None where the temperature is outside 0–100 °C. Raises ValueError where a capacitance lacks its
    value, or the limit that is needed.
    """
    if not (
        capacitance.value and capacitance.low and dry_capacitance.value and dry_capacitance.high
    ):
        raise ValueError("Water uptake needs two capacitances with their limits.")
    permittivity = _permittivity_at(temperature_c)
    if math.isnan(permittivity):
        return None
    percent = 100 / math.log(permittivity)
    value = percent * math.log(capacitance.value / dry_capacitance.value)
    method = (
        f"Brasher–Kingsbury, apparent; ε_w = {permittivity:.2f} at {temperature_c:g} °C; "
        f"dry capacitance {dry_capacitance.method}"
    )
    down = percent * math.hypot(
        math.log(capacitance.value / capacitance.low),
        math.log(dry_capacitance.high / dry_capacitance.value),
    )
    if dry_capacitance.bound is Bound.AT_MOST or not dry_capacitance.low or not capacitance.high:
        bound = max(value - down, 0.0)
        return Quantity(bound, bound, None, Bound.AT_LEAST, "vol-%", method)
    up = percent * math.hypot(
        math.log(capacitance.high / capacitance.value),
        math.log(dry_capacitance.value / dry_capacitance.low),
    )
    return Quantity(value, value - down, value + up, Bound.TWO_SIDED, "vol-%", method)


def uptake_of_rise(
    log_rise: Quantity, temperature_c: float, thickness_ratio: float = 1.0
) -> Quantity | None:
    """Water at saturation in volume-percent from ln(C_∞/C_0) of a joint fit, with its limits;
    L_∞/L_0 is multiplied in where the film swells in thickness. None outside 0–100 °C."""
    permittivity = _permittivity_at(temperature_c)
    if math.isnan(permittivity):
        return None
    percent = 100 / math.log(permittivity)
    swelling = math.log(thickness_ratio)

    def of(rise: float | None) -> float | None:
        return None if rise is None else percent * (rise + swelling)

    method = (
        f"Brasher–Kingsbury at saturation, apparent; ε_w = {permittivity:.2f} at "
        f"{temperature_c:g} °C; {log_rise.method}"
    )
    if swelling:
        method += f"; swollen in thickness by {100 * (thickness_ratio - 1):.1f} percent"
    return Quantity(
        of(log_rise.value), of(log_rise.low), of(log_rise.high), log_rise.bound, "vol-%", method
    )


def uptake_finding(uptake: Quantity) -> Finding | None:
    """A doubt where the uptake is beyond what a sound film holds: the law's assumptions failed.
    The number is kept."""
    most = float(table("water")["uptake"]["implausible_percent"]["value"])
    if uptake.value is None:
        return None
    if uptake.value > most:
        why = f"is more than {most:g} volume-percent"
    elif uptake.high is not None and uptake.high < 0:
        why = "is negative"
    else:
        return None
    return Finding(
        "uptake_unphysical",
        Severity.DOUBT,
        f"The apparent water uptake of {uptake.value:.1f} volume-percent {why}: the assumptions of "
        "Brasher–Kingsbury have failed (water not spread evenly, swelling, conducting pores, or a "
        "wrong dry capacitance). The number is kept, but it does not measure water.",
        evidence=(("volume_percent", uptake.value), ("limit_percent", most)),
    )


def temperature_finding(temperature_c: float) -> Finding:
    """A note: at this temperature the permittivity of water is not known, so no uptake is given."""
    law = table("water")["permittivity"]
    return Finding(
        "temperature_outside_law",
        Severity.NOTE,
        f"At {temperature_c:g} °C no water uptake is given: the permittivity of water is known "
        f"from {law['from_c']:g} to {law['to_c']:g} °C. Check the temperature of this reading.",
        evidence=(("temperature_c", temperature_c),),
    )


def dry_out_finding(fallen_percent: float) -> Finding:
    """A doubt: the film's capacitance is below an earlier one, though the panel is soaking."""
    return Finding(
        "capacitance_dropped",
        Severity.DOUBT,
        f"The film's capacitance is {fallen_percent:.1f} percent below an earlier reading of this "
        "panel, while a soaking film can only gain: it dried out, or the cell, the area or the "
        "temperature changed.",
        evidence=(
            ("fallen_percent", fallen_percent),
            ("limit_percent", rule("events.dry_out_percent")),
        ),
    )
