"""What happened to a panel, and between which two inspections.

An event is only ever known to lie between the last reading before it and the first that shows it.
Readings that do not count are not among those passed in.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

from coatgui.assessment.rules import rule
from coatgui.assessment.words import hours as in_hours
from coatgui.assessment.words import power_of_ten
from coatgui.records import Bound, Criterion, Event, Fit, LimitCrossing, Modulus, Quantity


def _interval(exposure_h: Sequence[float], place: int) -> tuple[float | None, float]:
    return (exposure_h[place - 1] if place else None), exposure_h[place]


def _when(after_h: float | None, by_h: float) -> str:
    if after_h is None:
        return f"already at the first reading, {in_hours(by_h)}"
    return f"between {in_hours(after_h)} and {in_hours(by_h)}"


def _event(exposure_h: Sequence[float], place: int, code: str, what: str) -> Event:
    after_h, by_h = _interval(exposure_h, place)
    return Event(code, f"{what} {_when(after_h, by_h)}.", after_h, by_h)


def stage_events(
    exposure_h: Sequence[float],
    fits: Sequence[Fit | None],
    conducting: Sequence[bool],
) -> list[Event]:
    """The pores begin to conduct: the first reading for which `conducting` says so. The interface
    begins to react: the first model with a charge transfer or a diffusion tail that the data hold.
    """
    events = []
    open_pores = next((i for i, opened in enumerate(conducting) if opened), None)
    if open_pores is not None:
        events.append(_event(exposure_h, open_pores, "pores_conducting", "The pores conduct,"))
    reacting = next((i for i, fit in enumerate(fits) if fit and _reacts(fit)), None)
    if reacting is not None:
        events.append(_event(exposure_h, reacting, "interface_reacting", "The interface reacts,"))
    return events


def _reacts(fit: Fit) -> bool:
    held = (Bound.TWO_SIDED, Bound.AT_MOST)
    return any((q := fit.parameter(symbol)) and q.bound in held for symbol in ("R_ct", "σ"))


@dataclass(frozen=True, slots=True)
class Drying:
    """Where a soaking film's capacitance lies below an earlier one: the percentage for each reading
    (None where it does not), and the events."""

    fallen_percent: tuple[float | None, ...]
    events: tuple[Event, ...]

    @property
    def first(self) -> int:
        """Place of the first reading that dried; as many as there are readings if none did."""
        return next(
            (i for i, fall in enumerate(self.fallen_percent) if fall is not None),
            len(self.fallen_percent),
        )


def drying(exposure_h: Sequence[float], capacitance: Sequence[Quantity | None]) -> Drying:
    """Look for drops of a film's capacitance, all on one basis, beyond the limits of both readings
    and beyond the rule `events.dry_out_percent`."""
    least_fall = rule("events.dry_out_percent")
    fallen: list[float | None] = []
    events: list[Event] = []
    highest: Quantity | None = None
    was_dry = False
    for place, now in enumerate(capacitance):
        fall = None
        if now is not None and now.value and highest is not None and highest.value:
            percent = 100 * (1 - now.value / highest.value)
            apart = now.high is not None and highest.low is not None and now.high < highest.low
            if percent > least_fall and apart:
                fall = percent
        if fall is not None and not was_dry:
            events.append(
                _event(
                    exposure_h,
                    place,
                    "dried_out",
                    f"The film lost water (capacitance down by {fall:.0f} percent),",
                )
            )
        if now is not None and fall is None:
            if was_dry:
                events.append(
                    _event(exposure_h, place, "wetted_again", "The film took up water again,")
                )
            if highest is None or (now.value or 0) > (highest.value or 0):
                highest = now
        if now is not None:
            was_dry = fall is not None
        fallen.append(fall)
    return Drying(tuple(fallen), tuple(events))


def rebound_event(exposure_h: Sequence[float], moduli: Sequence[Modulus | None]) -> Event | None:
    """The first rise of |Z| by half a decade above its lowest, after at least as deep a fall."""
    decades = rule("events.rebound_decades")
    highest, lowest = -math.inf, math.inf
    for place, modulus in enumerate(moduli):
        if modulus is None or modulus.quantity is None or not modulus.quantity.value:
            continue
        now = math.log10(modulus.quantity.value)
        if highest - lowest >= decades and now - lowest >= decades:
            return _event(
                exposure_h,
                place,
                "rebound",
                f"|Z| at {modulus.frequency_hz:g} Hz rose again by {now - lowest:.1f} decades,",
            )
        if now >= highest:
            highest, lowest = now, now
        lowest = min(lowest, now)
    return None


def limit_crossing(
    criterion: Criterion, exposure_h: Sequence[float], moduli: Sequence[Modulus | None]
) -> LimitCrossing:
    """When |Z|·A first fell below the criterion.

    A bound from the leads above the limit counts as above; a bound below it says nothing, and so
    does a frequency that was not reached. `moduli` are those at the criterion's frequency.
    """
    limit = f"{power_of_ten(criterion.ohm_cm2)} Ω cm² at {criterion.frequency_hz:g} Hz"
    above_h: float | None = None
    below: tuple[float | None, float, Quantity] | None = None
    told = False
    again = False
    for time, modulus in zip(exposure_h, moduli, strict=True):
        quantity = None if modulus is None else modulus.quantity
        if quantity is None or quantity.value is None:
            continue
        is_below = quantity.value < criterion.ohm_cm2
        if is_below and quantity.bound is Bound.AT_LEAST:
            continue
        told = True
        if is_below:
            below = below or (above_h, time, quantity)
        else:
            above_h = time
            again = again or below is not None
    if not told:
        return LimitCrossing(criterion, None, None, f"Nothing can be said about {limit}.")
    if below is None:
        text = f"Not below {limit} up to {in_hours(above_h or 0.0)}."
        return LimitCrossing(criterion, None, None, text)
    after_h, by_h, quantity = below
    text = f"Below {limit} {_when(after_h, by_h)}"
    if quantity.high is not None and quantity.high > criterion.ohm_cm2:
        text += ", though within the limits of that reading it may still have been above"
    if again:
        text += "; above it again later"
    return LimitCrossing(criterion, after_h, by_h, text + ".")
