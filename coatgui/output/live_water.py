"""The sheet Water: Brasher and Kingsbury's law, step by step, from capacitance, dry capacitance and
temperature, in formulas that a reviewer can follow and change."""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass
from typing import Any

from coatgui.assessment.water import water_permittivity
from coatgui.output.cells import Book, Column, Formula, Value
from coatgui.output.live_cells import COLOURS, HOURS, HUNDREDTHS, Places, agrees
from coatgui.output.shown import KINDS
from coatgui.records import Assessment, Bound, Campaign, Quantity, Reading, ReadingAssessment


@dataclass(frozen=True, slots=True)
class _Water:
    """A row: a reading with its uptake and what it follows from. `basis` is None where the sheet
    cannot recompute it."""

    reading: ReadingAssessment
    kept: Reading | None
    uptake: Quantity
    basis: Quantity | None
    dry: Quantity | None
    temperature_c: float
    panel_temperature_c: float | None
    places: Places

    @property
    def at_least(self) -> bool:
        return self.uptake.bound is Bound.AT_LEAST


def _recomputed(basis: Quantity, dry: Quantity, permittivity: float) -> tuple[float, float, float]:
    """Uptake by Brasher–Kingsbury and how far the scatter reaches down and up, vol-%."""
    per = 100 / math.log(permittivity)
    assert basis.value
    assert dry.value
    value = per * math.log(basis.value / dry.value)
    down = per * math.hypot(
        math.log(basis.value / (basis.low or basis.value)),
        math.log((dry.high or dry.value) / dry.value),
    )
    up = per * math.hypot(
        math.log((basis.high or basis.value) / basis.value),
        math.log(dry.value / (dry.low or dry.value)),
    )
    return value, down, up


def _bound_at_least(value: float, down: float) -> float:
    bound = value - down
    return 0.0 if bound < 0 <= value + down else bound


def _water_rows(assessment: Assessment, campaign: Campaign, places: Places) -> list[_Water]:
    panels = {panel.panel_id: panel for panel in assessment.panels}
    own = {panel.panel_id: panel for panel in campaign.panels}
    kept = {reading.reading_id: reading for reading in campaign.readings}
    rows = []
    for r in assessment.readings:
        if r.water_uptake is None:
            continue
        reading, panel = kept.get(r.reading_id), own.get(r.panel_id)
        of_panel = panel.temperature_c if panel else None
        temperature = campaign.settings.temperature_c if of_panel is None else of_panel
        if reading is not None and reading.temperature_c is not None:
            temperature = reading.temperature_c
        dry = panels[r.panel_id].dry_capacitance if r.panel_id in panels else None
        uptake = r.water_uptake.quantity
        basis = None
        for candidate in (r.coating_capacitance, r.capacitance_at_high_frequency):
            if _explains(candidate, dry, uptake, temperature):
                basis = candidate
                break
        rows.append(_Water(r, reading, uptake, basis, dry, temperature, of_panel, places))
    return rows


def _explains(
    basis: Quantity | None, dry: Quantity | None, uptake: Quantity, temperature_c: float
) -> bool:
    if basis is None or dry is None or not basis.value or not dry.value or uptake.value is None:
        return False
    permittivity = float(water_permittivity(temperature_c))
    if math.isnan(permittivity):
        return False
    value, down, up = _recomputed(basis, dry, permittivity)
    if uptake.bound is Bound.AT_LEAST:
        return agrees(_bound_at_least(value, down), uptake.value)
    ends = agrees(value - down, uptake.low) and agrees(value + up, uptake.high)
    return uptake.bound is Bound.TWO_SIDED and agrees(value, uptake.value) and ends


