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
    """Three digits at most, the way the trade writes them: 3.2·10⁹, 4.5, −1.2."""
    if value is None or not math.isfinite(value):
        return NOTHING
    if value == 0:
        return "0"
    sign = "−" if value < 0 else ""
    return sign + power_of_ten(abs(value))


def amount(quantity: Quantity | None, *, limits: bool = True, unit: bool = False) -> str:
    """ "≥ 3·10⁹", "1.4 (1.2 to 1.5)", "cannot be determined", or a dash where there is nothing."""
    if quantity is None:
        return NOTHING
    if quantity.bound is Bound.UNDETERMINED or quantity.value is None:
        return KINDS[Bound.UNDETERMINED]
    text = SIGNS.get(quantity.bound, "") + number(quantity.value)
    if limits and quantity.bound is Bound.TWO_SIDED:
        text += f" ({number(quantity.low)} to {number(quantity.high)})"
    return f"{text} {quantity.unit}".rstrip() if unit else text


def hours(value: float | None) -> str:
    return NOTHING if value is None else f"{value:g}"


def state(findings: tuple[Finding, ...]) -> str:
    """The heaviest of the findings as sign and word; empty where there is none."""
    for severity in (Severity.REJECT, Severity.DOUBT, Severity.NOTE):
        if any(finding.severity is severity for finding in findings):
            return MARKS[severity]
    return ""
