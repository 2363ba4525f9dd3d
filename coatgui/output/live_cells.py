"""Sheets whose numbers can be recalculated: area normalisation, standing against limits, bands,
permittivity, water uptake.

What a reader may change (areas, thicknesses, temperatures, limits) stands once, on the sheets
Settings, Limits and Panels; everything here follows from there by formulas. Every formula carries
the program's own value, and one that would not give that value is not written: the number is.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from dataclasses import dataclass, field
from typing import Any

from coatgui.assessment.mixing import VACUUM_F_PER_CM
from coatgui.assessment.rules import default_criteria, table
from coatgui.output.bands import CANNOT_TELL, band
from coatgui.output.cells import Book, Column, Formula, Value, letter
from coatgui.output.shown import KINDS
from coatgui.records import (
    Assessment,
    Campaign,
    Criterion,
    Quantity,
    ReadingAssessment,
)

SCIENTIFIC, HUNDREDTHS, HOURS = "0.00E+00", "0.00", "0.####"
COLOURS = {
    "reject": "F3D5CB",
    "no, rejected": "F3D5CB",
    "doubt": "F3E3C3",
    "at least": "DCE6EE",
    "at most": "DCE6EE",
    "below": "F3D5CB",
    "poor": "F3D5CB",
}
BELOW, NOT_BELOW = "below", "not below"


@dataclass(slots=True)
class Places:
    """Where things stand: the row of each panel, and for each reading the cells that hold a
    quantity as value, log₁₀, low and high."""

    panel_row: dict[str, int] = field(default_factory=dict)
    with_area: set[str] = field(default_factory=set)
    criteria: tuple[Criterion, ...] = ()
    cells: dict[tuple[str, str], tuple[str, str, str, str]] = field(default_factory=dict)
    modulus_rows: dict[tuple[str, float], tuple[int, int]] = field(default_factory=dict)
    capacitance_row: dict[str, int] = field(default_factory=dict)

    @classmethod
    def of(cls, assessment: Assessment, campaign: Campaign) -> Places:
        return cls(
            {panel.panel_id: row for row, panel in enumerate(assessment.panels, start=2)},
            {panel.panel_id for panel in assessment.panels if panel.area_cm2},
            campaign.settings.criteria or default_criteria(),
        )

    def area(self, panel_id: str) -> str:
        return f"Panels!$C${self.panel_row[panel_id]}"


def agrees(first: float | None, second: float | None) -> bool:
    """Equal but for rounding."""
    if first is None or second is None:
        return first is second
    return math.isclose(first, second, rel_tol=1e-9, abs_tol=1e-12)


# ---------------------------------------------------------------------------------------------
# Amounts per area


@dataclass(frozen=True, slots=True)
class _PerArea:
    """A row: a reading with a quantity; `times` says whether the area multiplies or divides."""

    reading: ReadingAssessment
    quantity: Quantity
    area_cm2: float | None
    times: bool
    places: Places
    frequency_hz: float | None = None
    status: str = ""
    first_row: int = 0

    def raw(self, which: str) -> float | None:
        """Per specimen."""
        value: float | None = getattr(self.quantity, which)
        if value is None or self.area_cm2 is None:
            return value
        return value / self.area_cm2 if self.times else value * self.area_cm2

    def live(self, column: str, which: str) -> Value:
        """Per area, from the raw number in `column` and the panel's area."""
        value: float | None = getattr(self.quantity, which)
        if value is None or not math.isfinite(value):
            return None
        if self.area_cm2 is None:
            return Formula(f"{column}{{r}}", value)
        sign = "*" if self.times else "/"
        return Formula(f"{column}{{r}}{sign}{self.places.area(self.reading.panel_id)}", value)


