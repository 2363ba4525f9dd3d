"""Settings, limits and means in formulas: what a reader may change, and what follows for panels and
formulations."""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass
from typing import Any

import numpy as np

from coatgui.assessment.courses import inspections, student_95
from coatgui.assessment.mixing import VACUUM_F_PER_CM
from coatgui.assessment.rules import table
from coatgui.output.cells import Book, Column, Formula, Value, letter
from coatgui.output.live_cells import (
    BELOW,
    COLOURS,
    HOURS,
    SCIENTIFIC,
    Places,
    agrees,
    state_column,
)
from coatgui.output.shown import KINDS
from coatgui.records import (
    Assessment,
    Campaign,
    Course,
    CoursePoint,
    FormulationAssessment,
    LimitCrossing,
    PanelAssessment,
    Quantity,
    ReadingAssessment,
)

_MOST_PANELS = 200  # of a formulation whose means are formulas
_FARTHEST = 300.0  # decades: beyond them a number cannot be written
_FIRST_PANEL = 12  # the column of the first panel in the sheet Courses, counted from 0


# ---------------------------------------------------------------------------------------------
# Settings


def add_settings(book: Book, campaign: Campaign, places: Places) -> None:
    """The numbers that formulas use, each in a named cell, and the campaign's other settings."""
    settings = campaign.settings
    water, bands = table("water")["permittivity"], table("criteria")["bands"]
    own = "Setting of the campaign."
    rows: list[tuple[str, Value, str, str, str]] = [
        (
            "temperature where neither reading nor panel has one",
            settings.temperature_c,
            "°C",
            "temperature_c",
            own,
        ),
    ]
    rows += [
        (f"limit: {c.name}, at {c.frequency_hz:g} Hz", c.ohm_cm2, "Ω cm²", f"limit_{i}", c.source)
        for i, c in enumerate(places.criteria, start=1)
    ]
    at = f"at {bands['frequency_hz']:g} Hz"
    rows += [
        (
            f"band: good from, {at}",
            float(bands["good_from_ohm_cm2"]),
            "Ω cm²",
            "band_good",
            bands["source"],
        ),
        (
            f"band: poor below, {at}",
            float(bands["poor_below_ohm_cm2"]),
            "Ω cm²",
            "band_poor",
            bands["source"],
        ),
        (
            "permittivity of vacuum ε₀",
            VACUUM_F_PER_CM,
            "F/cm",
            "vacuum_permittivity_f_per_cm",
            "CODATA 2018.",
        ),
    ]
    rows += [
        (
            f"permittivity of water, coefficient of t^{i}",
            float(a),
            "",
            f"water_a{i}",
            water["source"],
        )
        for i, a in enumerate(water["coefficients"])
    ]
    rows += [
        ("that law holds from", float(water["from_c"]), "°C", "water_from_c", water["source"]),
        ("that law holds to", float(water["to_c"]), "°C", "water_to_c", water["source"]),
    ]
    frequencies = " and ".join(f"{f:g}" for f in settings.modulus_frequencies_hz)
    rows += [
        ("|Z|·A is given at", frequencies, "Hz", "", own),
        ("high frequency for the capacitance", settings.capacitance_frequency_hz, "Hz", "", own),
        ("mains frequency", settings.mains_hz, "Hz", "", own),
        ("leads taken away", "yes" if settings.take_leads_away else "no", "", "", own),
        *((f"threshold {name}", value, "", "", own) for name, value in settings.thresholds),
    ]
    columns: list[Column[Any]] = [
        Column("what", lambda row: row[0]),
        Column("value", lambda row: row[1], to_edit=True),
        Column("unit", lambda row: row[2]),
        Column("name in formulas", lambda row: row[3]),
        Column("source", lambda row: row[4]),
    ]
    book.add_sheet("Settings", columns, rows)
    for number, row in enumerate(rows, start=2):
        if row[3]:
            book.name(row[3], "Settings", f"B{number}")


# ---------------------------------------------------------------------------------------------
# Limits


