"""The assessment as JSON, for scripts: schema `coatgui-assessment/1`, published in
`resources/assessment.schema.json`. Keys may be added, never renamed or removed."""

from __future__ import annotations

import json
import math
from dataclasses import fields, is_dataclass
from enum import Enum
from pathlib import Path
from typing import IO, Any

from coatgui.output.text import whole_text
from coatgui.output.whole import write_whole
from coatgui.records import (
    ActiveArea,
    Assessment,
    Finding,
    LimitCrossing,
    Quantity,
    ReadingAssessment,
    WaterUptake,
)

SCHEMA = "coatgui-assessment/1"


def _writable(value: Any) -> Any:
    """The same structure with every number that is not finite as null, and text that UTF-8 can
    hold."""
    if isinstance(value, dict):
        return {_writable(key): _writable(inner) for key, inner in value.items()}
    if isinstance(value, list | tuple):
        return [_writable(inner) for inner in value]
    if isinstance(value, str):
        return whole_text(value)
    if isinstance(value, float):
        return float(value) if math.isfinite(value) else None
    return value


def _plain(value: Any) -> Any:
    """A record as an object with its fields' names, and what lies in it likewise."""
    if isinstance(value, Enum):
        return value.value
    if is_dataclass(value):
        return {f.name: _plain(getattr(value, f.name)) for f in fields(value)}
    if isinstance(value, tuple):
        return [_plain(inner) for inner in value]
    return value


def _limits(quantity: Quantity) -> dict[str, Any]:
    return {"low": quantity.low, "high": quantity.high, "bound": quantity.bound.value}


def _finding(finding: Finding) -> dict[str, Any]:
    return {
        "code": finding.code,
        "severity": finding.severity.value,
        "text": finding.text,
        "evidence": dict(finding.evidence),
    }


def _amount(quantity: Quantity | None, key: str) -> dict[str, Any] | None:
    if quantity is None:
        return None
    return {
        key: quantity.value,
        **_limits(quantity),
        "unit": quantity.unit,
        "method": quantity.method,
    }


def _reading(reading: ReadingAssessment) -> dict[str, Any]:
    modulus = {}
    for entry in reading.modulus:
        quantity = entry.quantity
        modulus[f"{entry.frequency_hz:g}"] = {
            "ohm_cm2": None if quantity is None else quantity.value,
            "status": entry.status.value,
            "low": None if quantity is None else quantity.low,
            "high": None if quantity is None else quantity.high,
            "bound": None if quantity is None else quantity.bound.value,
            "unit": None if quantity is None else quantity.unit,
        }
    uptake = _amount(
        reading.water_uptake.quantity if reading.water_uptake else None, "volume_percent"
    )
    if uptake is not None and reading.water_uptake is not None:
        uptake |= _laws(reading.water_uptake)
    fit = reading.fit
    return {
        "panel": reading.panel,
        "formulation": reading.formulation,
        "exposure_h": reading.exposure_h,
        "file": reading.file,
        "sha256": reading.sha256,
        "points": {
            "read": reading.points_read,
            "used": reading.points_used,
            "left_out": [
                {"frequency_hz": point.frequency_hz, "reason": point.reason}
                for point in reading.left_out
            ],
        },
        "findings": [_finding(finding) for finding in reading.findings],
        "counts": reading.counts,
        "modulus": modulus,
        "model": fit.model_name if fit else None,
        "model_id": fit.model if fit else None,
        "residual_rms_percent": fit.residual_rms_percent if fit else None,
        "tried": [
            {"model": trial.model, "aicc": trial.aicc, "remark": trial.remark}
            for trial in (fit.trials if fit else ())
        ],
        "parameters": [
            {
                "symbol": parameter.symbol,
                "value": parameter.quantity.value,
                "unit": parameter.quantity.unit,
                **_limits(parameter.quantity),
            }
            for parameter in reading.parameters
        ],
        "coating_capacitance": _amount(reading.coating_capacitance, "f_per_cm2"),
        "capacitance_at_high_frequency": _amount(
            reading.capacitance_at_high_frequency, "f_per_cm2"
        ),
        "pore_resistance": _amount(reading.pore_resistance, "ohm_cm2"),
        "water_uptake": uptake,
        "relative_permittivity": _plain(reading.relative_permittivity),
        "film_resistivity": _amount(reading.film_resistivity, "ohm_cm"),
        "breakpoint": _plain(reading.breakpoint),
        "active_area": _active_area(reading.active_area),
    }


def _laws(uptake: WaterUptake) -> dict[str, Any]:
    return {
        "reference_h": uptake.reference_h,
        "law_low": uptake.law_low,
        "law_high": uptake.law_high,
        "by_law": dict(uptake.by_law),
    }


