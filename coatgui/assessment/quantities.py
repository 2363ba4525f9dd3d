"""The quantities that can be compared, limited and followed, by their codes."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

from coatgui.assessment.words import hertz, listed
from coatgui.records import QUANTITIES, Quantity, ReadingAssessment

Take = Callable[[ReadingAssessment], Quantity | None]


@dataclass(frozen=True, slots=True)
class Kind:
    """`logarithmic`: spreads over decades, so it is its logarithm that is averaged and compared.
    `better` is +1 where more is better, −1 where less is."""

    code: str
    name: str
    logarithmic: bool
    better: int
    take: Take


def _modulus(frequency_hz: float) -> Take:
    def take(reading: ReadingAssessment) -> Quantity | None:
        for modulus in reading.modulus:
            if modulus.frequency_hz == frequency_hz:
                return modulus.quantity
        return None

    return take


def _uptake(reading: ReadingAssessment) -> Quantity | None:
    return None if reading.water_uptake is None else reading.water_uptake.quantity


def kind(quantity: str, frequency_hz: float | None = None) -> Kind:
    """The quantity of this code. Raises ValueError for a code that there is not."""
    if quantity == "modulus" and frequency_hz is not None:
        return Kind(
            f"modulus_{frequency_hz:g}",
            f"|Z| at {hertz(frequency_hz)}",
            True,
            1,
            _modulus(frequency_hz),
        )
    if quantity == "coating_capacitance":
        return Kind(quantity, "Coating capacitance", True, -1, lambda r: r.coating_capacitance)
    if quantity == "pore_resistance":
        return Kind(quantity, "Pore resistance", True, 1, lambda r: r.pore_resistance)
    if quantity == "water_uptake":
        return Kind(quantity, "Apparent water uptake", False, -1, _uptake)
    if quantity == "relative_permittivity":
        return Kind(quantity, "Effective permittivity", True, -1, lambda r: r.relative_permittivity)
    if quantity == "film_resistivity":
        return Kind(quantity, "Effective film resistivity", True, 1, lambda r: r.film_resistivity)
    raise ValueError(
        f"There is no quantity “{quantity}”. Known are {listed(list(QUANTITIES))}; the modulus "
        "needs a frequency."
    )
