"""Formulations against limits: who broke them, the curve of those that hold, a Weibull distribution
where the readings bear one, and in words how little a few panels say."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence

from coatgui.assessment.courses import inspections, one_of_panel
from coatgui.assessment.limits import crossed, named
from coatgui.assessment.quantities import Kind, kind
from coatgui.assessment.survival import curve, exact_limits, weibull
from coatgui.assessment.words import counted, hours, listed
from coatgui.records import (
    Bound,
    Criterion,
    Limit,
    LimitStudy,
    PanelAssessment,
    Quantity,
    ReadingAssessment,
    Side,
    Standing,
    WeibullFit,
)


def limit_studies(
    readings: Mapping[str, Sequence[ReadingAssessment]], limits: Sequence[Limit]
) -> tuple[LimitStudy, ...]:
    """Every formulation's readings, by name, against every limit; formulations of which no panel
    tells anything are left away."""
    studies = []
    for limit in limits:
        for formulation, own in readings.items():
            standings = panel_standings(own, limit)
            if standings:
                studies.append(_study(limit, formulation, standings))
    return tuple(studies)


def criterion_studies(
    panels: Sequence[PanelAssessment], formulations: Sequence[str], criteria: Sequence[Criterion]
) -> tuple[LimitStudy, ...]:
    """The campaign's own criteria, from the crossings that its panels already carry."""
    studies = []
    for criterion in criteria:
        for formulation in formulations:
            standings = tuple(
                Standing(p.panel, c.after_h, c.by_h, c.watched_h)
                for p in panels
                if p.formulation == formulation
                for c in p.limit_crossings
                if c.criterion == criterion and c.watched_h is not None
            )
            if standings:
                studies.append(_study(Limit.of_criterion(criterion), formulation, standings))
    return tuple(studies)


def panel_standings(readings: Sequence[ReadingAssessment], limit: Limit) -> tuple[Standing, ...]:
    """Each panel against a limit; those that tell nothing, or have another unit, are left away."""
    of = kind(limit.quantity, limit.frequency_hz)
    panels: dict[str, list[ReadingAssessment]] = {}
    for reading in readings:
        if reading.counts:
            panels.setdefault(reading.panel_id, []).append(reading)
    standings = []
    for own in panels.values():
        times, quantities = _series(own, of)
        told = [q if q is not None and q.unit == limit.unit else None for q in quantities]
        found = crossed(times, told, limit.value, limit.side)
        if found.watched_h is not None:
            standings.append(Standing(own[0].panel, found.after_h, found.by_h, found.watched_h))
    return tuple(standings)


def _series(
    own: Sequence[ReadingAssessment], of: Kind
) -> tuple[list[float], list[Quantity | None]]:
    """One panel's quantity at each inspection, repeats made one."""
    times, quantities = [], []
    for group in inspections([r.exposure_h for r in own]):
        there = [q for r in own if r.exposure_h in group and (q := of.take(r)) is not None]
        usable = [q for q in there if q.value is not None and (not of.logarithmic or q.value > 0)]
        times.append(group[0])
        quantities.append(one_of_panel(usable, of.logarithmic) if usable else None)
    return times, quantities


def interval(standing: Standing) -> tuple[float, float]:
    """The interval (L, R] that holds a panel's time, R infinite where it still holds."""
    if standing.by_h is None:
        return standing.watched_h or 0.0, math.inf
    return standing.after_h or 0.0, standing.by_h


def _study(limit: Limit, formulation: str, standings: tuple[Standing, ...]) -> LimitStudy:
    after_h, by_h = zip(*(interval(s) for s in standings), strict=True)
    distribution = weibull(after_h, by_h)
    return LimitStudy(
        limit,
        formulation,
        standings,
        curve(after_h, by_h),
        distribution,
        _in_words(limit, formulation, standings, distribution),
    )


def _in_words(
    limit: Limit,
    formulation: str,
    standings: Sequence[Standing],
    distribution: WeibullFit | None,
) -> str:
    side = "below" if limit.side is Side.BELOW else "above"
    total = len(standings)
    broken = [s for s in standings if s.by_h is not None]
    until = min(s.watched_h or 0.0 for s in standings)
    where = f"{side} {named(limit)}"
    if not broken:
        _, most = exact_limits(0, total)
        return (
            f"{formulation}: none of {counted(total, 'panel')} is {where} up to {hours(until)}. "
            f"With so few, up to {100 * most:.0f} percent of such panels could be by then."
        )
    who = "all" if len(broken) == total else f"{len(broken)} of {total}"
    text = f"{formulation}: {who} panels {where}"
    before = [s.panel for s in broken if s.after_h is None]
    if before:
        text += f", {listed(before)} before the first reading that tells"
    dated = [s for s in broken if s.after_h is not None]
    if dated:
        first = min(s.after_h or 0.0 for s in dated)
        last = max(s.by_h or 0.0 for s in dated)
        text += f"{', the others' if before else ','} between {hours(first)} and {hours(last)}"
    text += "."
    if distribution is None:
        return text + " Too few broke it, or all at once, for a distribution of times."
    median = distribution.median_h
    if median.bound is Bound.TWO_SIDED:
        assert median.low is not None
        assert median.high is not None
        text += (
            f" By a Weibull distribution half would be by {median.value:.3g} h, 95 percent limits "
            f"{median.low:.3g} to {median.high:.3g} h"
        )
        if median.high > 3 * median.low:
            text += f": {counted(total, 'panel')} say little"
        return text + "."
    return text + f" {counted(total, 'panel')} are too few to hold the time by which half would be."
