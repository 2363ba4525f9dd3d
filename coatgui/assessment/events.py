"""What happened to a panel, and between which two inspections.

An onset lies between the last reading that speaks against it and the first that shows it. A reading
that cannot tell (no fit, a bound too low) does not end the interval, it only widens it. Where no
reading speaks against it, the onset lies before the first that shows it and has no beginning: a
first reading cannot date an onset. An onset counts only where the next reading that can tell shows
it too; at the last reading it is given as unconfirmed.

What |Z| does is compared with `noise`, the scatter of one reading against its sister panels (see
`replicate_noise`), so that a wobble that all replicates share their part of is no event.

Readings that do not count are not among those passed in.
"""

from __future__ import annotations

import math
from bisect import insort
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from coatgui.assessment.fick import time_to_share
from coatgui.assessment.rules import rule
from coatgui.assessment.sorption import Sorption
from coatgui.assessment.words import hertz
from coatgui.assessment.words import hours as in_hours
from coatgui.records import (
    Bound,
    Event,
    Fit,
    FloatArray,
    Modulus,
    Quantity,
)


def when(after_h: float | None, by_h: float, first_h: float) -> str:
    if after_h is not None:
        return f"between {in_hours(after_h)} and {in_hours(by_h)}"
    if by_h <= first_h:
        return f"before the first reading, {in_hours(by_h)}"
    return f"before {in_hours(by_h)}; the readings before it cannot tell"


def _event(
    exposure_h: Sequence[float],
    after_h: float | None,
    by_h: float,
    code: str,
    what: str,
    confirmed: bool = True,
) -> Event:
    text = f"{what} {when(after_h, by_h, exposure_h[0])}"
    if not confirmed:
        text += "; only the last reading shows it, the next will confirm it or not"
    return Event(code, text + ".", after_h, by_h, confirmed)


def onset(
    exposure_h: Sequence[float], shown: Sequence[bool | None]
) -> tuple[float | None, float, bool] | None:
    """The interval of an onset and whether it is confirmed. `shown`: True, False, or None where a
    reading cannot tell. None where nothing lasting is shown."""
    told = [place for place, says in enumerate(shown) if says is not None]
    for rank, place in enumerate(told):
        if not shown[place]:
            continue
        last = rank == len(told) - 1
        if last or shown[told[rank + 1]]:
            after_h = exposure_h[told[rank - 1]] if rank else None
            return after_h, exposure_h[place], not last
    return None


def stage_events(
    exposure_h: Sequence[float],
    fits: Sequence[Fit | None],
    pore_resistance: Sequence[Quantity | None],
    conducting: Sequence[bool],
) -> list[Event]:
    """The pores begin to conduct, the interface to react, diffusion to limit it."""
    events = []
    for code, what, shown in (
        ("pores_conducting", "The pores conduct,", _opening(pore_resistance, conducting)),
        (
            "interface_reacting",
            "The interface reacts,",
            [None if fit is None else _holds(fit, "R_ct", "σ") for fit in fits],
        ),
        (
            "diffusion_control",
            "Diffusion limits the reaction,",
            [None if fit is None else _holds(fit, "σ") for fit in fits],
        ),
    ):
        found = onset(exposure_h, shown)
        if found is not None:
            after_h, by_h, confirmed = found
            events.append(_event(exposure_h, after_h, by_h, code, what, confirmed))
    return events


def _opening(
    resistance: Sequence[Quantity | None], conducting: Sequence[bool]
) -> list[bool | None]:
    """A reading speaks against conducting pores only where its R_po is at least higher than the
    R_po first seen, by both their limits; a film too resistive or a window too short to show R_po
    cannot tell."""
    seen = next((q for q, opened in zip(resistance, conducting, strict=True) if opened), None)
    least = seen.high if seen is not None and seen.high is not None else math.inf
    return [
        True if opened else (False if q is not None and q.low and q.low > least else None)
        for q, opened in zip(resistance, conducting, strict=True)
    ]


_HELD = (Bound.TWO_SIDED, Bound.AT_MOST)


def _holds(fit: Fit, *symbols: str) -> bool:
    return any(p.symbol in symbols and p.quantity.bound in _HELD for p in fit.parameters)


def sorption_events(
    exposure_h: Sequence[float], sorption: Sorption | None, capacitance: Sequence[Quantity | None]
) -> list[Event]:
    """The film is saturated (95 percent of what the first stage takes up), from the limits of the
    rate; a second stage begins."""
    if sorption is None or not exposure_h:
        return []
    what = "The film is saturated with water,"
    events = []
    if sorption.rate_per_h is not None:
        x = time_to_share(rule("sorption.saturated"))
        assert sorption.rate_per_h.low is not None
        assert sorption.rate_per_h.high is not None
        earliest, latest = x / sorption.rate_per_h.high, x / sorption.rate_per_h.low
        after_h = max((t for t in exposure_h if t <= earliest), default=None)
        by_h = min((t for t in exposure_h if t >= latest), default=None)
        if by_h is not None:
            events.append(_event(exposure_h, after_h, by_h, "film_saturated", what))
    elif sorption.reference_h > 0 and _no_rise(capacitance):
        events.append(_event(exposure_h, None, exposure_h[0], "film_saturated", what))
    if sorption.second_stage_h is not None:
        after_h, by_h = sorption.second_stage_h
        events.append(
            _event(
                exposure_h,
                after_h,
                by_h,
                "second_stage_sorption",
                "The capacitance leaves its plateau in a second stage,",
            )
        )
    return events


