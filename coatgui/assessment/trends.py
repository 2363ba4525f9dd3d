"""How a formulation's course runs, and what it would come to if it went on.

Every panel's values (logarithms where the quantity spreads over decades) are fitted with a level of
their own and a common shape in time: a plateau, a straight line, or two straight lines that meet at
an inspection. The shapes are weighed by AICc, with so much better asked of more parameters. The
slope of the last part is then found panel by panel; its limits are Student's t over the panels, for
the panel is the unit. With one panel they come from its scatter about the line.

A projection is made only where it is asked for, and refused where the readings do not bear it. Its
band is for a new panel: each panel's own line is carried on, and with mean m, standard deviation s
of the n carried values and scatter r of a reading about its line, it is m ± t √(s²(1+1/n) + r²).
It is not a prediction of service life.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from coatgui.assessment.courses import inspections, one_of_panel, student_95
from coatgui.assessment.quantities import Kind
from coatgui.assessment.rules import rule
from coatgui.assessment.words import hours, power_of_ten
from coatgui.records import (
    Bound,
    FloatArray,
    Projection,
    ProjectionWanted,
    Quantity,
    ReadingAssessment,
    Trend,
)

_FEWEST_INSPECTIONS = 4
_THOUSAND_H = 1000.0


@dataclass(frozen=True, slots=True)
class Table:
    """Footings of a formulation's panels (panels, inspections), NaN where missing; `bounded` says
    where a value is only a bound."""

    hours: FloatArray
    values: FloatArray
    bounded: FloatArray
    unit: str


@dataclass(frozen=True, slots=True)
class Shape:
    """`start` is the place of the inspection where the last part begins."""

    name: str
    start: int
    squares: float
    aicc: float


def course_table(readings: Sequence[ReadingAssessment], of: Kind) -> Table | None:
    """The course of one formulation's readings that count; None where fewer than two inspections
    have the quantity, or its units differ."""
    groups = inspections([r.exposure_h for r in readings if r.counts])
    column = {time: i for i, group in enumerate(groups) for time in group}
    cells: dict[str, dict[int, list[Quantity]]] = {}
    units = set()
    for reading in readings:
        quantity = of.take(reading) if reading.counts else None
        if quantity is None or quantity.value is None or (of.logarithmic and quantity.value <= 0):
            continue
        units.add(quantity.unit)
        own = cells.setdefault(reading.panel_id, {})
        own.setdefault(column[reading.exposure_h], []).append(quantity)
    if len(units) != 1:
        return None
    values = np.full((len(cells), len(groups)), np.nan)
    bounded = np.zeros_like(values)
    for row, own in enumerate(cells.values()):
        for place, several in own.items():
            one = one_of_panel(several, of.logarithmic)
            value = one.value or 0.0
            values[row, place] = math.log10(value) if of.logarithmic else value
            bounded[row, place] = one.bound in (Bound.AT_LEAST, Bound.AT_MOST)
    there = np.isfinite(values).any(axis=0)
    if there.sum() < 2:
        return None
    times = np.array([sum(group) / len(group) for group in groups])
    return Table(times[there], values[:, there], bounded[:, there], units.pop())


def shapes(table: Table) -> tuple[Shape, ...]:
    """The shapes by AICc, the best first; only the plateau where there are fewer than four
    inspections. The panels' levels are taken out by centring every panel's values, which leaves
    straight lines through the origin in one or two variables."""
    rows, columns = np.nonzero(np.isfinite(table.values))
    panels, count = table.values.shape[0], rows.size
    size = np.bincount(rows, minlength=panels)

    def centred(x: FloatArray) -> FloatArray:
        means = np.zeros((panels, *x.shape[1:]))
        np.add.at(means, rows, x)
        means /= size.reshape(-1, *([1] * (x.ndim - 1)))
        return np.asarray(x - means[rows], dtype=np.float64)

    y = centred(table.values[rows, columns])
    total = float(y @ y)
    found = [_shape("plateau", 0, total, panels, count)]
    if table.hours.size >= _FEWEST_INSPECTIONS:
        t = centred(table.hours[columns])
        t /= max(float(np.sqrt(t @ t)), 1e-300)
        along = float(t @ y)
        found.append(_shape("linear", 0, total - along**2, panels + 1, count))
        places = np.arange(1, table.hours.size - 2)
        late = np.maximum(0.0, table.hours[:, None] - table.hours[places])[columns]
        late = centred(late)
        late -= t[:, None] * (t @ late)
        length = np.maximum((late**2).sum(axis=0), 1e-300)
        gain = np.where(length > 1e-9, (y @ late) ** 2 / length, 0.0)
        best = int(np.argmax(gain))
        squares = total - along**2 - float(gain[best])
        found.append(_shape("segmented", int(places[best]), squares, panels + 3, count))
    return tuple(sorted((s for s in found if s is not None), key=lambda s: s.aicc))


def _shape(name: str, start: int, squares: float, parameters: int, count: int) -> Shape | None:
    spare = count - parameters - 2
    if spare <= 0:
        return None
    # Scatter below a thousandth of a decade is no evidence for a shape.
    squares = max(squares, 0.0) + count * 1e-6
    k = parameters + 1
    aicc = count * math.log(squares / count) + 2 * k + 2 * k * (k + 1) / spare
    return Shape(name, start, squares, aicc)


def _lines(table: Table, start: int) -> tuple[FloatArray, FloatArray, float]:
    """Level and slope of every panel's own line from an inspection on, (panels,) of those with
    three values, and the scatter of a reading about its line."""
    levels, slopes, squares, freedom = [], [], 0.0, 0
    for row in table.values[:, start:]:
        there = np.isfinite(row)
        if there.sum() < 3:
            continue
        t, y = table.hours[start:][there], row[there]
        middle = t - t.mean()
        slope = float(middle @ (y - y.mean()) / (middle @ middle))
        residual = y - y.mean() - slope * middle
        levels.append(float(y.mean() - slope * t.mean()))
        slopes.append(slope)
        squares += float(residual @ residual)
        freedom += t.size - 2
    scatter = math.sqrt(squares / freedom) if freedom else 0.0
    return np.array(levels), np.array(slopes), scatter


def trend(formulation: str, readings: Sequence[ReadingAssessment], of: Kind) -> Trend | None:
    """How a course runs; None for fewer than four inspections."""
    table = course_table(readings, of)
    if table is None or table.hours.size < _FEWEST_INSPECTIONS:
        return None
    found = shapes(table)
    if not found:
        return None
    chosen = found[0]
    # The simplest shape that is not clearly worse.
    for name in ("plateau", "linear"):
        simple = next((s for s in found if s.name == name), None)
        if simple is not None and simple.aicc - found[0].aicc < rule("trend.aicc_margin"):
            chosen = simple
            break
    unit = ("decades" if of.logarithmic else table.unit) + " in 1,000 h"
    slope = _slope(table, chosen.start, unit)
    if slope is None:
        return None
    since = (float(table.hours[max(chosen.start - 1, 0)]), float(table.hours[chosen.start]))
    if chosen.start:
        since = (since[0], float(table.hours[chosen.start + 1]))
    candidates = tuple((s.name, s.aicc) for s in found)
    text = _in_words(formulation, of, chosen, slope, since, table)
    return Trend(formulation, of.code, chosen.name, slope, since, candidates, text)


def _slope(table: Table, start: int, unit: str) -> Quantity | None:
    _, slopes, scatter = _lines(table, start)
    if not slopes.size:
        return None
    value = float(slopes.mean()) * _THOUSAND_H
    if slopes.size > 1:
        freedom = slopes.size - 1
        error = float(slopes.std(ddof=1)) / math.sqrt(slopes.size)
        method = f"mean of {slopes.size} panels' slopes"
    else:
        row = table.values[np.isfinite(table.values[:, start:]).sum(axis=1) >= 3][0, start:]
        t = table.hours[start:][np.isfinite(row)]
        freedom = max(t.size - 2, 1)
        error = scatter / math.sqrt(float(((t - t.mean()) ** 2).sum()))
        method = "slope of the only panel"
    half = student_95(freedom) * error * _THOUSAND_H
    return Quantity(value, value - half, value + half, Bound.TWO_SIDED, unit, method)


def _in_words(
    formulation: str,
    of: Kind,
    chosen: Shape,
    slope: Quantity,
    since: tuple[float, float],
    table: Table,
) -> str:
    course = f"{formulation}: {of.name}"
    if chosen.name == "plateau":
        text = f"{course} stays on its level up to {hours(float(table.hours[-1]))}"
    else:
        way = "rises" if (slope.value or 0.0) > 0 else "falls"
        span = float(table.hours[-1] - table.hours[chosen.start]) / _THOUSAND_H
        small = of.logarithmic and abs(slope.value or 0.0) * span < rule("trend.level_decades")
        text = f"{course} {way} by {abs(slope.value or 0.0):.2g} {slope.unit}"
        if small:
            text = f"{course} keeps its level within {rule('trend.level_decades'):g} decades"
        assert slope.low is not None
        assert slope.high is not None
        if slope.low < 0 < slope.high and not small:
            text += ", though the panels do not agree even on the direction"
        if chosen.name == "segmented":
            text += f", since some time between {hours(since[0])} and {hours(since[1])}"
    if table.bounded.any():
        text += "; some values are only bounds and enter at the bound"
    return text + "."


def project(
    formulation: str,
    readings: Sequence[ReadingAssessment],
    of: Kind,
    wanted: ProjectionWanted,
) -> Projection:
    """Carry a course on to an exposure time, or say why not."""
    table = course_table(readings, of)
    course = trend(formulation, readings, of)
    if table is None or course is None:
        return _refused(formulation, wanted, "it has fewer than four inspections")
    last = float(table.hours[-1])
    start = int(np.searchsorted(table.hours, course.since_h[0]))
    span = last - float(table.hours[start])
    levels, slopes, scatter = _lines(table, start)
    why = ""
    if wanted.until_h <= last:
        why = f"{hours(wanted.until_h)} is not beyond its last reading"
    elif table.hours.size - start < int(rule("projection.fewest_inspections")):
        why = "too few inspections lie in the last part of the course"
    elif slopes.size < int(rule("projection.fewest_panels")):
        why = "too few panels have three readings there"
    elif wanted.until_h - last > rule("projection.furthest_share") * span:
        furthest = last + rule("projection.furthest_share") * span
        why = f"that is too far: these readings reach to {hours(round(furthest))} at most"
    elif table.bounded[:, start:].any():
        why = "some of its values are only bounds"
    if why:
        return _refused(formulation, wanted, why)
    carried = levels + slopes * wanted.until_h
    middle = float(carried.mean())
    spread = float(carried.var(ddof=1)) * (1 + 1 / carried.size) + scatter**2
    half = student_95(carried.size - 1) * math.sqrt(spread)
    ends = [middle, middle - half, middle + half]
    value, low, high = [10.0**e for e in ends] if of.logarithmic else ends
    quantity = Quantity(
        value,
        low,
        high,
        Bound.TWO_SIDED,
        table.unit,
        f"{carried.size} panels' own lines since {hours(float(table.hours[start]))}, carried on",
    )
    text = (
        f"{formulation}: if {of.name} goes on as since {hours(float(table.hours[start]))}, a new "
        f"panel would read {power_of_ten(value)} {table.unit} at {hours(wanted.until_h)}, between "
        f"{power_of_ten(low)} and {power_of_ten(high)} in 95 of 100 cases. This carries a "
        f"laboratory course on by {hours(wanted.until_h - last)}; it is not a prediction of "
        "service life."
    )
    return Projection(formulation, wanted, quantity, text)


def _refused(formulation: str, wanted: ProjectionWanted, why: str) -> Projection:
    text = f"{formulation} is not carried on to {hours(wanted.until_h)}: {why}."
    return Projection(formulation, wanted, None, text)
