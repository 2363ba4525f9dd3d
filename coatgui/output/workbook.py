"""The workbook: what a reviewer reads, sorts and checks.

Every sheet is a list of columns, and every column says how its value comes out of a row. A bound is
a number with its kind in a column of its own, so that nothing sorts wrongly.
"""

from __future__ import annotations

import tomllib
from collections.abc import Callable, Iterator
from operator import attrgetter, itemgetter
from pathlib import Path
from typing import TYPE_CHECKING, Any

from coatgui import __version__
from coatgui.output.cells import Column, Value, add_sheet, workbook_bytes
from coatgui.output.whole import write_whole
from coatgui.records import (
    Assessment,
    Bound,
    Campaign,
    Finding,
    Panel,
    PanelAssessment,
    Quantity,
    Reading,
    ReadingAssessment,
    Source,
)
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
_COLOURS = {
    "reject": "F3D5CB",
    "no, rejected": "F3D5CB",
    "doubt": "F3E3C3",
    "at least": "DCE6EE",
    "at most": "DCE6EE",
}
_SCIENTIFIC, _HUNDREDTHS = "0.00E+00", "0.00"
_OHM_CM2 = "Ω cm², or Ω where the panel has no area"
_F_PER_CM2 = "F/cm², or F where the panel has no area"


def _quantity_columns(
    name: str, unit: str, of: Callable[[Any], Quantity | None], number_format: str = _SCIENTIFIC
) -> list[Column[Any]]:
    """Value, 95 % limits and kind of a quantity that `of` finds in a row. `unit` is empty where
    it differs from row to row and has a column of its own."""

    def part(which: str) -> Callable[[Any], Value]:
        return lambda row: getattr(of(row), which, None)

    def kind(row: Any) -> Value:
        quantity = of(row)
        return "no value" if quantity is None else _KINDS[quantity.bound]

    return [
        Column(f"{name} ({unit})" if unit else name, part("value"), number_format),
        Column(f"{name}, low 95 %", part("low"), number_format),
        Column(f"{name}, high 95 %", part("high"), number_format),
        Column(f"{name}, kind", kind),
    ]


def _who(of: Callable[[Any], ReadingAssessment]) -> list[Column[Any]]:
    return [
        Column("formulation", lambda row: of(row).formulation),
        Column("panel", lambda row: of(row).panel),
        Column("exposure (h)", lambda row: of(row).exposure_h),
    ]


def write_workbook(assessment: Assessment, campaign: Campaign, path: Path) -> None:
    """Write the workbook whole or not at all. Raises OSError."""
    from openpyxl import Workbook

    book = Workbook()
    book.remove(book.worksheets[0])
    readings = {reading.reading_id: reading for reading in campaign.readings}
    _summary(book, assessment)
    _readings(book, assessment, readings)
    _parameters(book, assessment)
    _panels(book, assessment, campaign)
    _courses(book, assessment)
    _findings(book, assessment)
    _points_left_out(book, assessment)
    _refused(book, assessment)
    _method(book, assessment, campaign)
    _provenance(book, assessment, campaign, readings)
    content = workbook_bytes(book)
    write_whole(path, lambda file: file.write(content))


def _summary(book: Workbook, assessment: Assessment) -> None:
    rows = [
        ("campaign", assessment.title),
        ("standing", assessment.headline),
        ("comparison", assessment.ranking_text),
    ]
    for rank in assessment.ranking:
        place = f"place {rank.rank_low}"
        if rank.rank_high != rank.rank_low:
            place += f" to {rank.rank_high}"
        rows.append((rank.formulation, f"{place}, group {rank.group}"))
    rows += [(f.formulation, f.text) for f in assessment.formulations if f.text]
    for panel in assessment.panels:
        said = [event.text for event in panel.events]
        said += [crossing.text for crossing in panel.limit_crossings]
        rows.append((f"panel {panel.panel}", " ".join(said)))
    rows += [(finding.severity.value, finding.text) for finding in assessment.findings]
    rows += [(f"refused: {refusal.file}", refusal.reason) for refusal in assessment.refused]
    rows += [("caution", caution) for caution in assessment.cautions]
    columns = [Column("what", itemgetter(0)), Column("text", itemgetter(1))]
    add_sheet(book, "Summary", columns, rows, colours=_COLOURS)