def _no_rise(capacitance: Sequence[Quantity | None]) -> bool:
    """At least three readings, none of which lies above the first beyond both limits."""
    told = [q for q in capacitance if q is not None and q.low and q.high]
    if len(told) < 3:
        return False
    allowed = (told[0].high or 0.0) * (1 + 2 * rule("capacitance.repeatability"))
    return all((q.low or 0.0) <= allowed for q in told[1:])


def replicate_noise(log_moduli: FloatArray) -> float | None:
    """Scatter of one reading of log₁₀|Z| against the sister panels: robust standard deviation of
    the steps between inspections, less the step that the panels share, over √2. `log_moduli`
    (panels, inspections), NaN where missing; None for fewer than three steps or panels too few."""
    if log_moduli.shape[0] < 2 or log_moduli.shape[1] < 2:
        return None
    steps = np.diff(log_moduli, axis=1)
    there = np.isfinite(steps).sum(axis=0) >= 2
    if not there.any():
        return None
    steps = steps[:, there]
    shared = np.nanmean(steps, axis=0)
    # The mean takes up one of n degrees of freedom.
    count = np.isfinite(steps).sum(axis=0)
    own = (steps - shared) * np.sqrt(count / (count - 1))
    own = own[np.isfinite(own)]
    if own.size < 3:
        return None
    return float(np.median(np.abs(own)) / 0.6745 / math.sqrt(2))


def fall_event(
    exposure_h: Sequence[float], moduli: Sequence[Modulus | None], noise: float | None
) -> Event | None:
    """|Z| leaves its level: below the median of the readings before by more than three times the
    noise and a rule's least fall, and so at the next reading too. Its beginning lies after the last
    reading that was still at that level within twice the noise."""
    least = max(rule("events.fall_decades"), 3 * (noise or 0.0))
    still = max(2 * (noise or 0.0), least / 3)
    known = [
        (time, math.log10(m.quantity.value), m)
        for time, m in zip(exposure_h, moduli, strict=True)
        if m is not None and m.quantity is not None and m.quantity.value
    ]
    before: list[float] = []
    for place in range(1, len(known)):
        insort(before, known[place - 1][1])
        level = (before[(place - 1) // 2] + before[place // 2]) / 2  # their median
        time, now, modulus = known[place]
        if level - now <= least:
            continue
        last = place == len(known) - 1
        if not last and level - known[place + 1][1] <= least:
            continue
        at_level = [t for t, value, _ in known[:place] if level - value <= still]
        what = f"|Z| at {hertz(modulus.frequency_hz)} left its level, by {level - now:.1f} decades,"
        return _event(exposure_h, at_level[-1], time, "modulus_falling", what, not last)
    return None


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
                    exposure_h[place - 1],
                    exposure_h[place],
                    "dried_out",
                    f"The film lost water (capacitance down by {fall:.0f} percent),",
                )
            )
        if now is not None and fall is None:
            if was_dry:
                events.append(
                    _event(
                        exposure_h,
                        exposure_h[place - 1],
                        exposure_h[place],
                        "wetted_again",
                        "The film took up water again,",
                    )
                )
            if highest is None or (now.value or 0) > (highest.value or 0):
                highest = now
        if now is not None:
            was_dry = fall is not None
        fallen.append(fall)
    return Drying(tuple(fallen), tuple(events))


def rebound_event(
    exposure_h: Sequence[float], moduli: Sequence[Modulus | None], noise: float | None = None
) -> Event | None:
    """The first rise of |Z| by half a decade (or three times the replicates' noise) above its
    lowest, after at least as deep a fall."""
    decades = max(rule("events.rebound_decades"), 3 * (noise or 0.0))
    highest, lowest, before_h = -math.inf, math.inf, 0.0
    for time, modulus in zip(exposure_h, moduli, strict=True):
        if modulus is None or modulus.quantity is None or not modulus.quantity.value:
            continue
        now = math.log10(modulus.quantity.value)
        if highest - lowest >= decades and now - lowest >= decades:
            what = f"|Z| at {hertz(modulus.frequency_hz)} rose again by {now - lowest:.1f} decades,"
            return _event(exposure_h, before_h, time, "rebound", what)
        if now >= highest:
            highest, lowest = now, now
        lowest = min(lowest, now)
        before_h = time
    return None
