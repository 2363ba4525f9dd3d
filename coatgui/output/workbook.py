"""The workbook: what a reviewer reads, sorts and checks.

Every sheet is a list of columns, and every column says how its value comes out of a row. A bound is
a number with its kind in a column of its own, so that nothing sorts wrongly.
"""

from __future__ import annotations

import tomllib
from collections.abc import Callable, Iterator
from operator import attrgetter, itemgetter
from pathlib import Path
from typing import Any

from coatgui import __version__
from coatgui.output.cells import Book, Column, Value
from coatgui.output.charts import MOST_POINTS, add_charts, add_spectra
from coatgui.output.live_cells import (
    COLOURS,
    HOURS,
    HUNDREDTHS,
    SCIENTIFIC,
    Places,
    add_capacitance,
    add_modulus,
    add_pore_resistance,
)
from coatgui.output.live_courses import add_courses, add_limits, add_settings
from coatgui.output.live_water import add_water
from coatgui.output.shown import KINDS
from coatgui.output.whole import write_whole
from coatgui.records import (
    Assessment,
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

_OHM_CM2 = "Ω cm², or Ω where the panel has no area"
_F_PER_CM2 = "F/cm², or F where the panel has no area"


def _quantity_columns(
    name: str, unit: str, of: Callable[[Any], Quantity | None], number_format: str = SCIENTIFIC
) -> list[Column[Any]]:
    """Value, 95 % limits and kind of a quantity that `of` finds in a row. `unit` is empty where
    it differs from row to row and has a column of its own."""

    def part(which: str) -> Callable[[Any], Value]:
        return lambda row: getattr(of(row), which, None)

    def kind(row: Any) -> Value:
        quantity = of(row)
        return "no value" if quantity is None else KINDS[quantity.bound]

    of_unit = f" ({unit})" if unit else ""
    return [
        Column(f"{name}{of_unit}", part("value"), number_format),
        Column(f"{name}, low 95 %{of_unit}", part("low"), number_format),
        Column(f"{name}, high 95 %{of_unit}", part("high"), number_format),
        Column(f"{name}, kind", kind),
    ]


def _who(of: Callable[[Any], ReadingAssessment]) -> list[Column[Any]]:
    return [
        Column("formulation", lambda row: of(row).formulation),
        Column("panel", lambda row: of(row).panel),
        Column("exposure (h)", lambda row: of(row).exposure_h, HOURS),
    ]


def write_workbook(
    assessment: Assessment, campaign: Campaign, path: Path, *, spectra: bool | None = None
) -> None:
    """Write the workbook whole or not at all. `spectra` says whether every point of every spectrum
    goes into it; None: where there are not too many. Raises OSError."""
    content = workbook_bytes(assessment, campaign, spectra)
    write_whole(path, lambda file: file.write(content))


def workbook_bytes(
    assessment: Assessment, campaign: Campaign, spectra: bool | None = None
) -> bytes:
    """The workbook; the same assessment gives the same bytes."""
    book = Book()
    readings = {reading.reading_id: reading for reading in campaign.readings}
    places = Places.of(assessment, campaign)
    _summary(book, assessment)
    add_settings(book, campaign, places)
    _panels(book, assessment, campaign)
    _readings(book, assessment, readings)
    _parameters(book, assessment)
    add_modulus(book, assessment, places)
    add_capacitance(book, assessment, places)
    add_water(book, assessment, campaign, places)
    add_pore_resistance(book, assessment, places)
    ranges = add_courses(book, assessment, places)
    add_limits(book, assessment, places)
    _comparison(book, assessment)
    _ratings(book, assessment)
    _findings(book, assessment)
    _points_left_out(book, assessment)
    _refused(book, assessment)
    if ranges:
        add_charts(book, assessment, places, ranges)
    points = sum(len(reading.spectrum) for reading in campaign.readings)
    if spectra or (spectra is None and 0 < points <= MOST_POINTS):
        add_spectra(book, assessment, campaign)
    _method(book, assessment)
    _provenance(book, assessment, campaign, readings)
    return book.content()


def _summary(book: Book, assessment: Assessment) -> None:
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
    rows += [("comparison", c.text) for c in assessment.further_comparisons]
    rows += [("limit", study.text) for study in assessment.limit_studies]
    rows += [("projection", p.text) for p in assessment.projections]
    rows += [("ratings", c.text) for c in assessment.rating_correlations]
    for panel in assessment.panels:
        said = [event.text for event in panel.events]
        said += [crossing.text for crossing in panel.limit_crossings]
        rows.append((f"panel {panel.panel}", " ".join(said)))
    rows += [(finding.severity.value, finding.text) for finding in assessment.findings]
    rows += [(f"refused: {refusal.file}", refusal.reason) for refusal in assessment.refused]
    rows += [("caution", caution) for caution in assessment.cautions]
    columns = [Column("what", itemgetter(0)), Column("text", itemgetter(1))]
    book.add_sheet("Summary", columns, rows, colours=COLOURS)


def _readings(book: Book, assessment: Assessment, readings: dict[str, Reading]) -> None:
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
            HUNDREDTHS,
        ),
        Column("dry reference (h)", lambda r: getattr(r.water_uptake, "reference_h", None)),
        Column("model", lambda r: r.fit.model_name if r.fit else "not fitted"),
        Column(
            "residual rms (%)", lambda r: getattr(r.fit, "residual_rms_percent", None), HUNDREDTHS
        ),
        Column("points read", attrgetter("points_read")),
        Column("points used", attrgetter("points_used")),
        Column("decided by a person", lambda r: _decisions(readings.get(r.reading_id))),
        Column("remark", lambda r: getattr(readings.get(r.reading_id), "remark", None)),
        *_quantity_columns(
            "effective permittivity of the film", "", attrgetter("relative_permittivity"), "0.00"
        ),
        *_quantity_columns(
            "effective resistivity of the film", "Ω cm", attrgetter("film_resistivity")
        ),
        Column(
            "breakpoint, measured (Hz)",
            lambda r: getattr(r.breakpoint, "measured_hz", None),
            SCIENTIFIC,
        ),
        Column("active share of the area, from", lambda r: _share(r, "low"), SCIENTIFIC),
        Column("active share of the area, to", lambda r: _share(r, "high"), SCIENTIFIC),
        Column("active share of the area, in words", lambda r: _share(r, "text")),
    ]
    book.add_sheet("Readings", columns, assessment.readings, colours=COLOURS, standing=3)


