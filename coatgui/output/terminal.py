"""The assessment as a table of text, for a terminal."""

from __future__ import annotations

import math

from coatgui.records import Assessment, Bound, Quantity, ReadingAssessment, Severity

_SIGNS = {Bound.AT_LEAST: "≥ ", Bound.AT_MOST: "≤ "}
_HEADINGS = (
    ("panel", 8),
    ("hours", 7),
    ("|Z|·A 0.1 Hz", 13),
    ("model", 36),
    ("film capacitance", 17),
    ("water %", 8),
    ("pore resistance", 16),
    ("", 10),
)


def _number(quantity: Quantity | None, digits: int = 3, unit: str = "") -> str:
    if quantity is None:
        return "–"
    if quantity.value is None or not math.isfinite(quantity.value):
        return "undetermined"
    sign = _SIGNS.get(quantity.bound, "")
    plain = 0.01 <= abs(quantity.value) < 1000
    number = f"{quantity.value:.{digits}g}" if plain else f"{quantity.value:.{digits - 1}e}"
    return f"{sign}{number}{unit}"


def _state(reading: ReadingAssessment) -> str:
    worst = {finding.severity for finding in reading.findings}
    if Severity.REJECT in worst:
        return "■ rejected"
    return "▲ doubt" if Severity.DOUBT in worst else ""


def _row(reading: ReadingAssessment) -> list[str]:
    modulus = reading.modulus_at(0.1)
    water = reading.water_uptake.quantity if reading.water_uptake else None
    return [
        reading.panel,
        f"{reading.exposure_h:g}",
        _number(modulus.quantity if modulus else None),
        reading.fit.model_name if reading.fit else "not fitted",
        _number(reading.coating_capacitance),
        _number(water),
        _number(reading.pore_resistance),
        _state(reading),
    ]


def terminal_table(assessment: Assessment) -> str:
    """Readings by formulation and panel, then what they say together, what was refused, and the
    cautions. Amounts are in Ω cm² and F/cm² (per specimen where a panel has no area)."""
    lines = [assessment.title, assessment.headline, ""]
    heading = "  ".join(f"{name:<{width}}" for name, width in _HEADINGS).rstrip()
    formulation = None
    for reading in assessment.readings:
        if reading.formulation != formulation:
            formulation = reading.formulation
            lines += ["", formulation, heading]
        cells = zip(_row(reading), _HEADINGS, strict=True)
        lines.append("  ".join(f"{cell:<{width}}" for cell, (_, width) in cells).rstrip())
    lines += ["", "Amounts in Ω cm² and F/cm²; ≥ at least, ≤ at most, – not held by the data."]
    lines += ["", assessment.ranking_text]
    for panel in assessment.panels:
        said = [event.text for event in panel.events]
        said += [c.text for c in panel.limit_crossings if c.by_h is not None]
        if said:
            lines.append(f"{panel.panel}: {' '.join(said)}")
    if assessment.refused:
        lines += ["", "Refused:"]
        lines += [f"  {refusal.file}: {refusal.reason}" for refusal in assessment.refused]
    lines += ["", "Cautions:"]
    lines += [f"  {caution}" for caution in assessment.cautions]
    return "\n".join(lines)
