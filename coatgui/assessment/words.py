"""Numbers and counts as they stand in a sentence."""

from __future__ import annotations

import math
from collections.abc import Sequence

_SUPERSCRIPT = str.maketrans("-0123456789", "⁻⁰¹²³⁴⁵⁶⁷⁸⁹")


def power_of_ten(value: float) -> str:
    """A positive number the way the trade writes it: 10⁷, 3.2·10⁹, but 42 and 0.5 as they are."""
    if 0.01 <= value < 10_000:
        return f"{value:.3g}"
    exponent = math.floor(math.log10(value))
    mantissa = f"{value / 10.0**exponent:.2g}"
    if mantissa == "10":
        mantissa, exponent = "1", exponent + 1
    power = "10" + str(exponent).translate(_SUPERSCRIPT)
    return power if mantissa == "1" else f"{mantissa}·{power}"


def counted(count: int, noun: str) -> str:
    """ "1 panel", "3 panels"."""
    return f"{count} {noun}" if count == 1 else f"{count} {noun}s"


def listed(names: Sequence[str]) -> str:
    """ "K", "K and M", "K, M and P"."""
    if len(names) < 2:
        return "".join(names)
    return ", ".join(names[:-1]) + " and " + names[-1]


def hours(value: float) -> str:
    return f"{value:g} h"
