"""Good, fair, poor: the bands of `resources/criteria.toml`, which no standard fixes."""

from __future__ import annotations

from coatgui.assessment.rules import table
from coatgui.records import Modulus, Quantity

CANNOT_TELL = "cannot tell"


def band(quantity: Quantity) -> str:
    """Good, fair or poor where the whole 95 % interval (Ω cm²) lies in one band."""
    bands = table("criteria")["bands"]
    good, poor = float(bands["good_from_ohm_cm2"]), float(bands["poor_below_ohm_cm2"])
    low, high = quantity.low, quantity.high
    if low is not None and low >= good:
        return "good"
    if high is not None and high < poor:
        return "poor"
    if low is not None and high is not None and low >= poor and high < good:
        return "fair"
    return CANNOT_TELL


def band_of(modulus: Modulus) -> str | None:
    """The band of a reading's modulus; None at another frequency than that of the bands, where the
    panel has no area, and where nothing was measured."""
    quantity = modulus.quantity
    if quantity is None or quantity.unit != "Ω cm²":
        return None
    if modulus.frequency_hz != float(table("criteria")["bands"]["frequency_hz"]):
        return None
    return band(quantity)
