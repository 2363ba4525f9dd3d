"""The exposure map: panels × exposure times, one shaded and numbered cell a reading."""

from __future__ import annotations

import math
from collections.abc import Iterator, Sequence

from coatgui.assessment.courses import inspections
from coatgui.assessment.words import counted
from coatgui.output.document import Figure
from coatgui.output.drawing import GRID, INK, PAPER, SECOND, Drawing, drawable
from coatgui.output.figure_parts import (
    WIDTH,
    Take,
    between,
    modulus_taken,
    shortened,
    watched_frequency,
)
from coatgui.records import Assessment, Bound, Quantity, ReadingAssessment, Severity

_ROWS_OF_MAP, _COLUMNS_OF_MAP = 36, 12
# Light to dark in one hue; the number stands in every cell.
_PALE, _DEEP = (0xEE, 0xF3, 0xF1), (0x1E, 0x5A, 0x56)


def exposure_maps(assessment: Assessment) -> Iterator[Figure]:
    """Panels × inspections, log₁₀|Z|·A in every cell; as many pictures as it takes."""
    frequency_hz = watched_frequency(assessment)
    if frequency_hz is None:
        return
    take = modulus_taken(frequency_hz)
    groups = inspections([r.exposure_h for r in assessment.readings])
    column_of = {time: i for i, group in enumerate(groups) for time in group}
    cells: dict[tuple[str, int], ReadingAssessment] = {}
    for reading in assessment.readings:
        cells[reading.panel_id, column_of[reading.exposure_h]] = reading
    values = [
        q.value
        for r in assessment.readings
        if (q := take(r)) and q.value and drawable(q.value, "log")
    ]
    ends = (min(values), max(values)) if values else (1.0, 10.0)
    rows = [(panel.panel_id, panel.panel, panel.formulation) for panel in assessment.panels]
    parts = [
        (rows[i : i + _ROWS_OF_MAP], range(j, min(j + _COLUMNS_OF_MAP, len(groups))))
        for i in range(0, len(rows), _ROWS_OF_MAP)
        for j in range(0, len(groups), _COLUMNS_OF_MAP)
    ]
    for place, (own, columns) in enumerate(parts, start=1):
        times = [f"{groups[c][0]:g}" for c in columns]
        drawing = _map(own, columns, times, cells, take, ends)
        where = f", part {place} of {len(parts)}" if len(parts) > 1 else ""
        yield Figure(
            f"map_{place}",
            drawing,
            f"Exposure map{where}: log₁₀ of |Z|·A (Ω cm²; Ω where a panel has no area) at "
            f"{frequency_hz:g} Hz, panel by panel, at each exposure time in hours. Darker is "
            "higher. ▲ a doubt, ■ rejected, ≥ at least, ≤ at most, – no value; an empty cell "
            "was not measured.",
            f"Table picture of {counted(len(own), 'panel')} at exposure times from {times[0]} to "
            f"{times[-1]} h. Every number in it stands in the table of readings as well.",
        )


def _map(
    rows: Sequence[tuple[str, str, str]],
    columns: Sequence[int],
    times: Sequence[str],
    cells: dict[tuple[str, int], ReadingAssessment],
    take: Take,
    ends: tuple[float, float],
) -> Drawing:
    left, top, height = 92.0, 20.0, 17.0
    bands = [i for i, row in enumerate(rows) if i == 0 or row[2] != rows[i - 1][2]]
    drawing = Drawing(WIDTH, top + height * (len(rows) + len(bands)) + 4)
    width = min((WIDTH - left) / len(columns), 60.0)
    drawing.text((left - 6, top - 6), "hours", anchor="end", size=7.5, colour=SECOND)
    for place, time in enumerate(times):
        drawing.text((left + (place + 0.5) * width, top - 6), time, anchor="middle", size=8)
    y = top
    for i, (panel_id, panel, formulation) in enumerate(rows):
        if i in bands:
            drawing.text((0, y + 12), shortened(formulation, 80), size=8, bold=True)
            y += height
        drawing.text((left - 6, y + 12), shortened(panel, 14), anchor="end", size=8)
        for place, column in enumerate(columns):
            reading = cells.get((panel_id, column))
            x = left + place * width
            if reading is None:
                drawing.box(x, y, width - 1.5, height - 1.5, "none", GRID)
                continue
            text, fill, ink = _cell(reading, take(reading), ends)
            drawing.box(x, y, width - 1.5, height - 1.5, fill, GRID)
            drawing.text((x + width / 2 - 0.75, y + 11), text, anchor="middle", size=8, colour=ink)
        y += height
    return drawing


def _cell(
    reading: ReadingAssessment, quantity: Quantity | None, ends: tuple[float, float]
) -> tuple[str, str, str]:
    """Text, ground and ink of a cell."""
    mark = ""
    if not reading.counts:
        return "■", PAPER, INK
    if any(f.severity is Severity.DOUBT for f in reading.findings):
        mark = " ▲"
    if quantity is None or not quantity.value or not drawable(quantity.value, "log"):
        return f"–{mark}", PAPER, INK
    share = (math.log10(quantity.value) - math.log10(ends[0])) / (
        math.log10(ends[1] / ends[0]) or 1.0
    )
    colour = between(_PALE, _DEEP, share)
    sign = {Bound.AT_LEAST: "≥", Bound.AT_MOST: "≤"}.get(quantity.bound, "")
    ink = "#FFFFFF" if share > 0.68 else INK
    return f"{sign}{math.log10(quantity.value):.1f}{mark}", colour, ink