def _readings(book: Workbook, assessment: Assessment, readings: dict[str, Reading]) -> None:
    with_area = {p.panel_id for p in assessment.panels if p.area_cm2 is not None}
    # Every frequency that any reading has an answer for, in the order of the first that names it.
    frequencies = dict.fromkeys(m.frequency_hz for r in assessment.readings for m in r.modulus)
    columns: list[Column[Any]] = [
        *_who(lambda r: r),
        Column("counts", lambda r: "yes" if r.counts else "no, rejected"),
        Column("amounts are per", lambda r: "cm²" if r.panel_id in with_area else "specimen"),
    ]
    for frequency_hz in frequencies:
        columns += _modulus_columns(frequency_hz)
    columns += [
        *_quantity_columns("film capacitance", _F_PER_CM2, attrgetter("coating_capacitance")),
        Column("film capacitance, law", lambda r: getattr(r.coating_capacitance, "method", None)),
        *_quantity_columns(
            "capacitance straight from the data at high frequency",
            _F_PER_CM2,
            attrgetter("capacitance_at_high_frequency"),
        ),
        *_quantity_columns("pore resistance", _OHM_CM2, attrgetter("pore_resistance")),
        *_quantity_columns(
            "apparent water uptake",
            "vol-%",
            lambda r: getattr(r.water_uptake, "quantity", None),
            _HUNDREDTHS,
        ),
        Column("dry reference (h)", lambda r: getattr(r.water_uptake, "reference_h", None)),
        Column("model", lambda r: r.fit.model_name if r.fit else "not fitted"),
        Column(
            "residual rms (%)", lambda r: getattr(r.fit, "residual_rms_percent", None), _HUNDREDTHS
        ),
        Column("points read", attrgetter("points_read")),
        Column("points used", attrgetter("points_used")),
        Column("decided by a person", lambda r: _decisions(readings.get(r.reading_id))),
        Column("remark", lambda r: getattr(readings.get(r.reading_id), "remark", None)),
    ]
    add_sheet(book, "Readings", columns, assessment.readings, colours=_COLOURS, standing=3)


def _modulus_columns(frequency_hz: float) -> list[Column[Any]]:
    name = f"|Z|·A at {frequency_hz:g} Hz"

    def quantity(reading: ReadingAssessment) -> Quantity | None:
        modulus = reading.modulus_at(frequency_hz)
        return modulus.quantity if modulus else None

    def how(reading: ReadingAssessment) -> Value:
        modulus = reading.modulus_at(frequency_hz)
        return modulus.status.value.replace("_", " ") if modulus else None

    return [*_quantity_columns(name, _OHM_CM2, quantity), Column(f"{name}, how", how)]


def _decisions(reading: Reading | None) -> str | None:
    """What a person settled about a reading, in words; None where nothing was."""
    if reading is None:
        return None
    said = []
    if reading.pinned_model:
        said.append(f"the model {reading.pinned_model} is insisted on")
    if reading.overruled_because:
        said.append(f"a rejection is overruled: {reading.overruled_because}")
    if reading.left_out:
        said.append(f"points left out: {len(reading.left_out)}")
    if reading.kept_in:
        said.append(f"points kept in against the checks: {len(reading.kept_in)}")
    return "; ".join(said) or None


