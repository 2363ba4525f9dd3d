"""The JSON against its published schema, by a small validator of the words that the schema uses."""

from __future__ import annotations

import json
from dataclasses import replace
from pathlib import Path
from typing import Any

import pytest

from coatgui.assessment import assess
from coatgui.campaign import campaign_from_found
from coatgui.intake import read_folder
from coatgui.output import assessment_json, write_json
from coatgui.records import (
    Assessment,
    Bound,
    Campaign,
    ProjectionWanted,
    Quantity,
    Rating,
    VisualRating,
)
from coatgui.shipped import resource, sample_panels

SCHEMA = json.loads(resource("assessment.schema.json").read_text(encoding="utf-8"))
KNOWN = {
    "$schema", "$defs", "$ref", "title", "description", "type", "properties", "required",
    "additionalProperties", "items", "enum", "const", "anyOf",
}  # fmt: skip
TYPES: dict[str, tuple[type, ...]] = {
    "object": (dict,),
    "array": (list,),
    "string": (str,),
    "number": (int, float),
    "integer": (int,),
    "boolean": (bool,),
    "null": (type(None),),
}


def problems(value: Any, schema: dict[str, Any], at: str = "$") -> list[str]:
    """Where a value breaks the schema, and keys that the schema does not describe."""
    if "$ref" in schema:
        return problems(value, SCHEMA["$defs"][schema["$ref"].removeprefix("#/$defs/")], at)
    if "anyOf" in schema:
        tried = [problems(value, option, at) for option in schema["anyOf"]]
        return [] if [] in tried else min(tried, key=len)
    if "const" in schema and value != schema["const"]:
        return [f"{at}: {value!r} is not {schema['const']!r}"]
    if "enum" in schema and value not in schema["enum"]:
        return [f"{at}: {value!r} is not one of {schema['enum']}"]
    if "type" in schema:
        names = [schema["type"]] if isinstance(schema["type"], str) else schema["type"]
        allowed = tuple(kind for name in names for kind in TYPES[name])
        if not isinstance(value, allowed) or (isinstance(value, bool) and bool not in allowed):
            return [f"{at}: {value!r} is not {names}"]
    found: list[str] = []
    if isinstance(value, list):
        for i, inner in enumerate(value):
            found += problems(inner, schema.get("items", {}), f"{at}[{i}]")
    if isinstance(value, dict):
        described = schema.get("properties", {})
        found += [
            f"{at}: '{name}' is missing" for name in schema.get("required", ()) if name not in value
        ]
        for name, inner in value.items():
            if name in described:
                found += problems(inner, described[name], f"{at}.{name}")
            elif "additionalProperties" in schema:
                found += problems(inner, schema["additionalProperties"], f"{at}.{name}")
            else:
                found.append(f"{at}: '{name}' is not described")
    return found


def words(schema: Any) -> set[str]:
    """Words of the schema language that are used in a schema."""
    if not isinstance(schema, dict):
        return set()
    found = set(schema)
    for name in ("properties", "$defs"):
        for inner in schema.get(name, {}).values():
            found |= words(inner)
    for name in ("items", "additionalProperties"):
        found |= words(schema.get(name))
    for inner in schema.get("anyOf", ()):
        found |= words(inner)
    return found


@pytest.fixture(scope="module")
def sample() -> tuple[Campaign, Assessment]:
    campaign = campaign_from_found(read_folder(sample_panels()), "Sample")
    campaign = replace(
        campaign,
        settings=replace(
            campaign.settings, projections=(ProjectionWanted("modulus", 1000.0, 0.1),)
        ),
        ratings=tuple(
            Rating(panel.name, VisualRating(panel.panel_id, 672.0, "astm_d610", value))
            for panel, value in zip(campaign.panels, ["10", "9", "8", "7"] * 3, strict=True)
        ),
    )
    return campaign, assess(campaign)


def test_the_validator_knows_every_word_of_the_schema() -> None:
    assert words(SCHEMA) <= KNOWN
    assert problems({"schema": "other"}, SCHEMA)
    assert problems([], SCHEMA) == ["$: [] is not ['object']"]


def test_the_sample_keeps_to_the_schema(sample: tuple[Campaign, Assessment]) -> None:
    data = json.loads(json.dumps(assessment_json(sample[1])))
    assert problems(data, SCHEMA) == []
    for name in ("comparison", "trends", "limit_studies", "projections", "ratings"):
        assert data[name], name


def test_every_kind_of_answer_keeps_to_the_schema(assessment: Assessment) -> None:
    assert problems(assessment_json(assessment), SCHEMA) == []
    empty = Assessment("t", (), (), (), (), "", (), (), ())
    assert problems(assessment_json(empty), SCHEMA) == []


def test_what_breaks_the_schema_is_found(assessment: Assessment) -> None:
    data = assessment_json(assessment)
    data["readings"][0]["exposure_h"] = "24"
    data["readings"][0]["points"].pop("used")
    data["panels"][0]["area"] = 1.0
    assert len(problems(data, SCHEMA)) == 3


def numbers(quantity: Quantity | None) -> tuple[float | None, float | None, float | None]:
    if quantity is None:
        return None, None, None
    return quantity.value, quantity.low, quantity.high


def test_every_number_comes_back_exactly(
    sample: tuple[Campaign, Assessment], tmp_path: Path
) -> None:
    _, assessment = sample
    write_json(assessment, tmp_path / "o.json")
    data = json.loads((tmp_path / "o.json").read_text(encoding="utf-8"))
    assert len(data["readings"]) == len(assessment.readings)
    for shown, known in zip(data["readings"], assessment.readings, strict=True):
        assert shown["exposure_h"] == known.exposure_h
        for modulus in known.modulus:
            own = shown["modulus"][f"{modulus.frequency_hz:g}"]
            assert (own["ohm_cm2"], own["low"], own["high"]) == numbers(modulus.quantity)
        for name, key in (("coating_capacitance", "f_per_cm2"), ("pore_resistance", "ohm_cm2")):
            own = shown[name] or {key: None, "low": None, "high": None}
            assert (own[key], own["low"], own["high"]) == numbers(getattr(known, name))
        for own, parameter in zip(shown["parameters"], known.parameters, strict=True):
            assert (own["value"], own["low"], own["high"]) == numbers(parameter.quantity)
            assert Bound(own["bound"]) is parameter.quantity.bound
    comparison = assessment.comparison
    assert comparison is not None
    assert data["comparison"]["text"] == comparison.text
    for own, pair in zip(data["comparison"]["pairs"], comparison.pairs, strict=True):
        assert (own["probability"], own["adjusted"]) == (pair.probability, pair.adjusted)
        assert own["differ"] is pair.differ
    ranks = [(r["formulation"], r["rank_low"], r["rank_high"], r["group"]) for r in data["ranking"]]
    assert ranks == [(r.formulation, r.rank_low, r.rank_high, r.group) for r in comparison.ranks]


def test_a_reading_without_anything_is_still_valid(assessment: Assessment) -> None:
    bare = replace(
        assessment.readings[0],
        modulus=(),
        fit=None,
        parameters=(),
        coating_capacitance=None,
        capacitance_at_high_frequency=None,
        pore_resistance=None,
        water_uptake=None,
        findings=(),
    )
    assert problems(assessment_json(replace(assessment, readings=(bare,))), SCHEMA) == []
