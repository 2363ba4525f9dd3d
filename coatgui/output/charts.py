"""Native charts of the workbook, drawn from its own cells, so that they follow every change."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

from coatgui.assessment.words import counted
from coatgui.output.cells import Book, Column, clean
from coatgui.output.figure_parts import INKS, shortened
from coatgui.output.live_cells import Places
from coatgui.records import Assessment, Campaign, ReadingAssessment

if TYPE_CHECKING:
    from openpyxl.chart import ScatterChart
    from openpyxl.worksheet.worksheet import Worksheet

_MOST_LINES = 12  # series in one chart
_MOST_CHARTS = 24  # of one kind
MOST_POINTS = 60_000  # of spectra that are written without being asked for
_WIDE, _HIGH = 20.0, 10.5  # cm
_ROWS_EACH = 22  # rows of a sheet that a chart takes
_GRID = "D9D3C7"
_MARKS = ("circle", "square", "triangle", "diamond", "x", "star")
_DASHES = ("solid", "dash", "sysDot", "dashDot", "lgDash", "sysDashDot")


@dataclass(frozen=True, slots=True)
class _Line:
    """A series: the sheet, the cell of its name, columns of x and y, first and last row."""

    sheet: Worksheet
    name: str
    x: int
    y: int
    first: int
    last: int


def _chart(
    title: str, across: str, up: str, lines: Sequence[_Line], *, log_x: bool, log_y: bool
) -> ScatterChart:
    from openpyxl.chart import Reference, ScatterChart, Series
    from openpyxl.chart.axis import ChartLines
    from openpyxl.chart.data_source import StrRef
    from openpyxl.chart.series import SeriesLabel
    from openpyxl.chart.shapes import GraphicalProperties
    from openpyxl.drawing.line import LineProperties

    chart: Any = ScatterChart()
    chart.title, chart.width, chart.height = clean(title), _WIDE, _HIGH
    chart.style = 1
    chart.x_axis.title, chart.y_axis.title = across, up
    chart.x_axis.delete = chart.y_axis.delete = False  # or newer spreadsheet programs hide them
    chart.x_axis.crosses = chart.y_axis.crosses = "min"
    chart.x_axis.number_format = "0E+00" if log_x else "General"
    chart.y_axis.number_format = "0E+00" if log_y else "General"
    for axis in (chart.x_axis, chart.y_axis):
        axis.majorGridlines = ChartLines(
            spPr=GraphicalProperties(ln=LineProperties(solidFill=_GRID))
        )
    chart.legend.position = "r"
    if log_x:
        chart.x_axis.scaling.logBase = 10
    if log_y:
        chart.y_axis.scaling.logBase = 10
    for place, line in enumerate(lines):
        x = Reference(line.sheet, min_col=line.x, min_row=line.first, max_row=line.last)
        y = Reference(line.sheet, min_col=line.y, min_row=line.first, max_row=line.last)
        series: Any = Series(y, x)
        series.tx = SeriesLabel(strRef=StrRef(f"'{line.sheet.title}'!{line.name}"))
        colour = INKS[place % len(INKS)].lstrip("#")
        series.marker.symbol, series.marker.size = _MARKS[place % len(_MARKS)], 6
        series.marker.graphicalProperties.solidFill = "FFFFFF"
        series.marker.graphicalProperties.line.solidFill = colour
        series.graphicalProperties.line.solidFill = colour
        series.graphicalProperties.line.dashStyle = _DASHES[place % len(_DASHES)]
        series.graphicalProperties.line.width = 15_000
        series.smooth = False
        chart.series.append(series)
    return chart  # type: ignore[no-any-return]


class _Page:
    """Charts one under the other, two abreast."""

    def __init__(self, sheet: Worksheet) -> None:
        self.sheet = sheet
        self.count = 0

    def add(self, chart: ScatterChart) -> None:
        from openpyxl.worksheet.pagebreak import Break

        row = 1 + _ROWS_EACH * (self.count // 2)
        if self.count and self.count % 4 == 0:  # four charts to a printed page
            self.sheet.row_breaks.append(Break(id=row - 1))
        self.sheet.add_chart(chart, f"{'AL'[self.count % 2]}{row}")
        self.count += 1


def add_charts(
    book: Book,
    assessment: Assessment,
    places: Places,
    ranges: dict[tuple[str, str], tuple[int, int]],
) -> None:
    """The means of the formulations, then the panels of each formulation."""
    page = _Page(book.add_page("Charts"))
    courses = book.workbook["Courses"]
    wanted = dict.fromkeys((code, c.name) for f in assessment.formulations for c in f.courses
                           for code in (c.code,))  # fmt: skip
    for code, name in wanted:
        unit = _unit(assessment, code)
        across, x = ("√ of exposure (√h)", 4) if code == "water_uptake" else ("exposure (h)", 3)
        names = [f.formulation for f in assessment.formulations if (f.formulation, code) in ranges]
        lines = [
            _Line(courses, f"$A${first}", x, 5, first, last)
            for first, last in (ranges[n, code] for n in names[:_MOST_LINES])
        ]
        left_away = len(names) - len(lines)
        more = f" ({counted(left_away, 'formulation')} more in the sheet)" if left_away else ""
        page.add(
            _chart(
                f"Means of the formulations: {name}{more}",
                across,
                f"{name} ({unit})",
                lines,
                log_x=False,
                log_y=code != "water_uptake",
            )
        )
    for formulation in assessment.formulations[:_MOST_CHARTS]:
        _of_panels(book, page, assessment, places, formulation.formulation)


def _unit(assessment: Assessment, code: str) -> str:
    return next(
        p.quantity.unit
        for f in assessment.formulations
        for c in f.courses
        if c.code == code
        for p in c.points
    )


def _of_panels(
    book: Book, page: _Page, assessment: Assessment, places: Places, formulation: str
) -> None:
    """Panel by panel: modulus and capacitance over time, uptake over its root."""
    watched = next((m.frequency_hz for r in assessment.readings for m in r.modulus), None)
    kinds = [
        (f"modulus_{watched:g}" if watched is not None else "", "Modulus", 3, 8,
         f"|Z|·A at {watched:g} Hz (Ω cm²)" if watched is not None else ""),
        ("coating_capacitance", "Capacitance", 3, 8, "Film capacitance (F/cm²)"),
        ("water_uptake", "Water", 4, 16, "Apparent water uptake (vol-%)"),
    ]  # fmt: skip
    own = [r for r in assessment.readings if r.formulation == formulation]
    for code, title, x, y, name in kinds:
        rows: dict[str, list[int]] = {}
        for reading in own:
            cells = places.cells.get((code, reading.reading_id))
            if cells is not None:
                rows.setdefault(reading.panel_id, []).append(int(cells[0].rsplit("$", 1)[1]))
        lines = [
            _Line(book.workbook[title], f"$B${min(numbers)}", x, y, min(numbers), max(numbers))
            for numbers in list(rows.values())[:_MOST_LINES]
        ]
        if not lines:
            continue
        left_away = len(rows) - len(lines)
        more = f" ({counted(left_away, 'panel')} more in the sheet)" if left_away else ""
        across = "√ of exposure (√h)" if x == 4 else "exposure (h)"
        chart = _chart(
            f"Panels of {shortened(formulation, 60)}: {name}{more}",
            across,
            name,
            lines,
            log_x=False,
            log_y=title != "Water",
        )
        page.add(chart)


# ---------------------------------------------------------------------------------------------
# Spectra


def add_spectra(book: Book, assessment: Assessment, campaign: Campaign) -> None:
    """Every point of every spectrum with its fit, and a Bode plot for each panel."""
    kept = {reading.reading_id: reading for reading in campaign.readings}
    rows: list[tuple[ReadingAssessment, int, float, complex, complex | None, str]] = []
    blocks: dict[str, list[tuple[int, int]]] = {}
    for r in assessment.readings:
        reading = kept.get(r.reading_id)
        if reading is None:
            continue
        reasons = {point.frequency_hz: point.reason for point in r.left_out}
        first = len(rows) + 2
        spectrum = reading.spectrum
        for i, (f, z) in enumerate(
            zip(spectrum.frequency_hz.tolist(), spectrum.impedance_ohm.tolist(), strict=True)
        ):
            fit = complex(r.fit.modelled_ohm[i]) if r.fit and i < len(r.fit.modelled_ohm) else None
            rows.append((r, first, f, z, fit, reasons.get(f, "")))
        blocks.setdefault(r.panel_id, []).append((first, len(rows) + 1))
    columns: list[Column[Any]] = [
        Column("formulation", lambda row: row[0].formulation),
        Column("panel", lambda row: row[0].panel),
        Column("exposure (h)", lambda row: row[0].exposure_h, "0.####"),
        Column("frequency (Hz)", lambda row: row[2], "0.0000E+00"),
        Column("Z′ (Ω)", lambda row: row[3].real, "0.0000E+00"),
        Column("Z″ (Ω)", lambda row: row[3].imag, "0.0000E+00"),
        Column("|Z| (Ω)", lambda row: abs(row[3]), "0.0000E+00"),
        Column("phase (°)", lambda row: _phase(row[3]), "0.00"),
        Column("|Z| of the fit (Ω)", lambda row: _maybe(row[4], abs), "0.0000E+00"),
        Column("phase of the fit (°)", lambda row: _maybe(row[4], _phase), "0.00"),
        Column("left out because", lambda row: row[5]),
    ]
    sheet = book.add_sheet("Spectra", columns, rows, standing=3)
    page = _Page(book.add_page("Bode plots"))
    names = {r.panel_id: r.panel for r in assessment.readings}
    for panel_id, own in list(blocks.items())[:_MOST_CHARTS]:
        # The first and the last readings and those between, as many as a chart can show.
        step = max(math.ceil(len(own) / _MOST_LINES), 1)
        shown = own[::step]
        for title, column in (("|Z| (Ω)", 7), ("phase (°)", 8)):
            lines = [_Line(sheet, f"$C${first}", 4, column, first, last) for first, last in shown]
            page.add(
                _chart(
                    f"Panel {shortened(names[panel_id], 60)}: {title} at its exposure times (h)",
                    "frequency (Hz)",
                    title,
                    lines,
                    log_x=True,
                    log_y=column == 7,
                )
            )


def _phase(impedance: complex) -> float:
    return math.degrees(math.atan2(impedance.imag, impedance.real))


def _maybe(value: complex | None, of: Any) -> float | None:
    return None if value is None else float(of(value))
