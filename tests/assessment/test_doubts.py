"""Readings under doubt stay in a mean, and the mean says so."""

from __future__ import annotations

import re
from collections.abc import Callable
from dataclasses import replace
from pathlib import Path

import pytest

import coatgui
from coatgui.assessment.courses import courses
from coatgui.assessment.doubts import doubtful
from coatgui.assessment.ranking import ranking
from coatgui.assessment.rules import table
from coatgui.assessment.summary import formulation_assessment
from coatgui.records import Campaign, Finding, Formulation, Panel, ReadingAssessment, Severity

Made = Callable[..., ReadingAssessment]


def _doubted(reading: ReadingAssessment, code: str) -> ReadingAssessment:
    return replace(reading, findings=(Finding(code, Severity.DOUBT, "Look."),))


def _three(made: Made) -> list[ReadingAssessment]:
    """Three panels of K; the third looks a thousand times too large, and is doubted."""
    values = {"K1": 1e8, "K2": 1e8, "K3": 1e11}
    readings = [made("K", panel, 24.0, ohm) for panel, ohm in values.items()]
    return [*readings[:2], _doubted(readings[2], "unit_suspected")]


def test_the_mean_keeps_the_doubtful_reading_and_says_so(reading_of: Made) -> None:
    (course,) = [c for c in courses(_three(reading_of), (0.1,)) if c.code == "modulus_0.1"]
    (point,) = course.points
    assert (point.panels, point.doubtful) == (3, 1)
    assert point.quantity.value == pytest.approx(1e9)
    assert point.sound is not None
    assert point.sound.value == pytest.approx(1e8)


def test_the_formulation_says_how_many_in_its_sentence(reading_of: Made) -> None:
    readings = _three(reading_of)
    campaign = Campaign(
        "c",
        "",
        formulations=(Formulation("f", "K"),),
        panels=tuple(Panel(r.panel_id, r.panel, "f", 10.0) for r in readings),
    )
    text = formulation_assessment("f", "K", campaign, readings).text
    assert "1 of 3 from readings under doubt (without them 10⁸ Ω cm²)" in text


def test_the_comparison_says_how_many_of_whom(reading_of: Made) -> None:
    others = [reading_of("M", f"M{i}", 24.0, 1e7 * i) for i in (1, 2, 3)]
    text = ranking({"K": _three(reading_of), "M": others}, 0.1).text
    assert "Readings under doubt are among them: 1 of K." in text
    assert "doubt" not in ranking({"K": _three(reading_of)[:2], "M": others}, 0.1).text


def test_a_doubt_about_the_circuit_does_not_touch_the_modulus(reading_of: Made) -> None:
    reading = _doubted(reading_of("K", "K1", 24.0, 1e8), "fit_poor")
    assert not doubtful(reading, "modulus_0.1")
    assert doubtful(reading, "pore_resistance")
    assert doubtful(reading, "film_resistivity")
    note = replace(reading, findings=(Finding("drift", Severity.NOTE, "Look."),))
    assert not doubtful(note, "modulus_0.1")


def test_every_doubt_in_the_table_is_one_that_is_raised() -> None:
    rooms = Path(coatgui.__file__).parent
    raised = {
        code
        for room in ("quality", "assessment")
        for path in (rooms / room).glob("*.py")
        for code in re.findall(r'"([a-z_]+)"', path.read_text(encoding="utf-8"))
    }
    for entry in table("assessment_doubts")["doubt"]:
        assert set(entry["codes"]) <= raised
        assert len(entry["why"]) > 20