def add_limits(book: Book, assessment: Assessment, places: Places) -> None:
    """Between which readings each panel fell below each limit, from the sheet Modulus."""
    rows = [(p, c) for p in assessment.panels for c in p.limit_crossings]

    def found(after: bool) -> Callable[[tuple[PanelAssessment, LimitCrossing]], Value]:
        def value(row: tuple[PanelAssessment, LimitCrossing]) -> Value:
            panel, crossing = row
            now = crossing.after_h if after else crossing.by_h
            at = places.modulus_rows.get((panel.panel_id, crossing.criterion.frequency_hz))
            if at is None or crossing.criterion not in places.criteria:
                return now
            state, held = state_column(places.criteria.index(crossing.criterion) + 1)
            wanted = held if after else "C"
            shown = f"Modulus!${wanted}${at[0]}:${wanted}${at[1]}"
            states = f"Modulus!${state}${at[0]}:${state}${at[1]}"
            text = f'IFERROR(INDEX({shown},MATCH("{BELOW}",{states},0)),"")'
            return Formula(text, "" if now is None else now)

        return value

    columns: list[Column[Any]] = [
        Column("formulation", lambda row: row[0].formulation),
        Column("panel", lambda row: row[0].panel),
        Column("limit", lambda row: row[1].criterion.name),
        Column("frequency (Hz)", lambda row: row[1].criterion.frequency_hz),
        Column("last held at (h)", found(after=True), HOURS),
        Column("first below at (h)", found(after=False), HOURS),
        Column("watched up to (h)", lambda row: row[1].watched_h, HOURS),
        Column("standing, as the program found it", lambda row: row[1].text),
        Column("source", lambda row: row[1].criterion.source),
    ]
    book.add_sheet("Limits", columns, rows, standing=2)


# ---------------------------------------------------------------------------------------------
# Means


@dataclass(frozen=True, slots=True)
class _Mean:
    """A row: a formulation's mean at an inspection; `panels` holds for each panel the readings
    that enter. Without them the mean is a number, not a formula."""

    formulation: FormulationAssessment
    course: Course
    point: CoursePoint
    panels: tuple[tuple[ReadingAssessment, ...], ...]

    @property
    def logarithmic(self) -> bool:
        return self.course.code != "water_uptake"


def _quantity(reading: ReadingAssessment, code: str) -> Quantity | None:
    if code.startswith("modulus_"):
        return next(
            (m.quantity for m in reading.modulus if f"modulus_{m.frequency_hz:g}" == code), None
        )
    if code == "water_uptake":
        return reading.water_uptake.quantity if reading.water_uptake else None
    found: Quantity | None = getattr(reading, code, None)
    return found


def _footing(quantity: Quantity, logarithmic: bool) -> float:
    assert quantity.value is not None
    return math.log10(quantity.value) if logarithmic else quantity.value


def _entering(
    readings: list[ReadingAssessment], course: Course, point: CoursePoint, logarithmic: bool
) -> tuple[tuple[ReadingAssessment, ...], ...]:
    """The readings that the mean is of, panel by panel; nothing where the program's own mean does
    not follow from them."""
    by_panel: dict[str, list[ReadingAssessment]] = {}
    values: dict[str, list[float]] = {}
    for reading in readings:
        quantity = _quantity(reading, course.code)
        if quantity is None or quantity.value is None or quantity.unit != point.quantity.unit:
            continue
        if logarithmic and quantity.value <= 0:
            continue
        by_panel.setdefault(reading.panel_id, []).append(reading)
        values.setdefault(reading.panel_id, []).append(_footing(quantity, logarithmic))
    if not by_panel or len(by_panel) != point.panels or len(by_panel) > _MOST_PANELS:
        return ()
    means = np.array([np.mean(own) for own in values.values()])
    value = float(means.mean())
    if logarithmic and not abs(value) < _FARTHEST:
        return ()
    if not agrees(10.0**value if logarithmic else value, point.quantity.value):
        return ()
    if len(means) == 1 and any(len(own) > 1 for own in by_panel.values()):
        return ()
    if len(means) > 1 and point.quantity.low is not None:
        half = student_95(len(means) - 1) * float(means.std(ddof=1)) / math.sqrt(len(means))
        low = 10.0 ** (value - half) if logarithmic else value - half
        if not agrees(low, point.quantity.low):
            return ()
    return tuple(tuple(own) for own in by_panel.values())


def _means(assessment: Assessment) -> list[_Mean]:
    own: dict[str, list[ReadingAssessment]] = {}
    for reading in assessment.readings:
        if reading.counts:
            own.setdefault(reading.formulation, []).append(reading)
    rows = []
    for formulation in assessment.formulations:
        readings = own.get(formulation.formulation, [])
        at_time: dict[float, list[ReadingAssessment]] = {}
        for group in inspections([r.exposure_h for r in readings]):
            those = [r for r in readings if r.exposure_h in group]
            at_time[float(np.mean(group))] = those
        for course in formulation.courses:
            logarithmic = course.code != "water_uptake"
            for point in course.points:
                there = at_time.get(point.exposure_h, [])
                entering = _entering(there, course, point, logarithmic)
                rows.append(_Mean(formulation, course, point, entering))
    return rows


