"""The figures of the summary, from an assessment."""

from __future__ import annotations

import math
from collections.abc import Iterator, Sequence

from coatgui.assessment.words import counted, listed
from coatgui.output.document import Figure
from coatgui.output.drawing import Drawing, Plot, span_of
from coatgui.output.exposure_map import exposure_maps
from coatgui.output.figure_parts import (
    WIDTH,
    Take,
    ink_of,
    modulus_taken,
    shortened,
    uptake_taken,
    watched_frequency,
)
from coatgui.output.shown import amount
from coatgui.output.spectrum_figures import spectrum_figures
from coatgui.records import Assessment, Bound, Campaign, Course, Quantity, ReadingAssessment

_MOST_LINES = 60  # panels drawn one by one in a course


def all_figures(assessment: Assessment, campaign: Campaign) -> tuple[Figure, ...]:
    """Every figure that the assessment gives; none where there is nothing to draw."""
    return (
        *exposure_maps(assessment),
        *course_figures(assessment),
        *comparison_figures(assessment),
        *spectrum_figures(assessment, campaign),
    )


# ---------------------------------------------------------------------------------------------
# Courses


def course_figures(assessment: Assessment) -> Iterator[Figure]:
    """|Z|·A, film capacitance, pore resistance and water uptake over exposure time."""
    frequencies = list(
        dict.fromkeys(m.frequency_hz for r in assessment.readings for m in r.modulus)
    )
    wanted: list[tuple[str, str, str, str, str, Take]] = [
        (
            f"modulus_{f:g}",
            f"|Z|·A at {f:g} Hz",
            "Ω cm²",
            "log",
            "root",
            modulus_taken(f),
        )
        for f in frequencies
    ]
    wanted += [
        (
            "coating_capacitance",
            "Film capacitance",
            "F/cm²",
            "log",
            "root",
            lambda r: r.coating_capacitance,
        ),
        ("pore_resistance", "Pore resistance", "Ω cm²", "log", "root", lambda r: r.pore_resistance),
        ("water_uptake", "Apparent water uptake", "vol-%", "linear", "root", uptake_taken),
    ]
    for code, name, unit, kind, across, take in wanted:
        figure = _course(assessment, code, name, unit, kind, across, take)
        if figure is not None:
            yield figure


