"""How replicate panels of a formulation run together over exposure time.

The panel is the unit: several readings of one panel at one inspection are first made one. |Z|,
capacitance and resistance spread over decades, so their logarithms are averaged (geometric mean)
and the 95 % limits of the mean are Student's t on log₁₀ with one degree of freedom less than there
are panels; water uptake is averaged as it is. One panel alone has no spread between panels: it is
shown with its own limits. A reading under doubt stays in the mean, and the mean says how many there
are and what it would be without them (`doubts.py`). A panel that gives only a bound enters at that
bound and is counted as censored; then the mean is a bound of the same kind.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from functools import cache

from coatgui.assessment.doubts import doubtful, has_doubt
from coatgui.assessment.rules import rule
from coatgui.assessment.words import hertz
from coatgui.records import (
    Bound,
    Course,
    CoursePoint,
    Quantity,
    ReadingAssessment,
)

_ONE_SIDED = (Bound.AT_LEAST, Bound.AT_MOST)


def inspections(exposure_h: Sequence[float]) -> tuple[tuple[float, ...], ...]:
    """Exposure times put together to inspections: each within 2.5 % of the first of its group."""
    groups: list[list[float]] = []
    within = 1 + rule("inspection.same_within")
    for time in sorted(set(exposure_h)):
        if groups and time <= groups[-1][0] * within:
            groups[-1].append(time)
        else:
            groups.append([time])
    return tuple(tuple(group) for group in groups)


def by_inspection(
    readings: Sequence[ReadingAssessment], groups: Sequence[tuple[float, ...]]
) -> list[list[ReadingAssessment]]:
    """The readings of each inspection, in the order of `groups`; those of no group left away."""
    column = {time: place for place, group in enumerate(groups) for time in group}
    found: list[list[ReadingAssessment]] = [[] for _ in groups]
    for reading in readings:
        place = column.get(reading.exposure_h)
        if place is not None:
            found[place].append(reading)
    return found


@cache
def student_95(freedom: int) -> float:
    """97.5 % point of Student's t."""
    from scipy.special import stdtrit

    return float(stdtrit(freedom, 0.975))


@dataclass(frozen=True, slots=True)
class _Kind:
    code: str
    name: str
    logarithmic: bool
    take: Callable[[ReadingAssessment], Quantity | None]


def _kinds(modulus_frequencies_hz: Sequence[float]) -> list[_Kind]:
    def modulus(frequency_hz: float) -> Callable[[ReadingAssessment], Quantity | None]:
        def take(reading: ReadingAssessment) -> Quantity | None:
            at = reading.modulus_at(frequency_hz)
            return None if at is None else at.quantity

        return take

    kinds = [
        _Kind(f"modulus_{f:g}", f"|Z| at {hertz(f)}", True, modulus(f))
        for f in modulus_frequencies_hz
    ]
    kinds.append(
        _Kind("coating_capacitance", "Coating capacitance", True, lambda r: r.coating_capacitance)
    )
    kinds.append(_Kind("pore_resistance", "Pore resistance", True, lambda r: r.pore_resistance))
    kinds.append(
        _Kind(
            "water_uptake",
            "Apparent water uptake",
            False,
            lambda r: None if r.water_uptake is None else r.water_uptake.quantity,
        )
    )
    return kinds


def one_of_panel(quantities: Sequence[Quantity], logarithmic: bool) -> Quantity:
    """Repeats on one panel made one: their mean, with the widest limits and, if any is a bound, as
    a bound."""
    if len(quantities) == 1:
        return quantities[0]
    value = _mean([q.value or 0.0 for q in quantities], logarithmic)
    lows = [q.low for q in quantities if q.low is not None]
    highs = [q.high for q in quantities if q.high is not None]
    censored = next((q.bound for q in quantities if q.bound in _ONE_SIDED), None)
    first = quantities[0]
    return Quantity(
        value,
        value if censored is Bound.AT_LEAST else min(lows, default=None),
        value if censored is Bound.AT_MOST else max(highs, default=None),
        censored or first.bound,
        first.unit,
        f"mean of {len(quantities)} readings; {first.method}",
    )


