"""The part of a settings row that says what is asked of an assessment, and a campaign's own
electrolytes and regimes."""

from __future__ import annotations

from typing import Any

from coatgui.campaign.cells import (
    as_float,
    list_of,
    number,
    number_or_none,
    object_of,
    string,
    to_json,
    whole,
)
from coatgui.campaign.changes import Cell, Row
from coatgui.records import (
    Electrolyte,
    Judge,
    Limit,
    Method,
    ProjectionWanted,
    Question,
    Regime,
    Settings,
    Side,
)


def cells_of(settings: Settings) -> dict[str, Cell]:
    return {
        "limits": to_json([_limit_cell(limit) for limit in settings.limits]),
        "comparisons": to_json([_question_cell(question) for question in settings.comparisons]),
        "projections": to_json(
            [
                {
                    "quantity": p.quantity,
                    "frequency_hz": as_float(p.frequency_hz),
                    "until_h": float(p.until_h),
                }
                for p in settings.projections
            ]
        ),
        "electrolytes": to_json(
            [
                {
                    "id": e.electrolyte_id,
                    "name": e.name,
                    "resistivity_ohm_cm": as_float(e.resistivity_ohm_cm),
                    "source": e.source,
                    "known_by": e.known_by,
                }
                for e in settings.electrolytes
            ]
        ),
        "regimes": to_json([_regime_cell(regime) for regime in settings.regimes]),
        "uptake_from_high_frequency": int(settings.uptake_from_high_frequency),
    }


def read(row: Row) -> dict[str, Any]:
    """The fields of `Settings` that `cells_of` wrote."""
    return {
        "limits": tuple(_limit(object_of(told)) for told in list_of(row["limits"])),
        "comparisons": tuple(_question(object_of(told)) for told in list_of(row["comparisons"])),
        "projections": tuple(
            ProjectionWanted(
                string(told["quantity"]),
                number(told["until_h"]),
                number_or_none(told["frequency_hz"]),
            )
            for told in list_of(row["projections"])
        ),
        "electrolytes": tuple(
            Electrolyte(
                string(told["id"]),
                string(told["name"]),
                number_or_none(told["resistivity_ohm_cm"]),
                string(told["source"]),
                tuple(tuple(map(string, words)) for words in told["known_by"]),
            )
            for told in list_of(row["electrolytes"])
        ),
        "regimes": tuple(_regime(object_of(told)) for told in list_of(row["regimes"])),
        "uptake_from_high_frequency": bool(whole(row["uptake_from_high_frequency"])),
    }


def _limit_cell(limit: Limit) -> dict[str, Any]:
    return {
        "name": limit.name,
        "quantity": limit.quantity,
        "frequency_hz": as_float(limit.frequency_hz),
        "side": limit.side.value,
        "value": float(limit.value),
        "unit": limit.unit,
        "source": limit.source,
    }


def _limit(told: dict[str, Any]) -> Limit:
    return Limit(
        string(told["name"]),
        string(told["quantity"]),
        number(told["value"]),
        string(told["unit"]),
        string(told["source"]),
        Side(told["side"]),
        number_or_none(told["frequency_hz"]),
    )


def _question_cell(question: Question) -> dict[str, Any]:
    return {
        "quantity": question.quantity,
        "frequency_hz": as_float(question.frequency_hz),
        "judge": question.judge.value,
        "method": question.method.value,
        "exposure_h": as_float(question.exposure_h),
        "limit": None if question.limit is None else _limit_cell(question.limit),
        "scale": question.scale,
        "reference": question.reference,
    }


def _question(told: dict[str, Any]) -> Question:
    return Question(
        string(told["quantity"]),
        number_or_none(told["frequency_hz"]),
        Judge(told["judge"]),
        Method(told["method"]),
        number_or_none(told["exposure_h"]),
        None if told["limit"] is None else _limit(object_of(told["limit"])),
        string(told["scale"]),
        string(told["reference"]),
    )


def _regime_cell(regime: Regime) -> dict[str, Any]:
    return {
        "id": regime.regime_id,
        "name": regime.name,
        "conditions": regime.conditions,
        "electrolyte": regime.electrolyte_id,
        "temperature_c": as_float(regime.temperature_c),
        "cycle_h": as_float(regime.cycle_h),
        "duration_h": None if regime.duration_h is None else [*map(float, regime.duration_h)],
        "source": regime.source,
    }


def _regime(told: dict[str, Any]) -> Regime:
    duration_h = None
    if told["duration_h"] is not None:
        first, last = map(number, told["duration_h"])
        duration_h = first, last
    return Regime(
        string(told["id"]),
        string(told["name"]),
        string(told["conditions"]),
        string(told["electrolyte"]),
        number_or_none(told["temperature_c"]),
        number_or_none(told["cycle_h"]),
        duration_h,
        string(told["source"]),
    )