def _share(reading: ReadingAssessment, which: str) -> Value:
    return getattr(reading.active_area, which, None)


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


def _parameters(book: Book, assessment: Assessment) -> None:
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
    book.add_sheet("Parameters", columns, rows, colours=COLOURS, standing=3)


def _panels(book: Book, assessment: Assessment, campaign: Campaign) -> None:
    kept = {panel.panel_id: panel for panel in campaign.panels}

    def noted(name: str) -> Callable[[PanelAssessment], Value]:
        return lambda panel: getattr(kept.get(panel.panel_id), name, None)

    columns: list[Column[Any]] = [
        Column("formulation", attrgetter("formulation")),
        Column("panel", attrgetter("panel")),
        # The sheets with formulas look for these three in columns C, D and E.
        Column("area (cm²)", attrgetter("area_cm2"), to_edit=True),
        Column("film thickness (µm)", attrgetter("thickness_um"), to_edit=True),
        Column("temperature (°C)", noted("temperature_c"), to_edit=True),
        Column("substrate", noted("substrate")),
        Column("electrolyte", noted("electrolyte")),
        Column("regime", noted("regime")),
        *_quantity_columns("dry capacitance", _F_PER_CM2, attrgetter("dry_capacitance")),
        *_quantity_columns(
            "diffusion coefficient of water", "cm²/s", attrgetter("diffusion_coefficient")
        ),
        Column("what happened", lambda panel: " ".join(e.text for e in panel.events)),
        Column("limits", lambda panel: " ".join(c.text for c in panel.limit_crossings)),
        Column("remark", noted("remark")),
        Column("notes", lambda panel: _notes(kept.get(panel.panel_id))),
        *_quantity_columns(
            "effective permittivity of the dry film", "", attrgetter("dry_permittivity"), "0.00"
        ),
        *_quantity_columns(
            "apparent water at saturation",
            "vol-%",
            lambda panel: getattr(panel.saturation_uptake, "quantity", None),
            HUNDREDTHS,
        ),
        Column(
            "least by any law (vol-%)",
            lambda panel: getattr(panel.saturation_uptake, "law_low", None),
            HUNDREDTHS,
        ),
        Column(
            "most by any law (vol-%)",
            lambda panel: getattr(panel.saturation_uptake, "law_high", None),
            HUNDREDTHS,
        ),
        *_quantity_columns(
            "water at saturation",
            "g/100 g dry film",
            attrgetter("saturation_mass_percent"),
            HUNDREDTHS,
        ),
    ]
    book.add_sheet("Panels", columns, assessment.panels, colours=COLOURS, standing=2)


