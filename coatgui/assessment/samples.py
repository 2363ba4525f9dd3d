"""One value a panel for a comparison: at an inspection, over the course, until a limit, rated."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field

import numpy as np

from coatgui.assessment.comparison import FEWEST_PANELS, entry
from coatgui.assessment.courses import by_inspection, inspections, one_of_panel, panel_values
from coatgui.assessment.doubts import doubtful
from coatgui.assessment.limit_studies import interval, panel_standings
from coatgui.assessment.limits import named
from coatgui.assessment.quantities import Kind, kind
from coatgui.assessment.ratings import NOTHING_RATED, Rated, rated_entries
from coatgui.assessment.significance import Entry
from coatgui.assessment.words import hours
from coatgui.records import (
    Bound,
    Judge,
    Quantity,
    Question,
    ReadingAssessment,
    Side,
)

Readings = Mapping[str, Sequence[ReadingAssessment]]


@dataclass(frozen=True, slots=True)
class Samples:
    """`by_name`: entries of every formulation's panels, empty where nothing can be compared, for
    the reason in `text`. `bounded` counts the panels of each that only gave a bound, `doubtful`
    those with a reading under doubt. `unit` is that of differences on the footing; `what` and
    `when` name the comparison in a sentence."""

    by_name: dict[str, list[Entry]]
    what: str
    when: str
    exposure_h: float | None = None
    unit: str = ""
    better: int = 1
    text: str = ""
    doubtful: Mapping[str, int] = field(default_factory=dict)

    @property
    def bounded(self) -> dict[str, int]:
        return {name: sum(e.censored for e in own) for name, own in self.by_name.items()}


def samples(question: Question, readings: Readings, seen: Rated = NOTHING_RATED) -> Samples:
    """The samples for a question. Raises ValueError for one that cannot be understood."""
    if question.judge is Judge.RATING:
        found = rated_entries(question.scale, question.exposure_h, readings, seen)
        when = "" if found.exposure_h is None else f"at {hours(found.exposure_h)}"
        return Samples(found.by_name, found.what, when, found.exposure_h, text=found.text)
    of = kind(question.quantity, question.frequency_hz)
    if question.judge is Judge.TIME_TO_LIMIT:
        return _until_limit(question, readings)
    if question.judge is Judge.AREA_UNDER_COURSE:
        return _over_course(question, of, readings)
    return _at_time(question, of, readings)


def _name(of: Kind) -> str:
    return of.name.replace("|Z| at", "|Z|·A at")


def _footing(of: Kind, quantity: Quantity) -> float:
    value = quantity.value or 0.0
    return math.log10(value) if of.logarithmic else value


def _unit(of: Kind, quantities: Sequence[Quantity]) -> str:
    return "decades" if of.logarithmic else (quantities[0].unit if quantities else "")


def _at_time(question: Question, of: Kind, readings: Readings) -> Samples:
    time, values = _shared(question.exposure_h, of, readings)
    if time is None:
        return Samples(
            {},
            _name(of),
            "",
            text=f"The formulations share no inspection with {_name(of)}, so they are not "
            "compared.",
        )
    by_name = {
        name: [entry(q, _footing(of, q), of.better) for q in panels]
        for name, panels in values.items()
    }
    anyone = [q for panels in values.values() for q in panels]
    counting = {name: [r for r in own if r.counts] for name, own in readings.items()}
    times = [r.exposure_h for own in counting.values() for r in own]
    group = next(g for g in inspections([time, *times]) if time in g)
    doubted = {
        name: len({r.panel_id for r in own if r.exposure_h in group and doubtful(r, of.code)})
        for name, own in counting.items()
    }
    return Samples(
        by_name,
        _name(of),
        f"at {hours(time)}",
        time,
        _unit(of, anyone),
        of.better,
        doubtful=doubted,
    )


def _shared(
    exposure_h: float | None, of: Kind, readings: Readings
) -> tuple[float | None, dict[str, list[Quantity]]]:
    """The wanted inspection, or the last at which every formulation has two panels with a value, or
    else one."""
    times = [r.exposure_h for group in readings.values() for r in group if r.counts]
    groups = inspections(times)
    if exposure_h is not None:
        groups = tuple(g for g in groups if g[0] <= exposure_h <= g[-1])
    at = {name: by_inspection(own, groups) for name, own in readings.items()}
    single: tuple[float, dict[str, list[Quantity]]] | None = None
    for place, group in reversed(list(enumerate(groups))):
        values = {
            name: list(panel_values(own[place], of.take, of.logarithmic).values())
            for name, own in at.items()
        }
        fewest = min(len(panels) for panels in values.values())
        one_unit = len({q.unit for panels in values.values() for q in panels}) == 1
        if fewest >= FEWEST_PANELS and one_unit:
            return float(np.mean(group)), values
        if fewest and single is None and one_unit:
            single = float(np.mean(group)), values
    return single or (None, {})


def _over_course(question: Question, of: Kind, readings: Readings) -> Samples:
    """The time average of the footing, over the span that all panels cover: from the latest first
    reading to the earliest last one (or the wanted end)."""
    series = {name: _courses(of, own) for name, own in readings.items()}
    every = [s for own in series.values() for s in own]
    what = f"{_name(of)} averaged over the course"
    none = Samples({}, what, "", text=f"There is no span that all panels cover with {_name(of)}.")
    if not every or any(not own for own in series.values()):
        return none
    start = max(s.times[0] for s in every)
    end = min(s.times[-1] for s in every)
    if question.exposure_h is not None:
        end = min(end, question.exposure_h)
    if end <= start or len({s.unit for s in every}) > 1:
        return none
    by_name = {
        name: [
            entry(
                Quantity(0.0, None, None, s.bound(start, end), ""), s.average(start, end), of.better
            )
            for s in own
        ]
        for name, own in series.items()
    }
    unit = "decades" if of.logarithmic else every[0].unit
    return Samples(by_name, what, f"from {hours(start)} to {hours(end)}", end, unit, of.better)


@dataclass(frozen=True, slots=True)
class _Course:
    times: tuple[float, ...]
    footings: tuple[float, ...]
    bounds: tuple[Bound, ...]
    unit: str

    def average(self, start: float, end: float) -> float:
        inner = [t for t in self.times if start < t < end]
        grid = np.array([start, *inner, end])
        height = np.interp(grid, self.times, self.footings)
        return float(np.trapezoid(height, grid) / (end - start))

    def bound(self, start: float, end: float) -> Bound:
        one_sided = {
            b
            for t, b in zip(self.times, self.bounds, strict=True)
            if start <= t <= end and b in (Bound.AT_LEAST, Bound.AT_MOST)
        }
        if not one_sided:
            return Bound.TWO_SIDED
        return one_sided.pop() if len(one_sided) == 1 else Bound.UNDETERMINED


def _courses(of: Kind, readings: Sequence[ReadingAssessment]) -> list[_Course]:
    panels: dict[str, dict[float, list[Quantity]]] = {}
    for reading in readings:
        quantity = of.take(reading) if reading.counts else None
        if quantity is None or quantity.value is None or (of.logarithmic and quantity.value <= 0):
            continue
        panels.setdefault(reading.panel_id, {}).setdefault(reading.exposure_h, []).append(quantity)
    found = []
    for own in panels.values():
        if len(own) < 2:
            continue
        times = tuple(sorted(own))
        one = [one_of_panel(own[t], of.logarithmic) for t in times]
        found.append(
            _Course(
                times, tuple(_footing(of, q) for q in one), tuple(q.bound for q in one), one[0].unit
            )
        )
    return found


def _until_limit(question: Question, readings: Readings) -> Samples:
    limit = question.limit
    if limit is None:
        raise ValueError("A comparison by the time to a limit needs the limit.")
    side = "below" if limit.side is Side.BELOW else "above"
    by_name: dict[str, list[Entry]] = {}
    for name, own in readings.items():
        ends = [interval(s) for s in panel_standings(own, limit)]
        # Later is better; where it still holds, the truth is open upwards.
        by_name[name] = [Entry(a if math.isinf(b) else (a + b) / 2, a, b) for a, b in ends]
    what = f"the time until {side} {named(limit)}"
    if not all(by_name.values()):
        return Samples({}, what, "", text=f"Not every formulation says anything about {what}.")
    return Samples(by_name, what, "")