def _parameters(book: Workbook, assessment: Assessment) -> None:
    columns: list[Column[Any]] = [
        *_who(itemgetter(0)),
        Column("model", lambda row: getattr(row[0].fit, "model_name", None)),
        Column("layer", lambda row: row[1].layer),
        Column("symbol", lambda row: row[1].symbol),
        Column("meaning", lambda row: row[1].meaning),
        *_quantity_columns("value", "", lambda row: row[1].quantity),
        Column("unit", lambda row: row[1].quantity.unit),
    ]
    rows = [(reading, p) for reading in assessment.readings for p in reading.parameters]
    add_sheet(book, "Parameters", columns, rows, colours=_COLOURS, standing=3)


def _panels(book: Workbook, assessment: Assessment, campaign: Campaign) -> None:
    kept = {panel.panel_id: panel for panel in campaign.panels}

    def noted(name: str) -> Callable[[PanelAssessment], Value]:
        return lambda panel: getattr(kept.get(panel.panel_id), name, None)

    columns: list[Column[Any]] = [
        Column("formulation", attrgetter("formulation")),
        Column("panel", attrgetter("panel")),
        Column("area (cm²)", attrgetter("area_cm2")),
        Column("film thickness (µm)", attrgetter("thickness_um")),
        Column("substrate", noted("substrate")),
        Column("electrolyte", noted("electrolyte")),
        Column("temperature (°C)", noted("temperature_c")),
        Column("regime", noted("regime")),
        *_quantity_columns("dry capacitance", _F_PER_CM2, attrgetter("dry_capacitance")),
        *_quantity_columns(
            "diffusion coefficient of water", "cm²/s", attrgetter("diffusion_coefficient")
        ),
        Column("what happened", lambda panel: " ".join(e.text for e in panel.events)),
        Column("limits", lambda panel: " ".join(c.text for c in panel.limit_crossings)),
        Column("remark", noted("remark")),
        Column("notes", lambda panel: _notes(kept.get(panel.panel_id))),
    ]
    add_sheet(book, "Panels", columns, assessment.panels, colours=_COLOURS, standing=2)


def _notes(panel: Panel | None) -> str | None:
    return "; ".join(f"{name}: {text}" for name, text in panel.notes) if panel else None


def _courses(book: Workbook, assessment: Assessment) -> None:
    columns: list[Column[Any]] = [
        Column("formulation", lambda row: row[0].formulation),
        Column("quantity", lambda row: row[1].name),
        Column("exposure (h)", lambda row: row[2].exposure_h),
        *_quantity_columns("mean", "", lambda row: row[2].quantity),
        Column("unit", lambda row: row[2].quantity.unit),
        Column("kind of mean", lambda row: row[2].quantity.method),
        Column("panels", lambda row: row[2].panels),
        Column("of these only bounds", lambda row: row[2].censored),
    ]
    rows = [
        (formulation, course, point)
        for formulation in assessment.formulations
        for course in formulation.courses
        for point in course.points
    ]
    add_sheet(book, "Courses", columns, rows, colours=_COLOURS, standing=3)


def _found(assessment: Assessment) -> Iterator[tuple[str, str, float | None, Finding]]:
    """Findings on the campaign, on panels, on readings, each with whom it is about."""
    for finding in assessment.findings:
        yield "", "", None, finding
    for panel in assessment.panels:
        for finding in panel.findings:
            yield panel.formulation, panel.panel, None, finding
    for reading in assessment.readings:
        for finding in reading.findings:
            yield reading.formulation, reading.panel, reading.exposure_h, finding


def _findings(book: Workbook, assessment: Assessment) -> None:
    columns: list[Column[Any]] = [
        Column("formulation", itemgetter(0)),
        Column("panel", itemgetter(1)),
        Column("exposure (h)", itemgetter(2)),
        Column("severity", lambda row: row[3].severity.value),
        Column("code", lambda row: row[3].code),
        Column("finding", lambda row: row[3].text),
    ]
    add_sheet(book, "Findings", columns, _found(assessment), colours=_COLOURS)


