"""The workbook: what a reviewer reads, sorts and checks."""

from __future__ import annotations

import tomllib
from collections.abc import Sequence
from pathlib import Path
from typing import TYPE_CHECKING

from coatgui import __version__
from coatgui.output.cells import Value, add_sheet, workbook_bytes
from coatgui.output.whole import write_whole
from coatgui.records import Assessment, Bound, Campaign, Quantity, ReadingAssessment
from coatgui.shipped import resource

if TYPE_CHECKING:
    from openpyxl.workbook import Workbook

_KINDS = {
    Bound.TWO_SIDED: "between the limits",
    Bound.AT_LEAST: "at least",
    Bound.AT_MOST: "at most",
    Bound.FIXED: "fixed",
    Bound.UNDETERMINED: "cannot be determined",
}
_COLOURS = {"reject": "F3D5CB", "doubt": "F3E3C3", "at least": "DCE6EE", "at most": "DCE6EE"}
_SCIENTIFIC = "0.00E+00"
_WHO = ("formulation", "panel", "exposure (h)")


def _four(quantity: Quantity | None) -> list[Value]:
    """Value, low, high, kind."""
    if quantity is None:
        return [None, None, None, "no value"]
    return [quantity.value, quantity.low, quantity.high, _KINDS[quantity.bound]]


def _headed(name: str, unit: str) -> list[str]:
    return [f"{name} ({unit})", f"{name}, low 95 %", f"{name}, high 95 %", f"{name}, kind"]


def _who(reading: ReadingAssessment) -> list[Value]:
    return [reading.formulation, reading.panel, reading.exposure_h]


def write_workbook(assessment: Assessment, campaign: Campaign, path: Path) -> None:
    """Write the workbook whole or not at all. Bounds are numbers with their kind in a column of
    its own, so that nothing sorts wrongly. Raises OSError."""
    from openpyxl import Workbook

    book = Workbook()
    book.remove(book.worksheets[0])
    _summary(book, assessment)
    _readings(book, assessment)
    _parameters(book, assessment)
    _courses(book, assessment)
    _findings(book, assessment)
    _method(book, assessment)
    _provenance(book, assessment, campaign)
    content = workbook_bytes(book)
    write_whole(path, lambda file: file.write(content))


def _summary(book: Workbook, assessment: Assessment) -> None:
    rows: list[Sequence[Value]] = [
        ("campaign", assessment.title),
        ("standing", assessment.headline),
        ("comparison", assessment.ranking_text),
    ]
    rows += [
        (
            f"{r.formulation}",
            f"place {r.rank_low}"
            + (f" to {r.rank_high}" if r.rank_high != r.rank_low else "")
            + f", group {r.group}",
        )
        for r in assessment.ranking
    ]
    for panel in assessment.panels:
        said = [event.text for event in panel.events]
        said += [crossing.text for crossing in panel.limit_crossings]
        rows.append((f"panel {panel.panel}", " ".join(said)))
    rows += [("refused: " + r.file, r.reason) for r in assessment.refused]
    rows += [("caution", caution) for caution in assessment.cautions]
    add_sheet(book, "Summary", ("what", "text"), rows)


def _readings(book: Workbook, assessment: Assessment) -> None:
    frequencies = (
        [m.frequency_hz for m in assessment.readings[0].modulus] if (assessment.readings) else []
    )
    unit = "Ω cm², or Ω where the panel has no area"
    headings = [*_WHO, "counts"]
    for frequency in frequencies:
        name = f"|Z|·A at {frequency:g} Hz"
        headings += [*_headed(name, unit), f"{name}, how"]
    headings += _headed("film capacitance", "F/cm²")
    headings += ["film capacitance, law"]
    headings += _headed("pore resistance", unit)
    headings += _headed("apparent water uptake", "vol-%")
    headings += ["reference (h)", "model", "residual rms (%)", "points read", "points used"]
    rows: list[list[Value]] = []
    for reading in assessment.readings:
        row = [*_who(reading), "yes" if reading.counts else "no, rejected"]
        for modulus in reading.modulus:
            row += [*_four(modulus.quantity), modulus.status.value.replace("_", " ")]
        row += _four(reading.coating_capacitance)
        row += [reading.coating_capacitance.method if reading.coating_capacitance else ""]
        row += _four(reading.pore_resistance)
        uptake = reading.water_uptake
        row += _four(uptake.quantity if uptake else None)
        row += [uptake.reference_h if uptake else None]
        fit = reading.fit
        row += [fit.model_name if fit else "not fitted", fit.residual_rms_percent if fit else None]
        row += [reading.points_read, reading.points_used]
        rows.append(row)
    formats = {
        heading: "0.00" if "uptake" in heading or "residual" in heading else _SCIENTIFIC
        for heading in headings[4:]
        if not heading.startswith(("points", "reference"))
    }
    add_sheet(book, "Readings", headings, rows, formats=formats, colours=_COLOURS)


