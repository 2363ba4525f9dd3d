"""The assessment as a table of text, for a terminal."""

from __future__ import annotations

import math
from collections.abc import Sequence

from coatgui.output.text import columns_of, one_line
from coatgui.records import Assessment, Bound, Finding, Quantity, ReadingAssessment, Severity

_SIGNS = {Bound.AT_LEAST: "≥ ", Bound.AT_MOST: "≤ "}


def _number(quantity: Quantity | None) -> str:
    if quantity is None:
        return "–"
    value = quantity.value
    if quantity.bound is Bound.UNDETERMINED or value is None or not math.isfinite(value):
        return "undetermined"
    number = f"{value:.3g}" if value == 0 or 0.01 <= abs(value) < 1000 else f"{value:.2e}"
    return f"{_SIGNS.get(quantity.bound, '')}{number}"


def _state(findings: Sequence[Finding]) -> str:
    severities = [finding.severity for finding in findings]
    doubts, notes = severities.count(Severity.DOUBT), severities.count(Severity.NOTE)
    said = ["■ rejected"] if Severity.REJECT in severities else []
    if doubts:
        said.append(f"▲ {doubts} doubt{'s' if doubts > 1 else ''}")
    if notes:
        said.append(f"{notes} note{'s' if notes > 1 else ''}")
    return ", ".join(said)


def _headings(frequency_hz: float) -> list[str]:
    modulus = f"|Z|·A at {frequency_hz:g} Hz"
    capacitance, water, pores = "film capacitance", "water, vol-%", "pore resistance"
    return ["panel", "hours", modulus, "model", capacitance, water, pores, "findings"]


def _row(reading: ReadingAssessment, frequency_hz: float) -> list[str]:
    modulus = reading.modulus_at(frequency_hz)
    return [
        one_line(reading.panel),
        f"{reading.exposure_h:g}",
        _number(modulus.quantity if modulus else None),
        one_line(reading.fit.model_name) if reading.fit else "not fitted",
        _number(reading.coating_capacitance),
        _number(reading.water_uptake.quantity if reading.water_uptake else None),
        _number(reading.pore_resistance),
        _state(reading.findings),
    ]


def _table(assessment: Assessment) -> list[str]:
    """Readings under the name of their formulation; columns as wide as what stands in them."""
    # The first of the wanted frequencies is the one the campaign is judged by.
    frequencies = [m.frequency_hz for reading in assessment.readings for m in reading.modulus]
    frequency_hz = frequencies[0] if frequencies else 0.1
    headings = _headings(frequency_hz)
    rows = [_row(reading, frequency_hz) for reading in assessment.readings]
    widths = [max(map(columns_of, column)) for column in zip(headings, *rows, strict=True)]

    def line(cells: Sequence[str]) -> str:
        padded = (
            cell + " " * (width - columns_of(cell))
            for cell, width in zip(cells, widths, strict=True)
        )
        return "  ".join(padded).rstrip()

    lines: list[str] = []
    formulation = None
    for reading, row in zip(assessment.readings, rows, strict=True):
        if reading.formulation != formulation:
            formulation = reading.formulation
            lines += ["", one_line(formulation), line(headings)]
        lines.append(line(row))
    return [
        *lines,
        "",
        "Amounts in Ω cm² and F/cm², or Ω and F where the panel has no area; ≥ at least, "
        "≤ at most, – no value.",
    ]


def _panels(assessment: Assessment) -> list[str]:
    lines = []
    for panel in assessment.panels:
        said = [event.text for event in panel.events]
        said += [crossing.text for crossing in panel.limit_crossings if crossing.by_h is not None]
        said += [f.text for f in panel.findings if f.severity is not Severity.NOTE]
        if said:
            lines.append(one_line(f"{panel.panel}: {' '.join(said)}"))
    return lines


def terminal_table(assessment: Assessment) -> str:
    """Readings by formulation and panel, then what they say together, what was refused, and the
    cautions. Text from outside cannot steer the terminal."""
    parts = [
        [one_line(assessment.title), one_line(assessment.headline)],
        _table(assessment) if assessment.readings else ["There are no readings."],
        [one_line(assessment.ranking_text)],
        _panels(assessment),
        [one_line(finding.text) for finding in assessment.findings],
    ]
    if assessment.refused:
        refused = [f"  {one_line(r.file)}: {one_line(r.reason)}" for r in assessment.refused]
        parts.append(["Refused:", *refused])
    if assessment.cautions:
        parts.append(["Cautions:", *(f"  {one_line(caution)}" for caution in assessment.cautions)])
    blocks = ("\n".join(part).strip("\n") for part in parts)
    return "\n\n".join(block for block in blocks if block)