def add_courses(
    book: Book, assessment: Assessment, places: Places
) -> dict[tuple[str, str], tuple[int, int]]:
    """Means of the panels of each formulation with their t-limits, from the sheets of the
    quantities. Returns the first and last row of each formulation and quantity."""
    rows = _means(assessment)
    most = max((len(row.panels) for row in rows), default=0)
    last_panel = letter(_FIRST_PANEL + max(most, 1) - 1)
    range_text = f"{letter(_FIRST_PANEL)}{{r}}:{last_panel}{{r}}"

    def cells(row: _Mean, reading: ReadingAssessment) -> tuple[str, str, str, str] | None:
        return places.cells.get((row.course.code, reading.reading_id))

    def live(row: _Mean) -> bool:
        return bool(row.panels) and all(cells(row, r) for own in row.panels for r in own)

    def mean(which: str) -> Callable[[_Mean], Value]:
        def value(row: _Mean) -> Value:
            now: float | None = getattr(row.point.quantity, which)
            if now is None or not live(row):
                return now
            if len(row.panels) == 1:
                place = cells(row, row.panels[0][0])
                assert place is not None
                return Formula(place[{"value": 0, "low": 2, "high": 3}[which]], now)
            half = f"TINV(0.05,COUNT({range_text})-1)*STDEV({range_text})/SQRT(COUNT({range_text}))"
            text = f"AVERAGE({range_text})"
            text += {"value": "", "low": f"-{half}", "high": f"+{half}"}[which]
            return Formula(f"10^({text})" if row.logarithmic else text, now)

        return value

    def panel(place: int) -> Callable[[_Mean], Value]:
        def value(row: _Mean) -> Value:
            if place >= len(row.panels) or not live(row):
                return None
            own = row.panels[place]
            where = [c[1] for r in own if (c := cells(row, r))]
            now = float(
                np.mean(
                    [
                        _footing(q, row.logarithmic)
                        for r in own
                        if (q := _quantity(r, row.course.code)) is not None
                    ]
                )
            )
            return Formula(where[0] if len(where) == 1 else f"AVERAGE({','.join(where)})", now)

        return value

    columns: list[Column[Any]] = [
        Column("formulation", lambda row: row.formulation.formulation),
        Column("quantity", lambda row: row.course.name),
        Column("exposure (h)", lambda row: row.point.exposure_h, HOURS),
        Column(
            "√ of exposure (√h)",
            lambda row: Formula("SQRT(C{r})", math.sqrt(row.point.exposure_h)),
            "0.000",
        ),
        Column("mean", mean("value"), SCIENTIFIC),
        Column("low 95 %", mean("low"), SCIENTIFIC),
        Column("high 95 %", mean("high"), SCIENTIFIC),
        Column("kind", lambda row: KINDS[row.point.quantity.bound]),
        Column("unit", lambda row: row.point.quantity.unit),
        Column("kind of mean", lambda row: row.point.quantity.method),
        Column("panels", lambda row: row.point.panels),
        Column("of these only bounds", lambda row: row.point.censored),
        *(
            Column(f"panel {i + 1}, log₁₀ (uptake: as it is)", panel(i), "0.000")
            for i in range(max(most, 1))
        ),
        Column("panels under doubt", lambda row: row.point.doubtful),
        Column(
            "mean without them", lambda row: getattr(row.point.sound, "value", None), SCIENTIFIC
        ),
        Column(
            "mean without them, low 95 %",
            lambda row: getattr(row.point.sound, "low", None),
            SCIENTIFIC,
        ),
        Column(
            "mean without them, high 95 %",
            lambda row: getattr(row.point.sound, "high", None),
            SCIENTIFIC,
        ),
    ]
    book.add_sheet("Courses", columns, rows, colours=COLOURS, standing=3)
    ranges: dict[tuple[str, str], tuple[int, int]] = {}
    for number, row in enumerate(rows, start=2):
        key = row.formulation.formulation, row.course.code
        ranges[key] = (ranges.get(key, (number, number))[0], number)
    return ranges
