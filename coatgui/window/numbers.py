"""Numbers as the window shows them: engineering prefixes, limits, and bounds in words."""

from __future__ import annotations

import math
from functools import lru_cache

from coatgui.records import Bound, Quantity

_PREFIXES = {-15: "f", -12: "p", -9: "n", -6: "µ", -3: "m", 0: "", 3: "k", 6: "M", 9: "G", 12: "T"}
_PLAIN_UNITS = ("", "vol-%", "%", "h", "decades")
WORDS = {
    Bound.TWO_SIDED: "two-sided",
    Bound.AT_LEAST: "→ at least",
    Bound.AT_MOST: "← at most",
    Bound.FIXED: "fixed",
    Bound.UNDETERMINED: "∅ cannot be determined",
}


@lru_cache(maxsize=4096)  # the words of ticks come again and again
def prefixed(value: float, unit: str, digits: int = 3) -> str:
    """A number with an engineering prefix: 1.31 nF/cm², 10 mHz."""
    if value == 0 or not math.isfinite(value):
        return f"{value:g} {unit}".strip()
    if unit in _PLAIN_UNITS:
        return f"{value:.{digits}g} {unit}".strip()
    power = min(max(3 * math.floor(math.log10(abs(value)) / 3 + 1e-9), -15), 12)
    scaled = value / 10.0**power
    if abs(float(f"{scaled:.{digits}g}")) >= 1000 and power < 12:
        power += 3
        scaled /= 1000.0
    scaled = float(f"{scaled:.{digits}g}")
    places = max(digits - 1 - math.floor(math.log10(abs(scaled))), 0)
    number = f"{scaled:.{places}f}"
    if not unit[:1].isalpha() and unit[:1] not in "Ω°":
        return f"{value:.{digits}g} {unit}"
    return f"{number} {_PREFIXES[power]}{unit}"


def said(quantity: Quantity | None, digits: int = 3) -> str:
    """A quantity with its limits as a person says it."""
    if quantity is None:
        return "–"
    if quantity.bound is Bound.UNDETERMINED or quantity.value is None:
        return "cannot be determined"
    if quantity.low and quantity.high and quantity.high < 1.02 * quantity.low:
        digits += 1  # narrow limits need one more digit to show that they are two
    number = prefixed(quantity.value, quantity.unit, digits)
    if quantity.bound is Bound.AT_LEAST:
        return f"at least {number}"
    if quantity.bound is Bound.AT_MOST:
        return f"at most {number}"
    if quantity.low is None or quantity.high is None:
        return number
    low = prefixed(quantity.low, quantity.unit, digits)
    high = prefixed(quantity.high, quantity.unit, digits)
    # A unit that all three share is said once.
    unit = number.partition(" ")[2]
    if low.partition(" ")[2] == high.partition(" ")[2]:
        low = low.partition(" ")[0]
        high = high.partition(" ")[0] if high.partition(" ")[2] == unit else high
    return f"{number} ({low}–{high})"