def _notes(panel: Panel | None) -> str | None:
    return "; ".join(f"{name}: {text}" for name, text in panel.notes) if panel else None


def _comparison(book: Book, assessment: Assessment) -> None:
    everything = [assessment.comparison, *assessment.further_comparisons]
    rows = [(c, pair) for c in everything if c is not None for pair in c.pairs]
    columns: list[Column[Any]] = [
        Column("judged by", lambda row: row[0].what),
        Column("exposure (h)", lambda row: row[0].exposure_h, HOURS),
        Column("first", lambda row: row[1].first),
        Column("second", lambda row: row[1].second),
        *_quantity_columns("first less second", "", lambda row: row[1].difference, "0.000"),
        Column("unit", lambda row: getattr(row[1].difference, "unit", None)),
        Column("probability", lambda row: row[1].probability, SCIENTIFIC),
        Column("probability, corrected", lambda row: row[1].adjusted, SCIENTIFIC),
        Column("result", lambda row: "differ" if row[1].differ else "cannot be told apart"),
        Column("in words", lambda row: row[0].text),
    ]
    book.add_sheet("Comparison", columns, rows, colours=COLOURS)


def _ratings(book: Book, assessment: Assessment) -> None:
    if not assessment.ratings:
        return
    rows = [
        (course, panel, value) for course in assessment.ratings for panel, value in course.ratings
    ]
    columns: list[Column[Any]] = [
        Column("formulation", lambda row: row[0].formulation),
        Column("panel", itemgetter(1)),
        Column("exposure (h)", lambda row: row[0].exposure_h, HOURS),
        Column("scale", lambda row: row[0].scale),
        Column("rating", itemgetter(2)),
        Column("edition", lambda row: row[0].edition),
    ]
    book.add_sheet("Ratings", columns, rows, standing=3)


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


def _findings(book: Book, assessment: Assessment) -> None:
    columns: list[Column[Any]] = [
        Column("formulation", itemgetter(0)),
        Column("panel", itemgetter(1)),
        Column("exposure (h)", itemgetter(2)),
        Column("severity", lambda row: row[3].severity.value),
        Column("code", lambda row: row[3].code),
        Column("finding", lambda row: row[3].text),
    ]
    book.add_sheet("Findings", columns, _found(assessment), colours=COLOURS)


def _points_left_out(book: Book, assessment: Assessment) -> None:
    columns: list[Column[Any]] = [
        *_who(itemgetter(0)),
        Column("frequency (Hz)", lambda row: row[1].frequency_hz, "0.0000E+00"),
        Column("reason", lambda row: row[1].reason),
    ]
    rows = [(reading, point) for reading in assessment.readings for point in reading.left_out]
    book.add_sheet("Points left out", columns, rows)


def _refused(book: Book, assessment: Assessment) -> None:
    columns: list[Column[Any]] = [
        Column("file", attrgetter("file")),
        Column("reason", attrgetter("reason")),
    ]
    book.add_sheet("Refused", columns, assessment.refused)


def _method(book: Book, assessment: Assessment) -> None:
    data = tomllib.loads(resource("method.toml").read_text(encoding="utf-8"))
    rows = [(e["quantity"], e["how"], e["source"]) for e in data["entry"]]
    rows += [("Caution", caution, "") for caution in assessment.cautions]
    rows.append(("Program", f"coatgui {__version__}", ""))
    headings = ["quantity", "how it was obtained", "source"]
    columns: list[Column[Any]] = [Column(h, itemgetter(i)) for i, h in enumerate(headings)]
    book.add_sheet("Method and cautions", columns, rows)


def _provenance(
    book: Book, assessment: Assessment, campaign: Campaign, readings: dict[str, Reading]
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
    book.add_sheet("Provenance", columns, rows, standing=3)


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