def _active_area(area: ActiveArea | None) -> dict[str, Any] | None:
    if area is None:
        return None
    routes = {name: _plain(quantity) for name, quantity in area.routes}
    return {"routes": routes, "low": area.low, "high": area.high, "text": area.text}


def _saturation(uptake: WaterUptake | None) -> dict[str, Any] | None:
    if uptake is None:
        return None
    return {**(_amount(uptake.quantity, "volume_percent") or {}), **_laws(uptake)}


def _crossing(crossing: LimitCrossing) -> dict[str, Any]:
    return {
        "criterion": crossing.criterion.name,
        "frequency_hz": crossing.criterion.frequency_hz,
        "ohm_cm2": crossing.criterion.ohm_cm2,
        "after_h": crossing.after_h,
        "by_h": crossing.by_h,
        "watched_h": crossing.watched_h,
        "text": crossing.text,
    }


def assessment_json(assessment: Assessment) -> dict[str, Any]:
    """The assessment as plain data; a number that is missing or not finite is None."""
    data = _top(assessment)
    data["readings"] = [_reading(reading) for reading in assessment.readings]
    result: dict[str, Any] = _writable(data)
    return result


def _top(assessment: Assessment) -> dict[str, Any]:
    """Everything but the readings, whose place is kept."""
    return {
        "schema": SCHEMA,
        "title": assessment.title,
        "headline": assessment.headline,
        "readings": [],
        "panels": [
            {
                "panel": panel.panel,
                "formulation": panel.formulation,
                "area_cm2": panel.area_cm2,
                "thickness_um": panel.thickness_um,
                "dry_capacitance": _amount(panel.dry_capacitance, "f_per_cm2"),
                "diffusion_coefficient": _amount(panel.diffusion_coefficient, "cm2_per_s"),
                "dry_permittivity": _plain(panel.dry_permittivity),
                "saturation_uptake": _saturation(panel.saturation_uptake),
                "saturation_mass_percent": _plain(panel.saturation_mass_percent),
                "advice": list(panel.advice),
                "findings": [_finding(finding) for finding in panel.findings],
                "events": [_plain(e) for e in panel.events],
                "limit_crossings": [_crossing(c) for c in panel.limit_crossings],
            }
            for panel in assessment.panels
        ],
        "formulations": [
            {
                "formulation": formulation.formulation,
                "panels": formulation.panels,
                "text": formulation.text,
                "courses": {
                    course.code: [
                        {
                            "exposure_h": point.exposure_h,
                            "value": point.quantity.value,
                            "low": point.quantity.low,
                            "high": point.quantity.high,
                            "unit": point.quantity.unit,
                            "panels": point.panels,
                            "censored": point.censored,
                            "doubtful": point.doubtful,
                            "sound": _plain(point.sound),
                        }
                        for point in course.points
                    ]
                    for course in formulation.courses
                },
            }
            for formulation in assessment.formulations
        ],
        "ranking": [_plain(rank) for rank in assessment.ranking],
        "ranking_text": assessment.ranking_text,
        "refused": [{"file": r.file, "reason": r.reason} for r in assessment.refused],
        "findings": [_finding(finding) for finding in assessment.findings],
        "cautions": list(assessment.cautions),
        "comparison": _plain(assessment.comparison),
        "further_comparisons": _plain(assessment.further_comparisons),
        "trends": _plain(assessment.trends),
        "limit_studies": _plain(assessment.limit_studies),
        "projections": _plain(assessment.projections),
        "ratings": _plain(assessment.ratings),
        "rating_correlations": _plain(assessment.rating_correlations),
        "next_inspection": _plain(assessment.next_inspection),
    }


def write_json(assessment: Assessment, path: Path) -> None:
    """Write the JSON file whole or not at all, a reading to a line. Raises OSError."""

    def text(value: Any) -> str:
        return json.dumps(_writable(value), ensure_ascii=False, allow_nan=False)

    def write(file: IO[bytes]) -> None:
        # Piece by piece: the whole of a large campaign would fill the memory.
        opening = "{"
        for key, value in _top(assessment).items():
            file.write(f"{opening}\n{text(key)}: ".encode())
            opening = ","
            if key != "readings":
                file.write(text(value).encode())
                continue
            between = "[\n"
            for reading in assessment.readings:
                file.write(f"{between}{text(_reading(reading))}".encode())
                between = ",\n"
            file.write(b"\n]" if assessment.readings else b"[]")
        file.write(b"\n}\n")

    write_whole(path, write)
