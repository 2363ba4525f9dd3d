"""The JSON keeps to its schema, key by key."""

from __future__ import annotations

import json
from dataclasses import replace
from pathlib import Path
from typing import Any

from coatgui.output import assessment_json, write_json
from coatgui.records import Assessment

# What other people's scripts rely on: more may be added, none of these may go.
READING = {
    "panel", "formulation", "exposure_h", "file", "sha256", "points", "findings", "modulus",
    "model", "residual_rms_percent", "parameters", "coating_capacitance", "pore_resistance",
    "water_uptake",
}  # fmt: skip
TOP = {"schema", "readings", "panels", "formulations", "ranking", "refused"}
PANEL = {"panel", "formulation", "area_cm2", "thickness_um", "events", "limit_crossings"}


def test_every_promised_key_is_there(assessment: Assessment) -> None:
    data = assessment_json(assessment)
    assert data["schema"] == "coatgui-assessment/1"
    assert set(data) >= TOP
    for reading in data["readings"]:
        assert set(reading) >= READING
        assert set(reading["points"]) == {"read", "used", "left_out"}
    for panel in data["panels"]:
        assert set(panel) >= PANEL
    first = data["readings"][0]
    assert first["points"]["left_out"] == [{"frequency_hz": 1.0, "reason": "wild point"}]
    assert set(first["findings"][0]) >= {"code", "severity", "text"}
    assert set(first["parameters"][0]) >= {"symbol", "value", "unit", "low", "high", "bound"}
    assert set(first["coating_capacitance"]) >= {"f_per_cm2", "low", "high", "method"}
    assert set(first["pore_resistance"]) >= {"ohm_cm2", "low", "high", "bound"}
    uptake = {"volume_percent", "low", "high", "method", "reference_h"}
    assert set(first["water_uptake"]) >= uptake
    assert set(data["ranking"][1]) >= {"formulation", "rank_low", "rank_high", "group"}
    assert data["ranking"][1]["rank_high"] == 2
    assert data["refused"] == [{"file": "notes.txt", "reason": "No table."}]
    assert data["formulations"][0]["panels"] == 1


def test_bounds_and_states_come_through(assessment: Assessment) -> None:
    first, second = assessment_json(assessment)["readings"]
    assert first["modulus"]["0.1"]["status"] == "interpolated"
    assert first["modulus"]["0.01"]["status"] == "not_reached"
    assert first["modulus"]["0.01"]["ohm_cm2"] is None
    assert first["findings"][0]["severity"] == "doubt"
    bounds = [parameter["bound"] for parameter in first["parameters"]]
    assert bounds[:4] == ["two_sided", "at_least", "at_most", "fixed"]
    assert first["pore_resistance"]["low"] == 3e9
    assert first["pore_resistance"]["high"] is None
    assert second["model"] is None
    assert second["coating_capacitance"] is None
    assert second["water_uptake"] is None
    # No area: the value is per specimen, and the unit says so.
    assert second["pore_resistance"]["unit"] == "Ω"
    assert second["modulus"]["0.01"]["unit"] == "Ω"


def numbers(value: Any) -> list[float]:
    if isinstance(value, dict):
        value = list(value.values())
    if isinstance(value, list):
        return [number for inner in value for number in numbers(inner)]
    return [value] if isinstance(value, float) else []


def test_numbers_are_whole_or_null(assessment: Assessment, tmp_path: Path) -> None:
    write_json(assessment, tmp_path / "x.json")

    def refuse(word: str) -> float:
        raise AssertionError(word)

    text = (tmp_path / "x.json").read_text(encoding="utf-8")
    data = json.loads(text, parse_constant=refuse)
    first = data["readings"][0]
    assert first["parameters"][0]["value"] == 1e-9 * (1 / 3)
    last = first["parameters"][-1]
    assert (last["value"], last["low"], last["high"]) == (None, None, None)
    assert first["tried"][0]["aicc"] is None
    assert first["findings"][0]["evidence"] == {"percent": None}
    assert len(numbers(data)) > 20


def test_a_name_that_is_not_utf8_does_not_stop_the_file(
    assessment: Assessment, tmp_path: Path
) -> None:
    reading = replace(assessment.readings[0], file="M\udcfc1.csv", panel="漢")
    write_json(replace(assessment, readings=(reading,)), tmp_path / "x.json")
    data = json.loads((tmp_path / "x.json").read_text(encoding="utf-8"))
    assert data["readings"][0]["file"] == "M\ufffd1.csv"
    assert data["readings"][0]["panel"] == "漢"