def add_water(book: Book, assessment: Assessment, campaign: Campaign, places: Places) -> None:
    """Brasher–Kingsbury, step by step, from capacitance, dry capacitance and temperature."""
    rows = _water_rows(assessment, campaign, places)

    def capacitance(which: str, column: str) -> Callable[[_Water], Value]:
        def value(row: _Water) -> Value:
            if row.basis is None:
                return None
            number: float | None = getattr(row.basis, which)
            place = places.capacitance_row.get(row.reading.reading_id)
            if place is None or row.basis is not row.reading.coating_capacitance or number is None:
                return number
            return Formula(f"Capacitance!${column}${place}", number)

        return value

    def dry(which: str) -> Callable[[_Water], Value]:
        return lambda row: getattr(row.dry, which, None) if row.basis is not None else None

    def temperature(row: _Water) -> Value:
        if row.kept is not None and row.kept.temperature_c is not None:
            return row.temperature_c
        number = places.panel_row.get(row.reading.panel_id)
        if number is None:
            return row.temperature_c
        cell = f"Panels!$E${number}"
        return Formula(f'IF({cell}="",temperature_c,{cell})', row.temperature_c)

    def permittivity(row: _Water) -> Value:
        now = float(water_permittivity(row.temperature_c))
        if math.isnan(now):
            return None
        return Formula(
            'IF(OR(K{r}<water_from_c,K{r}>water_to_c),"outside the law",'
            "water_a0+K{r}*(water_a1+K{r}*(water_a2+K{r}*water_a3)))",
            now,
        )

    def step(text: str, which: int) -> Callable[[_Water], Value]:
        def value(row: _Water) -> Value:
            if row.basis is None or row.dry is None:
                return None
            now = _recomputed(row.basis, row.dry, float(water_permittivity(row.temperature_c)))
            return Formula(f'IF(ISNUMBER(L{{r}}),{text},"")', now[which])

        return value

    def result(which: str) -> Callable[[_Water], Value]:
        def value(row: _Water) -> Value:
            number: float | None = getattr(row.uptake, which)
            if row.basis is None or number is None:
                return number
            text = {"value": "M{r}", "low": "M{r}-N{r}", "high": "M{r}+O{r}"}[which]
            if row.at_least:
                text = "IF(AND(M{r}-N{r}<0,M{r}+N{r}>=0),0,M{r}-N{r})"
            return Formula(f'IF(ISNUMBER(M{{r}}),{text},"")', number)

        return value

    columns: list[Column[Any]] = [
        Column("formulation", lambda row: row.reading.formulation),
        Column("panel", lambda row: row.reading.panel),
        Column("exposure (h)", lambda row: row.reading.exposure_h, HOURS),
        Column(
            "√ of exposure (√h)",
            lambda row: Formula("SQRT(C{r})", math.sqrt(row.reading.exposure_h)),
            "0.000",
        ),
        Column("capacitance C (F/cm², or F without area)", capacitance("value", "H"), "0.000E+00"),
        Column("C, low 95 % (F/cm², or F without area)", capacitance("low", "I"), "0.000E+00"),
        Column("C, high 95 % (F/cm², or F without area)", capacitance("high", "J"), "0.000E+00"),
        Column("dry capacitance C₀ (F/cm², or F without area)", dry("value"), "0.000E+00"),
        Column("C₀, low 95 % (F/cm², or F without area)", dry("low"), "0.000E+00"),
        Column("C₀, high 95 % (F/cm², or F without area)", dry("high"), "0.000E+00"),
        Column("temperature (°C)", temperature, "0.0"),
        Column("permittivity of water ε_w", permittivity, HUNDREDTHS),
        Column("100·ln(C/C₀)/ln ε_w (vol-%)", step("100*LN(E{r}/H{r})/LN(L{r})", 0), "0.000"),
        Column(
            "scatter downward (vol-%)", step(_spread("E{r}", "F{r}", "J{r}", "H{r}"), 1), "0.000"
        ),
        Column("scatter upward (vol-%)", step(_spread("G{r}", "E{r}", "H{r}", "I{r}"), 2), "0.000"),
        Column("apparent water uptake (vol-%)", result("value"), HUNDREDTHS),
        Column("low 95 % (vol-%)", result("low"), HUNDREDTHS),
        Column("high 95 % (vol-%)", result("high"), HUNDREDTHS),
        Column("kind", lambda row: KINDS[row.uptake.bound]),
        Column("other mixing laws, lowest (vol-%)", _law("law_low"), HUNDREDTHS),
        Column("other mixing laws, highest (vol-%)", _law("law_high"), HUNDREDTHS),
        Column("dry reference (h)", lambda row: row.reading.water_uptake.reference_h, HOURS),
        Column("how", lambda row: row.uptake.method),
    ]
    book.add_sheet("Water", columns, rows, colours=COLOURS, standing=3)
    for number, row in enumerate(rows, start=2):
        places.cells["water_uptake", row.reading.reading_id] = (
            f"'Water'!$P${number}",
            f"'Water'!$P${number}",
            f"'Water'!$Q${number}",
            f"'Water'!$R${number}",
        )


def _law(which: str) -> Callable[[_Water], Value]:
    return lambda row: getattr(row.reading.water_uptake, which)


def _spread(first: str, second: str, third: str, fourth: str) -> str:
    """Two independent scatters added in squares; an end that is not known adds nothing."""
    one = f"IF(AND(ISNUMBER({first}),ISNUMBER({second})),LN({first}/{second}),0)"
    two = f"IF(AND(ISNUMBER({third}),ISNUMBER({fourth})),LN({third}/{fourth}),0)"
    return f"100/LN(L{{r}})*SQRT({one}^2+{two}^2)"