def _points_left_out(book: Workbook, assessment: Assessment) -> None:
    columns: list[Column[Any]] = [
        *_who(itemgetter(0)),
        Column("frequency (Hz)", lambda row: row[1].frequency_hz, "0.0000E+00"),
        Column("reason", lambda row: row[1].reason),
    ]
    rows = [(reading, point) for reading in assessment.readings for point in reading.left_out]
    add_sheet(book, "Points left out", columns, rows)


def _refused(book: Workbook, assessment: Assessment) -> None:
    columns: list[Column[Any]] = [
        Column("file", attrgetter("file")),
        Column("reason", attrgetter("reason")),
    ]
    add_sheet(book, "Refused", columns, assessment.refused)


def _method(book: Workbook, assessment: Assessment, campaign: Campaign) -> None:
    data = tomllib.loads(resource("method.toml").read_text(encoding="utf-8"))
    rows = [(e["quantity"], e["how"], e["source"]) for e in data["entry"]]
    settings = campaign.settings
    wanted = " and ".join(f"{f:g} Hz" for f in settings.modulus_frequencies_hz)
    set_to = [
        ("temperature where neither reading nor panel has one", f"{settings.temperature_c:g} °C"),
        ("|Z|·A is given at", wanted),
        ("high frequency for the capacitance", f"{settings.capacitance_frequency_hz:g} Hz"),
        ("mains frequency", f"{settings.mains_hz:g} Hz"),
        *((f"threshold {name}", f"{value:g}") for name, value in settings.thresholds),
    ]
    rows += [(f"Setting: {what}", value, "Settings of the campaign.") for what, value in set_to]
    for limit in settings.criteria:
        how = f"|Z|·A below {limit.ohm_cm2:g} Ω cm² at {limit.frequency_hz:g} Hz"
        rows.append((f"Limit: {limit.name}", how, limit.source))
    rows += [("Caution", caution, "") for caution in assessment.cautions]
    rows.append(("Program", f"coatgui {__version__}", ""))
    headings = ["quantity", "how it was obtained", "source"]
    columns: list[Column[Any]] = [Column(h, itemgetter(i)) for i, h in enumerate(headings)]
    add_sheet(book, "Method and cautions", columns, rows)


def _provenance(
    book: Workbook, assessment: Assessment, campaign: Campaign, readings: dict[str, Reading]
) -> None:
    rows: list[tuple[Value, ...]] = []
    for reading in assessment.readings:
        kept = readings.get(reading.reading_id)
        source = kept.source if kept else Source(reading.file, reading.sha256)
        model = reading.fit.model if reading.fit else None
        rows.append(
            (reading.formulation, reading.panel, reading.exposure_h, *_origin(source), model)
        )
    if campaign.open_lead_source is not None:
        rows.append((None, "open leads", None, *_origin(campaign.open_lead_source), None))
    headings = ["formulation", "panel", "exposure (h)", "file", "part", "SHA-256", "encoding"]
    headings += ["delimiter", "decimal sign", "columns as understood", "remarks", "model"]
    columns: list[Column[Any]] = [Column(h, itemgetter(i)) for i, h in enumerate(headings)]
    add_sheet(book, "Provenance", columns, rows, standing=3)


def _origin(source: Source) -> tuple[Value, ...]:
    """File, part, SHA-256, encoding, delimiter, decimal sign, columns, remarks."""
    dialect = source.dialect
    if dialect is None:
        return (source.file, source.part, source.sha256, None, None, None, None, None)
    understood = "; ".join(
        f"{c.position + 1}: {c.role}{f' in {c.unit}' if c.unit else ''} (times {c.factor:g})"
        for c in dialect.columns
        if c.role != "other"
    )
    delimiter = {"\t": "tab", " ": "blanks"}.get(dialect.delimiter, dialect.delimiter)
    read = (dialect.encoding, delimiter, dialect.decimal_sign)
    return (source.file, source.part, source.sha256, *read, understood, " ".join(dialect.remarks))
