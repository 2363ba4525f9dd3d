"""What a panel's capacitances say about its dry film and about the water that goes in.

The law and its fit are in `fick.py`; here it is decided what may be concluded.

* Fick's law is laid on all readings while the film soaks. Where a straight line in time after some
  reading explains what the law alone leaves over, that is a second stage of uptake (relaxation of
  the polymer, water at the metal, conducting pores): dry film, saturation and D then rest on the
  first stage, the second is named.
* Where neither describes all readings, they are dropped from the end until the rest follows, and
  how many followed is said.
* The dry film counts as known only where its limits are held by the readings and at least three of
  them lie before 95 % saturation. A dry value that was measured enters as a reading at 0 h.
* Two readings, or too few early ones: the share M rises with √t and bends down, so the chord
  through the first two readings meets t = 0 at or above the dry value. That is a bound, and a
  better one than the first reading. Where no rise is seen, the first reading is the bound.
* D is quoted only where a reading more than the law has unknowns checks it.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

from coatgui.assessment.amounts import NORMAL_95, from_logarithm, log_deviation, scaled
from coatgui.assessment.fick import FickFit, fickian_uptake, fit, misfits, second_stage
from coatgui.assessment.rules import rule
from coatgui.records import Bound, FloatArray, Quantity

__all__ = ["Sorption", "diffusion_coefficient", "dry_capacitance", "fickian_uptake"]

_SECONDS_PER_HOUR = 3600.0
_CM_PER_UM = 1e-4
_STAGE_UNKNOWNS = 5


@dataclass(frozen=True, slots=True)
class Sorption:
    """What the early readings of a panel say about its film and its water.

    `dry_capacitance`: two-sided where extrapolated or measured at 0 h, AT_MOST where only a bound
    could be had; `reference_h` is the exposure time of its reading (0 where extrapolated).
    `saturated_capacitance` and `log_rise` = ln(C_∞/C_0) come from the fit; `log_rise` is at least
    what it says where saturation was not reached. `rate_per_h` = D/L², in 1/h, is None where Fick's
    law does not fit, cannot be checked or the readings do not hold it from both sides. `misfit` is
    the root mean square of the weighted residuals (1 = the readings' own scatter), over the first
    `followed` readings; `second_stage_h` the inspections between which a second stage begins.
    """

    dry_capacitance: Quantity
    reference_h: float
    rate_per_h: Quantity | None = None
    misfit: float | None = None
    followed: int = 0
    text: str = ""
    saturated_capacitance: Quantity | None = None
    log_rise: Quantity | None = None
    second_stage_h: tuple[float, float] | None = None


def dry_capacitance(
    hours: Sequence[float],
    capacitance: Sequence[Quantity],
    method: str,
    measured_dry: Quantity | None = None,
) -> Sorption | None:
    """The dry film, the saturated film and the rate from a panel's readings while it soaks.

    `hours` (m,) ascending and not negative; `capacitance` (m,) on one basis, named by `method`.
    Readings that do not count, and those after a drying, are to be left away by the caller.
    `measured_dry` is a dry value measured apart, on the same basis. None where no reading has a
    capacitance with limits.
    """
    pairs = list(zip(hours, capacitance, strict=True))
    if measured_dry is not None and (not pairs or pairs[0][0] > 0):
        pairs.insert(0, (0.0, measured_dry))
    known = [(t, c, s) for t, c in pairs if c.value and (s := log_deviation(c)) is not None]
    if not known:
        return None
    time = np.array([t for t, _, _ in known], dtype=np.float64)
    y = np.log([float(c.value or 0) for _, c, _ in known])
    deviation = np.hypot([s for _, _, s in known], rule("capacitance.repeatability"))
    unit = known[0][1].unit
    found, why = _law(time, y, deviation)
    if found is not None:
        fick, count = found
        return _extrapolated(fick, count, time, unit, method)
    if time[0] == 0:
        dry = from_logarithm(
            math.exp(y[0]), float(deviation[0]), unit, f"measured at 0 h; {method}"
        )
        return Sorption(dry, 0.0, text="The dry capacitance is that of the reading at 0 h.")
    chord = _root_bound(time, y, deviation, unit, method)
    return chord or _first_reading(time[0], y[0], deviation[0], unit, method, why)


def _law(
    time: FloatArray, y: FloatArray, deviation: FloatArray
) -> tuple[tuple[FickFit, int] | None, str]:
    """The fit that may be used, with how many readings follow it; or None and why not."""
    early = int(rule("sorption.early_readings"))
    worst = rule("sorption.misfit")
    if time.size < early or time[early - 1] <= time[0]:
        return None, f"fewer than {early} readings"
    weight = 1 / deviation**2
    whole = misfits(time, y, weight)
    stage = _stage(time, y, deviation, early)
    if stage is not None and stage.misfit <= worst and stage.rise.value > 0:
        return _judged(stage, time.size, time, early)
    follows = np.flatnonzero(whole[early - 1 :] <= worst) + early
    follows = follows[time[follows - 1] > time[0]]
    for count in follows[::-1]:
        fick = fit(time[:count], y[:count], deviation[:count])
        if fick.rise.value > 0:
            return _judged(fick, int(count), time, early)
    return None, "the early readings do not follow Fick's law"


def _stage(time: FloatArray, y: FloatArray, deviation: FloatArray, early: int) -> FickFit | None:
    """The law with a second stage, where the readings demand one."""
    if time.size < _STAGE_UNKNOWNS + 1:
        return None
    place, both, single = second_stage(time, y, 1 / deviation**2, early)
    scale = max(1.0, both / (time.size - _STAGE_UNKNOWNS))
    if single - both <= rule("sorption.second_stage_gain") * scale:
        return None
    return fit(time, y, deviation, place)


def _judged(
    fick: FickFit, count: int, time: FloatArray, early: int
) -> tuple[tuple[FickFit, int] | None, str]:
    share = fickian_uptake(fick.rate_per_h.value * time[:count])
    before = int((share < rule("sorption.saturated")).sum())
    if not fick.closed or before < early:
        return None, "the film was near saturation before enough readings were taken"
    return (fick, count), ""


def _extrapolated(fick: FickFit, count: int, time: FloatArray, unit: str, method: str) -> Sorption:
    first_stage = count if fick.second_from is None else fick.second_from + 1
    how = f"Fickian sorption through the first {first_stage} readings; {method}"
    low, high = fick.dry.low, fick.dry.high
    assert low is not None  # closed, or it would not have come here
    assert high is not None
    dry = Quantity(
        math.exp(fick.dry.value),
        math.exp(low),
        math.exp(high),
        Bound.TWO_SIDED,
        unit,
        f"extrapolated to 0 h along {how}",
    )
    rate = None
    k = fick.rate_per_h
    if k.low is not None and k.high is not None and fick.freedom > 0:
        rate = Quantity(k.value, k.low, k.high, Bound.TWO_SIDED, "1/h", "Fickian sorption")
    full = fick.full
    assert full.low is not None
    if full.high is None:
        at_saturation = Quantity(
            math.exp(full.low), math.exp(full.low), None, Bound.AT_LEAST, unit, how
        )
        assert fick.rise.low is not None
        rise = Quantity(fick.rise.low, fick.rise.low, None, Bound.AT_LEAST, "", how)
    else:
        at_saturation = Quantity(
            math.exp(full.value),
            math.exp(full.low),
            math.exp(full.high),
            Bound.TWO_SIDED,
            unit,
            how,
        )
        rise = Quantity(fick.rise.value, fick.rise.low, fick.rise.high, Bound.TWO_SIDED, "", how)
    text = (
        f"Fickian sorption describes the first {first_stage} of {time.size} readings, with "
        f"residuals {fick.misfit:.1f} times their own scatter."
    )
    if fick.freedom <= 0:
        text += " No reading is left over to check the law, so no diffusion coefficient is given."
    stage = None
    if fick.second_from is not None:
        since = float(time[fick.second_from]), float(time[fick.second_from + 1])
        pace = f"({100 * fick.slope_per_h * 168:+.2g} percent a week)"
        if fick.slope_per_h > 0:
            stage = since
            text += (
                f" From {since[0]:g} h on the capacitance rises steadily {pace}: a second stage "
                "that one-stage diffusion does not explain; it is kept apart."
            )
        else:
            text += (
                f" From {since[0]:g} h on the capacitance falls steadily {pace}: the film changes "
                "or loses water; that part is kept apart."
            )
    return Sorption(dry, 0.0, rate, fick.misfit, first_stage, text, at_saturation, rise, stage)


def _root_bound(
    time: FloatArray, y: FloatArray, deviation: FloatArray, unit: str, method: str
) -> Sorption | None:
    """The bound by the chord on √t through the first two readings, where they rise."""
    later = np.flatnonzero(time > time[0])
    if not later.size:
        return None
    second = int(later[0])
    lever = math.sqrt(time[0]) / (math.sqrt(time[second]) - math.sqrt(time[0]))
    rise = float(y[second] - y[0])
    if rise <= NORMAL_95 * math.hypot(float(deviation[0]), float(deviation[second])):
        return None
    spread = math.hypot((1 + lever) * float(deviation[0]), lever * float(deviation[second]))
    bound = float(y[0]) - lever * rise + NORMAL_95 * spread
    if bound >= float(y[0]) + NORMAL_95 * float(deviation[0]):
        return None  # the chord says less than the first reading does
    most = math.exp(bound)
    named = (
        f"at most: √t line through the readings at {time[0]:g} and {time[second]:g} h met at 0 h; "
        f"{method}"
    )
    text = (
        "Too few early readings follow the uptake, so the dry capacitance is only bounded: the √t "
        f"line through the readings at {time[0]:g} and {time[second]:g} h. Every uptake is a lower "
        "bound."
    )
    return Sorption(Quantity(most, None, most, Bound.AT_MOST, unit, named), 0.0, text=text)


def _first_reading(
    hour: float, y: float, deviation: float, unit: str, method: str, why: str
) -> Sorption:
    most = math.exp(y + NORMAL_95 * deviation)
    named = f"taken from the first reading, at {hour:g} h, which was already wet ({why}); {method}"
    text = (
        f"The dry capacitance could not be extrapolated: {why}. The first reading, at {hour:g} h, "
        "serves as the reference, so every uptake is a lower bound."
    )
    bound = Quantity(most, None, most, Bound.AT_MOST, unit, named)
    return Sorption(bound, float(hour), text=text)


def diffusion_coefficient(sorption: Sorption, thickness_um: float | None) -> Quantity | None:
    """D = k L² in cm²/s; None where Fick's law does not hold the rate or no thickness is known."""
    if sorption.rate_per_h is None or thickness_um is None:
        return None
    rate = sorption.rate_per_h
    factor = (thickness_um * _CM_PER_UM) ** 2 / _SECONDS_PER_HOUR
    method = f"Fickian sorption into {thickness_um:g} µm from one face; {sorption.text}"
    return replace(scaled(rate, factor, "cm²/s"), method=method)