def _per_area_columns(unit: tuple[str, str]) -> list[Column[Any]]:
    """Columns D to L: raw value, its limits, area, value per area, limits, kind, unit, log₁₀."""
    specimen, area = unit

    def log(row: _PerArea) -> Value:
        value = row.quantity.value
        if value is None or not value > 0:
            return None
        return Formula('IF(H{r}>0,LOG10(H{r}),"")', math.log10(value))

    return [
        Column("formulation", lambda row: row.reading.formulation),
        Column("panel", lambda row: row.reading.panel),
        Column("exposure (h)", lambda row: row.reading.exposure_h, HOURS),
        Column(f"per specimen ({specimen})", lambda row: row.raw("value"), SCIENTIFIC),
        Column(f"per specimen, low 95 % ({specimen})", lambda row: row.raw("low"), SCIENTIFIC),
        Column(f"per specimen, high 95 % ({specimen})", lambda row: row.raw("high"), SCIENTIFIC),
        Column(
            "area (cm²)",
            lambda row: (
                None
                if row.area_cm2 is None
                else Formula(row.places.area(row.reading.panel_id), row.area_cm2)
            ),
            "0.###",
        ),
        Column(f"value ({area})", lambda row: row.live("D", "value"), SCIENTIFIC),
        Column(f"low 95 % ({area})", lambda row: row.live("E", "low"), SCIENTIFIC),
        Column(f"high 95 % ({area})", lambda row: row.live("F", "high"), SCIENTIFIC),
        Column("kind", lambda row: KINDS[row.quantity.bound]),
        Column("unit", lambda row: row.quantity.unit),
        Column("log₁₀ of the value", log, "0.000"),
        Column("how", lambda row: row.quantity.method),
    ]


VALUE, LOW, HIGH, LOG = "H", "I", "J", "M"


def _note_cells(places: Places, title: str, rows: Sequence[_PerArea], code: str = "") -> None:
    """Remember where each row's quantity stands; without a code, the row's frequency names it."""
    for number, row in enumerate(rows, start=2):
        code = f"modulus_{row.frequency_hz:g}" if row.frequency_hz is not None else code
        places.cells[code, row.reading.reading_id] = tuple(  # type: ignore[assignment]
            f"'{title}'!${column}${number}" for column in (VALUE, LOG, LOW, HIGH)
        )


def add_modulus(book: Book, assessment: Assessment, places: Places) -> None:
    """|Z|·A at every wanted frequency, panel by panel, with its standing against each limit."""
    frequencies = dict.fromkeys(m.frequency_hz for r in assessment.readings for m in r.modulus)
    areas = {panel.panel_id: panel.area_cm2 for panel in assessment.panels}
    rows: list[_PerArea] = []
    for frequency_hz in frequencies:
        first, before = 2, ""
        for reading in assessment.readings:
            at = reading.modulus_at(frequency_hz)
            if at is None or at.quantity is None:
                continue
            if reading.panel_id != before:
                first, before = len(rows) + 2, reading.panel_id
            area = areas.get(reading.panel_id)
            status = at.status.value.replace("_", " ")
            rows.append(
                _PerArea(reading, at.quantity, area, True, places, frequency_hz, status, first)
            )
            places.modulus_rows[reading.panel_id, frequency_hz] = (first, len(rows) + 1)
    columns = _per_area_columns(("Ω", "Ω cm², or Ω where the panel has no area"))
    columns += [
        Column("frequency (Hz)", lambda row: row.frequency_hz),
        Column("counts", lambda row: "yes" if row.reading.counts else "no, rejected"),
        Column("how come by", lambda row: row.status),
        Column("band", _band),
    ]
    for place, criterion in enumerate(places.criteria, start=1):
        state = len(columns)
        columns.append(Column(f"limit_{place}", _standing(criterion, place)))
        columns.append(
            Column(f"limit_{place}: last held at (h)", _last_held(criterion, state), HOURS)
        )
    book.add_sheet("Modulus", columns, rows, colours=COLOURS, standing=3)
    _note_cells(places, "Modulus", rows)


def state_column(place: int) -> tuple[str, str]:
    """The columns of the sheet Modulus that hold the standing against limit `place` (from 1) and
    when it was last held."""
    first = 18 + 2 * (place - 1)
    return letter(first), letter(first + 1)


def standing(quantity: Quantity, limit: float) -> str:
    """Below, not below, or cannot tell: by the whole 95 % interval, as the program judges."""
    if quantity.high is not None and quantity.high < limit:
        return BELOW
    if quantity.low is not None and quantity.low >= limit:
        return NOT_BELOW
    return CANNOT_TELL


def _judged(row: _PerArea, criterion: Criterion) -> bool:
    return (
        row.reading.counts
        and row.area_cm2 is not None
        and row.frequency_hz == criterion.frequency_hz
    )


