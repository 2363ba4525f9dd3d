"""Numbers and counts as they stand in a sentence."""

from __future__ import annotations

from collections.abc import Sequence

_SUPERSCRIPT = str.maketrans("-0123456789", "⁻⁰¹²³⁴⁵⁶⁷⁸⁹")


def power_of_ten(value: float, digits: int = 2) -> str:
    """A number the way the trade writes it: 10⁷, 3.2·10⁹, but 42 and 0.5 as they are, with three
    digits. `digits` are those before the power."""
    if value < 0:
        return f"−{power_of_ten(-value, digits)}"
    plain = float(f"{value:.3g}")
    if plain == 0 or 0.001 <= plain < 10_000:
        return f"{plain:g}"
    mantissa, _, exponent = f"{value:.{digits - 1}e}".partition("e")
    if "." in mantissa:
        mantissa = mantissa.rstrip("0").rstrip(".")
    power = "10" + str(int(exponent)).translate(_SUPERSCRIPT)
    return power if mantissa == "1" else f"{mantissa}·{power}"


def hertz(frequency: float) -> str:
    """A frequency as it stands on a course: 10 kHz, 0.1 Hz, 0.01 Hz."""
    for factor, unit in ((1e9, "GHz"), (1e6, "MHz"), (1e3, "kHz")):
        if frequency >= factor:
            return f"{frequency / factor:.4g} {unit}"
    return f"{frequency:.4g} Hz" if frequency >= 1e-4 else f"{power_of_ten(frequency)} Hz"


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