def _parameters(book: Workbook, assessment: Assessment) -> None:
    headings = [*_WHO, "model", "layer", "symbol", "meaning"]
    headings += ["value", "low 95 %", "high 95 %", "kind", "unit"]
    rows: list[list[Value]] = [
        [
            *_who(reading),
            reading.fit.model_name if reading.fit else "",
            parameter.layer,
            parameter.symbol,
            parameter.meaning,
            *_four(parameter.quantity),
            parameter.quantity.unit,
        ]
        for reading in assessment.readings
        for parameter in reading.parameters
    ]
    formats = dict.fromkeys(("value", "low 95 %", "high 95 %"), _SCIENTIFIC)
    add_sheet(book, "Parameters", headings, rows, formats=formats, colours=_COLOURS)


def _courses(book: Workbook, assessment: Assessment) -> None:
    headings = ["formulation", "quantity", "exposure (h)", "mean", "low 95 %", "high 95 %", "kind"]
    headings += ["unit", "panels", "of these only bounds"]
    rows: list[list[Value]] = [
        [
            formulation.formulation,
            course.name,
            point.exposure_h,
            *_four(point.quantity),
            point.quantity.unit,
            point.panels,
            point.censored,
        ]
        for formulation in assessment.formulations
        for course in formulation.courses
        for point in course.points
    ]
    formats = dict.fromkeys(("mean", "low 95 %", "high 95 %"), _SCIENTIFIC)
    add_sheet(book, "Courses", headings, rows, formats=formats, colours=_COLOURS)


def _findings(book: Workbook, assessment: Assessment) -> None:
    rows: list[list[Value]] = [
        [*_who(reading), finding.severity.value, finding.code, finding.text]
        for reading in assessment.readings
        for finding in reading.findings
    ]
    headings = [*_WHO, "severity", "code", "finding"]
    add_sheet(book, "Findings", headings, rows, colours=_COLOURS)
    left: list[list[Value]] = [
        [*_who(reading), point.frequency_hz, point.reason]
        for reading in assessment.readings
        for point in reading.left_out
    ]
    add_sheet(book, "Points left out", [*_WHO, "frequency (Hz)", "reason"], left)
    refused: list[list[Value]] = [[r.file, r.reason] for r in assessment.refused]
    add_sheet(book, "Refused", ["file", "reason"], refused)


def _method(book: Workbook, assessment: Assessment) -> None:
    data = tomllib.loads(resource("method.toml").read_text(encoding="utf-8"))
    rows: list[list[Value]] = [[e["quantity"], e["how"], e["source"]] for e in data["entry"]]
    rows += [["Caution", caution, ""] for caution in assessment.cautions]
    rows += [["Program", f"coatgui {__version__}", ""]]
    add_sheet(book, "Method and cautions", ["quantity", "how it was obtained", "source"], rows)


def _provenance(book: Workbook, assessment: Assessment, campaign: Campaign) -> None:
    by_id = {reading.reading_id: reading for reading in campaign.readings}
    rows: list[list[Value]] = []
    for reading in assessment.readings:
        source = by_id[reading.reading_id].source if reading.reading_id in by_id else None
        dialect = source.dialect if source else None
        columns = ""
        if dialect:
            columns = "; ".join(
                f"{c.position + 1}: {c.role}{' in ' + c.unit if c.unit else ''}"
                for c in dialect.columns
                if c.role != "other"
            )
        rows.append(
            [
                *_who(reading),
                reading.file,
                source.part if source else "",
                reading.sha256,
                columns,
                " ".join(dialect.remarks) if dialect else "",
                reading.fit.model if reading.fit else "",
            ]
        )
    headings = [*_WHO, "file", "part", "SHA-256", "columns as understood", "remarks", "model"]
    add_sheet(book, "Provenance", headings, rows)
