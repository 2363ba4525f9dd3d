"""What other mixing laws make of the same rise of capacitance: the bracket around the uptake.

Every law is solved for the volume fraction φ in closed form, given ε = ε_film with water, x = ε of
the dry film and w = ε of water (formulas in `resources/water.toml`):

    linear            φ = (ε−x)/(w−x)
    Lichtenecker      φ = ln(ε/x)/ln(w/x)
    Looyenga          φ = (ε^⅓−x^⅓)/(w^⅓−x^⅓)
    Bruggeman         φ = B/(B−A),  A = (w−ε)/(w+2ε),  B = (x−ε)/(x+2ε)
    Bruggeman–Hanai   φ = 1 − (w−ε)/(w−x)·(x/ε)^⅓
    Maxwell-Garnett   φ = (ε−x)/(ε+2x) · (w+2x)/(w−x)
    series            φ = (1/x−1/ε)/(1/x−1/w)

Brasher and Kingsbury need no x. Where the film swells in thickness only, C_t/C_0 is multiplied by
L_t/L_0 first, for C ∝ ε/L.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from coatgui.assessment.rules import table
from coatgui.records import FloatArray

VACUUM_F_PER_CM = 8.8541878e-14
"""ε₀ in F/cm."""

_Law = Callable[[FloatArray, float, float], FloatArray]


def _bruggeman(e: FloatArray, x: float, w: float) -> FloatArray:
    water, film = (w - e) / (w + 2 * e), (x - e) / (x + 2 * e)
    return film / (film - water)


_LAWS: dict[str, _Law] = {
    "linear": lambda e, x, w: (e - x) / (w - x),
    "lichtenecker": lambda e, x, w: np.log(e / x) / np.log(w / x),
    "looyenga": lambda e, x, w: (np.cbrt(e) - np.cbrt(x)) / (np.cbrt(w) - np.cbrt(x)),
    "bruggeman": _bruggeman,
    "bruggeman_hanai": lambda e, x, w: 1 - (w - e) / (w - x) * np.cbrt(x / e),
    "maxwell_garnett": lambda e, x, w: (e - x) / (e + 2 * x) * (w + 2 * x) / (w - x),
    "series": lambda e, x, w: (1 / x - 1 / e) / (1 / x - 1 / w),
}


@dataclass(frozen=True, slots=True)
class Bracket:
    """Volume-percent by each law, (laws, N), in the order of `names`; `low` and `high` (N,) are the
    ends over the laws that count as mixtures, Brasher–Kingsbury among them. NaN where a law gives
    nothing between 0 and 100 percent: the film would hold more than water alone."""

    names: tuple[str, ...]
    volume_percent: FloatArray
    low: FloatArray
    high: FloatArray


def permittivity(capacitance_f_cm2: float, thickness_um: float) -> float:
    """Relative permittivity C·L/ε₀ of a film, from its capacitance per area and its thickness."""
    return capacitance_f_cm2 * thickness_um * 1e-4 / VACUUM_F_PER_CM


def bracket(
    capacitance_ratio: FloatArray,
    water: FloatArray,
    dry_permittivity: float | None,
    thickness_ratio: float = 1.0,
) -> Bracket:
    """Volume-percent of water by all laws.

    `capacitance_ratio` (N,) is C_t/C_0, `water` (N,) the permittivity of water at each reading's
    temperature, `thickness_ratio` L_t/L_0. Without `dry_permittivity` the usual range is gone
    through, and the ends are those over both of its ends.
    """
    data = table("water")
    ratio = np.asarray(capacitance_ratio, dtype=np.float64) * thickness_ratio
    water = np.asarray(water, dtype=np.float64)
    dry = (
        [float(data["film"]["low"]), float(data["film"]["high"])]
        if dry_permittivity is None
        else [dry_permittivity]
    )
    random = np.log(ratio) / np.log(water)
    rows, names, ends = [random], ["Brasher–Kingsbury"], [random]
    with np.errstate(invalid="ignore", divide="ignore"):
        for law in data["law"]:
            each = [
                np.where(x < water, _LAWS[law["id"]](ratio * x, x, water), np.nan)  # type: ignore[arg-type]
                for x in dry
            ]
            names.append(str(law["name"]))
            rows.append(np.mean(each, axis=0))
            if law["in_bracket"]:
                ends.extend(each)
        percent = 100 * np.array(rows)
        inside = 100 * np.array(ends)
        inside = np.where(np.abs(inside) <= 100, inside, np.nan)
        percent = np.where(np.abs(percent) <= 100, percent, np.nan)
    told = np.isfinite(inside)
    low = np.where(told.any(axis=0), np.where(told, inside, np.inf).min(axis=0), np.nan)
    high = np.where(told.any(axis=0), np.where(told, inside, -np.inf).max(axis=0), np.nan)
    return Bracket(tuple(names), percent, low, high)


def mass_percent(volume_percent: float, density_g_cm3: float, water_g_cm3: float = 1.0) -> float:
    """Grams of water per 100 g of dry film from the volume fraction in the wet film, no swelling
    counted: φ ρ_w/ρ. Brasher and Kingsbury compared with weighing in this way (from memory)."""
    return volume_percent * water_g_cm3 / density_g_cm3
