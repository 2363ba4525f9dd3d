"""The film as a material: effective permittivity and resistivity from its thickness, and the facts
of a panel that stand in further columns of its panel list.

    ε_r = C L/ε₀,     ρ = R_po/L     (C per cm², R_po in Ω cm², L in cm)

Both are *effective*: they take the film for uniform, pores and all.
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass

from coatgui.assessment.amounts import NORMAL_95, from_logarithm, scaled
from coatgui.assessment.mixing import VACUUM_F_PER_CM
from coatgui.assessment.rules import rule
from coatgui.records import Bound, Finding, Panel, Quantity, Severity

_CM_PER_UM = 1e-4


@dataclass(frozen=True, slots=True)
class FilmFacts:
    """What a panel's notes say of its film: columns `dry_capacitance_f_per_cm2`,
    `film_density_g_cm3`, `wet_thickness_um` (at saturation) and `thickness_sd_um` of the panel
    list. None where there is no such column or it holds no positive number."""

    dry_capacitance_f_cm2: float | None = None
    density_g_cm3: float | None = None
    wet_thickness_um: float | None = None
    thickness_sd_um: float | None = None


def film_facts(panel: Panel) -> FilmFacts:
    notes = {heading.strip().lower(): text for heading, text in panel.notes}
    return FilmFacts(
        _positive(notes, "dry_capacitance_f_per_cm2"),
        _positive(notes, "film_density_g_cm3"),
        _positive(notes, "wet_thickness_um"),
        _positive(notes, "thickness_sd_um"),
    )


def _positive(notes: Mapping[str, str], heading: str) -> float | None:
    try:
        value = float(notes.get(heading, "").strip().replace(",", "."))
    except ValueError:
        return None
    return value if math.isfinite(value) and value > 0 else None


def measured_dry(facts: FilmFacts) -> Quantity | None:
    """The dry capacitance that the panel list gives, F/cm²."""
    if facts.dry_capacitance_f_cm2 is None:
        return None
    deviation = rule("sorption.measured_dry_percent") / 100
    return from_logarithm(
        facts.dry_capacitance_f_cm2, deviation, "F/cm²", "measured dry, from the panel list"
    )


def relative_permittivity(capacitance: Quantity, thickness_um: float | None) -> Quantity | None:
    """Effective ε_r of a film; None without thickness or area."""
    if thickness_um is None or capacitance.unit != "F/cm²":
        return None
    factor = thickness_um * _CM_PER_UM / VACUUM_F_PER_CM
    return scaled(capacitance, factor, "")


def film_resistivity(pore_resistance: Quantity, thickness_um: float | None) -> Quantity | None:
    """Effective resistivity of a film in Ω cm; None without thickness or area."""
    if thickness_um is None or pore_resistance.unit != "Ω cm²":
        return None
    return scaled(pore_resistance, 1 / (thickness_um * _CM_PER_UM), "Ω cm")


def permittivity_finding(permittivity: Quantity) -> Finding | None:
    """A doubt where no organic film has such a permittivity, within its limits."""
    least, most = rule("film.permittivity_least"), rule("film.permittivity_most")
    low = permittivity.value if permittivity.low is None else permittivity.low
    high = permittivity.value if permittivity.high is None else permittivity.high
    if permittivity.value is None or low is None or high is None or (low <= most and high >= least):
        return None
    if permittivity.bound is Bound.AT_MOST and permittivity.value > most:
        return None
    return Finding(
        "permittivity_unphysical",
        Severity.DOUBT,
        f"The film's capacitance and thickness give a relative permittivity of "
        f"{permittivity.value:.3g}, outside {least:g} to {most:g}: no organic film has it. Check "
        "thickness and area; metal pigment and conducting pores do the same. What is drawn from "
        "this capacitance, water uptake first, is unphysical.",
        evidence=(("relative_permittivity", permittivity.value),),
    )


def thickness_deviation(facts: FilmFacts, thickness_um: float | None) -> float:
    """Relative standard error of the thickness, 0 where none is given."""
    if facts.thickness_sd_um is None or thickness_um is None:
        return 0.0
    return facts.thickness_sd_um / thickness_um


def widened(quantity: Quantity, deviation: float) -> Quantity:
    """A two-sided quantity with a further relative standard error in it."""
    if deviation == 0 or quantity.bound is not Bound.TWO_SIDED:
        return quantity
    value, low, high = quantity.value, quantity.low, quantity.high
    if not (value and low and high):
        return quantity
    more = NORMAL_95 * deviation
    return Quantity(
        value,
        value * math.exp(-math.hypot(math.log(value / low), more)),
        value * math.exp(math.hypot(math.log(high / value), more)),
        quantity.bound,
        quantity.unit,
        quantity.method,
    )