def _mean(values: Sequence[float], logarithmic: bool) -> float:
    if logarithmic:
        return math.exp(math.fsum(math.log(value) for value in values) / len(values))
    return math.fsum(values) / len(values)


def replicate_mean(panels: Sequence[Quantity], logarithmic: bool) -> tuple[Quantity, int]:
    """Mean of panels with its 95 % limits, and how many panels are censored. `panels` not empty,
    all with a value (positive where `logarithmic`) and of one unit."""
    censored = [q.bound for q in panels if q.bound in _ONE_SIDED]
    if len(panels) == 1:
        return panels[0], len(censored)
    values = [q.value or 0.0 for q in panels]
    footing = [math.log10(value) for value in values] if logarithmic else values
    count = len(values)  # a handful: plain sums are quicker than arrays
    middle = math.fsum(footing) / count
    variance = math.fsum((x - middle) ** 2 for x in footing) / (count - 1)
    half = student_95(count - 1) * math.sqrt(variance / count)
    ends = (middle, middle - half, middle + half)
    value, low, high = (
        [10.0 ** min(max(end, -300.0), 300.0) for end in ends] if logarithmic else ends
    )
    method = ("geometric" if logarithmic else "arithmetic") + f" mean of {count} panels"
    if not censored:
        return Quantity(value, low, high, Bound.TWO_SIDED, panels[0].unit, method), 0
    method += f", {len(censored)} of them only bounds, taken at the bound"
    kinds = set(censored)
    if kinds == {Bound.AT_LEAST}:
        quantity = Quantity(value, low, None, Bound.AT_LEAST, panels[0].unit, method)
    elif kinds == {Bound.AT_MOST}:
        quantity = Quantity(value, None, high, Bound.AT_MOST, panels[0].unit, method)
    else:
        quantity = Quantity(value, None, None, Bound.UNDETERMINED, panels[0].unit, method)
    return quantity, len(censored)


def panel_values(
    readings: Sequence[ReadingAssessment],
    take: Callable[[ReadingAssessment], Quantity | None],
    logarithmic: bool,
) -> dict[str, Quantity]:
    """One quantity for each panel id, of the readings (of one inspection) that count and have it.
    Where some panels have an area and some have not, those without are left out: their values are
    not comparable."""
    by_panel: dict[str, list[Quantity]] = {}
    for reading in readings:
        quantity = take(reading) if reading.counts else None
        if quantity is None or quantity.value is None:
            continue
        if logarithmic and quantity.value <= 0:
            continue
        by_panel.setdefault(reading.panel_id, []).append(quantity)
    units = {q.unit for quantities in by_panel.values() for q in quantities}
    if len(units) > 1:
        normalised = {u for u in units if "cm²" in u}
        by_panel = {p: q for p, q in by_panel.items() if q[0].unit in normalised}
    return {panel: one_of_panel(q, logarithmic) for panel, q in by_panel.items()}


def courses(
    readings: Sequence[ReadingAssessment], modulus_frequencies_hz: Sequence[float]
) -> tuple[Course, ...]:
    """The courses of one formulation's readings; empty ones are left away."""
    groups = inspections([r.exposure_h for r in readings if r.counts])
    at_group = by_inspection(readings, groups)
    # Few readings have a doubt at all.
    suspects = [[r for r in there if r.counts and has_doubt(r)] for there in at_group]
    found = []
    for kind in _kinds(modulus_frequencies_hz):
        points = []
        for group, there, suspected in zip(groups, at_group, suspects, strict=True):
            values = panel_values(there, kind.take, kind.logarithmic)
            if not values:
                continue
            quantity, censored = replicate_mean(list(values.values()), kind.logarithmic)
            time = sum(group) / len(group)
            doubted = {r.panel_id for r in suspected if doubtful(r, kind.code)}
            rest = [q for panel_id, q in values.items() if panel_id not in doubted]
            points.append(
                CoursePoint(
                    time,
                    quantity,
                    len(values),
                    censored,
                    len(values) - len(rest),
                    replicate_mean(rest, kind.logarithmic)[0]
                    if 0 < len(rest) < len(values)
                    else None,
                )
            )
        if points:
            found.append(Course(kind.code, kind.name, tuple(points)))
    return tuple(found)
