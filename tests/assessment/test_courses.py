"""Replicates together: means, limits, the panel as the unit, bounds counted."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from coatgui.assessment.courses import (
    courses,
    inspections,
    replicate_mean,
    student_95,
)
from coatgui.records import Bound, Course, Quantity, ReadingAssessment

Made = Callable[..., ReadingAssessment]


def _two_sided(value: float) -> Quantity:
    return Quantity(value, value / 1.01, value * 1.01, Bound.TWO_SIDED, "Ω cm²")


def _modulus(found: tuple[Course, ...]) -> Course:
    return next(c for c in found if c.code == "modulus_0.1")


def test_student_points_are_those_of_the_tables() -> None:
    assert [round(student_95(n), 3) for n in (1, 2, 3, 10)] == [12.706, 4.303, 3.182, 2.228]


def test_geometric_mean_and_limits() -> None:
    """10⁸, 10⁹, 10¹⁰: middle 10⁹, s = 1 decade, half-width 4.303/√3 = 2.484 decades."""
    quantity, censored = replicate_mean([_two_sided(v) for v in (1e8, 1e9, 1e10)], True)
    assert censored == 0
    assert quantity.value == pytest.approx(1e9)
    assert quantity.high is not None
    assert np.log10(quantity.high) == pytest.approx(9 + 4.3027 / np.sqrt(3), abs=1e-4)
    assert quantity.bound is Bound.TWO_SIDED


def test_bounds_make_the_mean_a_bound_and_are_counted() -> None:
    bound = Quantity(1e11, 1e11, None, Bound.AT_LEAST, "Ω cm²")
    quantity, censored = replicate_mean([_two_sided(1e9), bound, bound], True)
    assert censored == 2
    assert quantity.bound is Bound.AT_LEAST
    assert quantity.high is None
    assert quantity.value == pytest.approx(10 ** ((9 + 11 + 11) / 3))
    assert "2 of them only bounds" in quantity.method


@given(values=st.lists(st.floats(1e3, 1e12), min_size=2, max_size=6), factor=st.floats(0.01, 100))
def test_scaling_every_panel_scales_the_mean(values: list[float], factor: float) -> None:
    mean, _ = replicate_mean([_two_sided(v) for v in values], True)
    scaled, _ = replicate_mean([_two_sided(v * factor) for v in values], True)
    assert mean.value is not None
    assert scaled.value == pytest.approx(mean.value * factor, rel=1e-9)


def test_times_close_together_are_one_inspection() -> None:
    assert inspections([168.0, 24.0, 170.0, 24.0, 0.0, 336.0]) == (
        (0.0,),
        (24.0,),
        (168.0, 170.0),
        (336.0,),
    )


def test_repeats_on_one_panel_are_one_panel(reading_of: Made) -> None:
    readings = [
        reading_of("K", "K1", 100.0, 1e8),
        reading_of("K", "K1", 101.0, 1e10),
        reading_of("K", "K2", 100.0, 1e9),
    ]
    (point,) = _modulus(courses(readings, (0.1,))).points
    assert point.panels == 2
    assert point.quantity.value == pytest.approx(1e9)


def test_rejected_readings_and_missing_values_do_not_enter(reading_of: Made) -> None:
    readings = [
        reading_of("K", "K1", 24.0, 1e9),
        reading_of("K", "K2", 24.0, 1e3, counts=False),
        reading_of("K", "K3", 24.0, None),
    ]
    (point,) = _modulus(courses(readings, (0.1,))).points
    assert point.panels == 1
    assert point.quantity.value == 1e9


def test_uptake_is_averaged_as_it_is(reading_of: Made) -> None:
    readings = [
        reading_of("K", f"K{i}", 24.0, 1e9, uptake=uptake)
        for i, uptake in enumerate((1.0, 2.0, -0.3))
    ]
    water = next(c for c in courses(readings, (0.1,)) if c.code == "water_uptake")
    assert water.points[0].quantity.value == pytest.approx(0.9)
    assert water.points[0].quantity.unit == "vol-%"


def test_panels_without_area_are_not_mixed_with_the_others(reading_of: Made) -> None:
    readings = [
        reading_of("K", "K1", 24.0, 1e9),
        reading_of("K", "K2", 24.0, 1e8, unit="Ω"),
    ]
    (point,) = _modulus(courses(readings, (0.1,))).points
    assert point.panels == 1
    assert point.quantity.unit == "Ω cm²"


def test_no_readings_no_courses() -> None:
    assert courses([], (0.1,)) == ()
