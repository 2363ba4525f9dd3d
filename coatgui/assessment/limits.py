"""When panels broke a limit: always between two readings, and only where their limits say so.

A reading is beyond the limit only where its whole 95 % interval is, short of it only where its
whole interval is; one whose interval holds the limit does not tell, and neither does a bound on the
wrong side or a frequency that was not reached. So the interval is wide enough to hold the crossing.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from coatgui.assessment.events import when
from coatgui.assessment.words import hertz, power_of_ten
from coatgui.assessment.words import hours as in_hours
from coatgui.records import Bound, Criterion, Limit, LimitCrossing, Modulus, Quantity, Side


@dataclass(frozen=True, slots=True)
class Crossed:
    """`after_h` None and `by_h` given: beyond before the first telling reading; `by_h` None: not
    beyond up to `watched_h`, the last telling reading. `again_short`: back on the good side
    later. `unclear_h`: a last reading on the limit."""

    after_h: float | None = None
    by_h: float | None = None
    watched_h: float | None = None
    again_short: bool = False
    unclear_h: float | None = None


def crossed(
    exposure_h: Sequence[float],
    quantities: Sequence[Quantity | None],
    value: float,
    side: Side = Side.BELOW,
) -> Crossed:
    """The interval in which a limit was first broken."""
    short_h: float | None = None
    beyond: tuple[float | None, float] | None = None
    watched_h: float | None = None
    unclear_h: float | None = None
    again = False
    for time, quantity in zip(exposure_h, quantities, strict=True):
        says = None if quantity is None else _is_below(quantity, value)
        if says is None:
            if quantity is not None and quantity.bound is Bound.TWO_SIDED:
                unclear_h = time
            continue
        watched_h, unclear_h = time, None
        if says == (side is Side.BELOW):
            beyond = beyond or (short_h, time)
        else:
            short_h = time
            again = again or beyond is not None
    if beyond is None:
        return Crossed(None, None, watched_h, False, unclear_h)
    return Crossed(beyond[0], beyond[1], watched_h, again)


def _is_below(quantity: Quantity, value: float) -> bool | None:
    """Whether a quantity lies below a value, above it, or cannot tell."""
    low, high = quantity.low, quantity.high
    if quantity.bound is Bound.FIXED:
        low = high = quantity.value
    if high is not None and high < value:
        return True
    if low is not None and low >= value:
        return False
    return None


def limit_crossing(
    criterion: Criterion, exposure_h: Sequence[float], moduli: Sequence[Modulus | None]
) -> LimitCrossing:
    """When |Z|·A first fell below the criterion. `moduli` are those at its frequency."""
    limit = f"{power_of_ten(criterion.ohm_cm2)} Ω cm² at {hertz(criterion.frequency_hz)}"
    found = crossed(
        exposure_h, [None if m is None else m.quantity for m in moduli], criterion.ohm_cm2
    )
    on_it = ""
    if found.unclear_h is not None:
        on_it = f" The reading at {in_hours(found.unclear_h)} lies on it within its limits."
    if found.watched_h is None:
        text = f"Nothing can be said about {limit}.{on_it}"
    elif found.by_h is None:
        text = f"Not below {limit} up to {in_hours(found.watched_h)}.{on_it}"
    else:
        text = f"Below {limit} {when(found.after_h, found.by_h, exposure_h[0])}"
        text += "; above it again later." if found.again_short else "."
    return LimitCrossing(criterion, found.after_h, found.by_h, text, found.watched_h)


def named(limit: Limit) -> str:
    """The limit as it stands in a sentence."""
    at = "" if limit.frequency_hz is None else f" at {hertz(limit.frequency_hz)}"
    return f"{power_of_ten(limit.value)} {limit.unit}{at}"
