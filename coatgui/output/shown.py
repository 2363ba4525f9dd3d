"""Numbers as they stand in the summary: rounded, with limits, a bound said as a bound."""

from __future__ import annotations

import math

from coatgui.assessment.words import power_of_ten
from coatgui.records import Bound, Finding, Quantity, Severity

KINDS = {
    Bound.TWO_SIDED: "between the limits",
    Bound.AT_LEAST: "at least",
    Bound.AT_MOST: "at most",
    Bound.FIXED: "fixed",
    Bound.UNDETERMINED: "cannot be determined",
}
SIGNS = {Bound.AT_LEAST: "≥ ", Bound.AT_MOST: "≤ "}
MARKS = {Severity.NOTE: "◦ note", Severity.DOUBT: "▲ doubt", Severity.REJECT: "■ rejected"}
NOTHING = "–"


def number(value: float | None) -> str:
    """Three digits at most, the way the trade writes them: 3.21·10⁹, 4.5, −1.2."""
    if value is None or not math.isfinite(value):
        return NOTHING
    exponent = _exponent(value)
    if exponent is None:
        text = f"{value:.3g}"
        return (f"{value:.0f}" if "e" in text else text).replace("-", "−")
    mantissa = f"{value / 10.0**exponent:.3g}".replace("-", "−")
    if mantissa in ("10", "−10"):
        mantissa, exponent = mantissa[:-1], exponent + 1
    power = power_of_ten(10.0**exponent)
    return power if mantissa == "1" else f"{mantissa}·{power}"


def _exponent(value: float) -> int | None:
    """The power of ten to take out of a number; None where it is written as it is."""
    size = abs(value)
    if size == 0 or 0.01 <= size < 10_000:
        return None
    return max(math.floor(math.log10(size)), -300)


def amount(quantity: Quantity | None, *, limits: bool = True, unit: bool = False) -> str:
    """ "≥ 3·10⁹", "1.4 (1.2 to 1.5)", "2.83 (2.80 to 2.86)·10¹⁰", "cannot be determined", or a
    dash where there is nothing."""
    if quantity is None:
        return NOTHING
    if quantity.bound is Bound.UNDETERMINED or quantity.value is None:
        return KINDS[Bound.UNDETERMINED]
    text = SIGNS.get(quantity.bound, "") + number(quantity.value)
    if limits and quantity.bound is Bound.TWO_SIDED:
        text = _with_limits(quantity.value, quantity.low, quantity.high)
    return f"{text} {quantity.unit}".rstrip() if unit else text


def _with_limits(value: float, low: float | None, high: float | None) -> str:
    """The three numbers, with their power of ten said once where that can be read."""
    numbers = (value, low, high)
    exponent = _exponent(value) if math.isfinite(value) else None
    if exponent is not None and low is not None and high is not None:
        mantissas = [n / 10.0**exponent for n in (value, low, high)]
        if all(0.1 <= abs(m) < 100 for m in mantissas):
            middle, bottom, top = (f"{m:.2f}".replace("-", "−") for m in mantissas)
            return f"{middle} ({bottom} to {top})·{power_of_ten(10.0**exponent)}"
    middle, bottom, top = map(number, numbers)
    return f"{middle} ({bottom} to {top})"


def hours(value: float | None) -> str:
    return NOTHING if value is None else f"{value:g}"


def state(findings: tuple[Finding, ...]) -> str:
    """The heaviest of the findings as sign and word; empty where there is none."""
    for severity in (Severity.REJECT, Severity.DOUBT, Severity.NOTE):
        if any(finding.severity is severity for finding in findings):
            return MARKS[severity]
    return ""