def _standing(criterion: Criterion, place: int) -> Callable[[_PerArea], Value]:
    def value(row: _PerArea) -> Value:
        if not _judged(row, criterion):
            return None
        return Formula(
            f'IF(AND(ISNUMBER(J{{r}}),J{{r}}<limit_{place}),"{BELOW}",'
            f'IF(AND(ISNUMBER(I{{r}}),I{{r}}>=limit_{place}),"{NOT_BELOW}","{CANNOT_TELL}"))',
            standing(row.quantity, criterion.ohm_cm2),
        )

    return value


def _last_held(criterion: Criterion, state: int) -> Callable[[_PerArea], Value]:
    """The latest exposure time so far at which the limit was held; empty text where none."""
    own = letter(state)
    last: dict[str, float] = {}

    def value(row: _PerArea) -> Value:
        panel_id = row.reading.panel_id
        if row.area_cm2 is None or row.frequency_hz != criterion.frequency_hz:
            return None
        if _judged(row, criterion) and standing(row.quantity, criterion.ohm_cm2) == NOT_BELOW:
            last[panel_id] = row.reading.exposure_h
        known: float | str = last.get(panel_id, "")
        return Formula(
            f'IF(COUNTIF({own}${row.first_row}:{own}{{r}},"{NOT_BELOW}")=0,"",'
            f'SUMPRODUCT(MAX(({own}${row.first_row}:{own}{{r}}="{NOT_BELOW}")'
            f"*C${row.first_row}:C{{r}})))",
            known,
        )

    return value


def _band(row: _PerArea) -> Value:
    bands = table("criteria")["bands"]
    if row.area_cm2 is None or row.frequency_hz != float(bands["frequency_hz"]):
        return None
    return Formula(
        'IF(AND(ISNUMBER(I{r}),I{r}>=band_good),"good",IF(AND(ISNUMBER(J{r}),J{r}<band_poor),'
        '"poor",IF(AND(ISNUMBER(I{r}),ISNUMBER(J{r}),I{r}>=band_poor,J{r}<band_good),"fair",'
        f'"{CANNOT_TELL}")))',
        band(row.quantity),
    )


def add_pore_resistance(book: Book, assessment: Assessment, places: Places) -> None:
    areas = {panel.panel_id: panel.area_cm2 for panel in assessment.panels}
    rows = [
        _PerArea(r, r.pore_resistance, areas.get(r.panel_id), True, places)
        for r in assessment.readings
        if r.pore_resistance is not None
    ]
    columns = _per_area_columns(("Ω", "Ω cm², or Ω where the panel has no area"))
    book.add_sheet("Pore resistance", columns, rows, colours=COLOURS, standing=3)
    _note_cells(places, "Pore resistance", rows, "pore_resistance")


def add_capacitance(book: Book, assessment: Assessment, places: Places) -> None:
    """The film's capacitance with the permittivity that follows, and the one straight from the
    data."""
    panels = {panel.panel_id: panel for panel in assessment.panels}
    rows = [
        _PerArea(r, r.coating_capacitance, _area_of(panels.get(r.panel_id)), False, places)
        for r in assessment.readings
        if r.coating_capacitance is not None
    ]

    def permittivity(row: _PerArea) -> Value:
        panel = panels.get(row.reading.panel_id)
        value = row.quantity.value
        if panel is None or panel.thickness_um is None or row.area_cm2 is None or value is None:
            return None
        thickness = f"Panels!$D${places.panel_row[panel.panel_id]}"
        now = value * panel.thickness_um * 1e-4 / VACUUM_F_PER_CM
        return Formula(f"H{{r}}*{thickness}*0.0001/vacuum_permittivity_f_per_cm", now)

    columns = _per_area_columns(("F", "F/cm², or F where the panel has no area"))
    columns.append(Column("relative permittivity of the film", permittivity, HUNDREDTHS))
    book.add_sheet("Capacitance", columns, rows, colours=COLOURS, standing=3)
    _note_cells(places, "Capacitance", rows, "coating_capacitance")
    places.capacitance_row = {row.reading.reading_id: i for i, row in enumerate(rows, start=2)}


def _area_of(panel: Any) -> float | None:
    return None if panel is None else panel.area_cm2