def _course(
    assessment: Assessment, code: str, name: str, unit: str, kind: str, across: str, take: Take
) -> Figure | None:
    readings = [(r, q) for r in assessment.readings if r.counts and (q := take(r)) is not None]
    readings = [(r, q) for r, q in readings if q.unit == unit]
    x = span_of([r.exposure_h for r, _ in readings], across)
    y = span_of([q.value for _, q in readings], kind)
    if x is None or y is None:
        return None
    names = [f.formulation for f in assessment.formulations] or sorted(
        {r.formulation for r, _ in readings}
    )
    legend = 14.0 * math.ceil(len(names) / 2)
    drawing = Drawing(WIDTH, 246 + legend)
    plot = Plot(
        drawing,
        (62.0, 8.0, WIDTH - 8, 212.0),
        (*x, across),
        (*y, kind),
        ("Exposure time (h), on a scale of its square root", f"{name} ({unit})"),
    )
    means = {f.formulation: c for f in assessment.formulations for c in f.courses if c.code == code}
    panels = dict.fromkeys(r.panel_id for r, _ in readings)
    for place, formulation in enumerate(names):
        colour, shape, dashes = ink_of(place)
        if len(panels) <= _MOST_LINES:
            for panel_id in panels:
                own = [
                    (r, q)
                    for r, q in readings
                    if r.panel_id == panel_id and r.formulation == formulation
                ]
                _panel_line(plot, own, colour, shape)
        if formulation in means:
            _mean_line(plot, means[formulation], colour, dashes)
        across_x = 62.0 + (place % 2) * (WIDTH - 70) / 2
        down = 212.0 + 40 + 14 * (place // 2)
        drawing.line([(across_x, down - 3), (across_x + 26, down - 3)], colour, 1.8, dashes)
        drawing.mark(shape, (across_x + 13, down - 3), colour, 2.6)
        drawing.text((across_x + 32, down), shortened(formulation, 40), size=8)
    bounds = sum(q.bound in (Bound.AT_LEAST, Bound.AT_MOST) for _, q in readings)
    undrawn = sum(q.value is None or (kind == "log" and q.value <= 0) for _, q in readings)
    caption = (
        f"{name} over exposure time. Marks: panels; thick lines: means of the panels of a "
        "formulation with their 95 % limits"
        + (" (geometric means)." if kind == "log" else ".")
        + (
            " Arrows: values that are only bounds, pointing to where they may lie."
            if bounds
            else ""
        )
        + (f" {counted(undrawn, 'value')} could not be drawn." if undrawn else "")
    )
    return Figure(code, drawing, caption, _course_words(name, unit, means, names))


def _panel_line(
    plot: Plot, own: Sequence[tuple[ReadingAssessment, Quantity]], colour: str, shape: str
) -> None:
    places = [(plot.at(r.exposure_h, q.value), q) for r, q in own]
    plot.drawing.line([at for at, _ in places if at is not None], colour, 0.4)
    for at, quantity in places:
        if at is None:
            continue
        if quantity.bound in (Bound.AT_LEAST, Bound.AT_MOST):
            plot.drawing.arrow(at, quantity.bound is Bound.AT_LEAST, colour)
        plot.drawing.mark(shape, at, colour, 2.3)


def _mean_line(plot: Plot, course: Course, colour: str, dashes: str) -> None:
    line = [at for p in course.points if (at := plot.at(p.exposure_h, p.quantity.value))]
    plot.drawing.line(line, colour, 1.8, dashes)
    _, top, _, bottom = plot.frame
    for point in course.points:
        low = plot.at(point.exposure_h, point.quantity.low)
        high = plot.at(point.exposure_h, point.quantity.high)
        if low is None or high is None:
            continue
        ends = [(low[0], min(low[1], bottom)), (high[0], max(high[1], top))]
        plot.drawing.line(ends, colour, 0.9)
        for x, y in ends:
            if top < y < bottom:
                plot.drawing.line([(x - 2.5, y), (x + 2.5, y)], colour, 0.9)


def _course_words(name: str, unit: str, means: dict[str, Course], names: Sequence[str]) -> str:
    said = []
    for formulation in names:
        if formulation in means:
            first, last = means[formulation].points[0], means[formulation].points[-1]
            said.append(
                f"{formulation} from {amount(first.quantity, limits=False)} at "
                f"{first.exposure_h:g} h to {amount(last.quantity, limits=False)} at "
                f"{last.exposure_h:g} h"
            )
    return f"Line plot of {name} in {unit}: " + ("; ".join(said) or "single panels only") + "."


# ---------------------------------------------------------------------------------------------
# Comparison


def comparison_figures(assessment: Assessment) -> Iterator[Figure]:
    """The formulations' means with their limits at the inspection they are compared at."""
    comparison, frequency_hz = assessment.comparison, watched_frequency(assessment)
    if comparison is None or comparison.exposure_h is None or frequency_hz is None:
        return
    groups = {rank.formulation: rank.group for rank in comparison.ranks}
    rows = []
    for place, formulation in enumerate(assessment.formulations):
        course = next(
            (c for c in formulation.courses if c.code == f"modulus_{frequency_hz:g}"), None
        )
        point = course and min(
            course.points, key=lambda p: abs(p.exposure_h - (comparison.exposure_h or 0.0))
        )
        if point and formulation.formulation in groups:
            rows.append((place, formulation.formulation, point.quantity))
    ends = [v for _, _, q in rows for v in (q.value, q.low, q.high)]
    x = span_of(ends, "log")
    if x is None:
        return
    drawing = Drawing(WIDTH, 52 + 22.0 * len(rows))
    left, bottom = 190.0, 14 + 22.0 * len(rows)
    unit = rows[0][2].unit
    plot = Plot(
        drawing,
        (left, 6.0, WIDTH - 30, bottom),
        (*x, "log"),
        (0.0, 1.0, "linear"),
        (f"|Z|·A at {frequency_hz:g} Hz ({unit})", ""),
    )
    for i, (place, name, quantity) in enumerate(rows):
        colour, shape, _ = ink_of(place)
        y = 20 + 22.0 * i
        drawing.text((left - 8, y + 3), shortened(name, 32), anchor="end", size=8)
        low, middle, high = (plot.x(v) for v in (quantity.low, quantity.value, quantity.high))
        if low is not None and high is not None:
            drawing.line([(low, y), (high, y)], colour, 1.4)
            for end in (low, high):
                drawing.line([(end, y - 4), (end, y + 4)], colour, 1.4)
        if middle is not None:
            drawing.mark(shape, (middle, y), colour, 3.5, colour)
            if quantity.bound is Bound.AT_LEAST:
                drawing.line([(middle, y), (middle + 16, y), (middle + 12, y - 3)], colour, 1)
        drawing.text((WIDTH - 22, y + 3), groups[name], size=9, bold=True)
    yield Figure(
        "comparison",
        drawing,
        f"{comparison.what} at {comparison.exposure_h:g} h: geometric means of the panels with "
        "their 95 % limits. Formulations that share a letter at the right cannot be told apart.",
        "Interval plot: "
        + listed([f"{name} {amount(q)}, group {groups[name]}" for _, name, q in rows])
        + ".",
    )
