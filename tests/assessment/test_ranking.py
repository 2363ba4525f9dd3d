"""Comparisons of formulations: order, groups, words, and how often they are wrong."""

from __future__ import annotations

from collections.abc import Callable
from itertools import combinations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from coatgui.assessment.comparison import compare, probabilities
from coatgui.assessment.ranking import answer, ranking
from coatgui.assessment.ratings import Rated
from coatgui.assessment.rules import rule
from coatgui.assessment.significance import Entry, welch
from coatgui.records import (
    Bound,
    Judge,
    Limit,
    Method,
    Question,
    ReadingAssessment,
    VisualRating,
)

Made = Callable[..., ReadingAssessment]


def _readings(
    made: Made, logs: dict[str, list[float]], hours: float = 1008.0, **more: object
) -> dict[str, list[ReadingAssessment]]:
    return {
        name: [
            made(name, f"{name}{i}", hours, 10.0**value, **more) for i, value in enumerate(values)
        ]
        for name, values in logs.items()
    }


def test_best_is_named_and_the_rest_cannot_be_told_apart(reading_of: Made) -> None:
    logs = {
        "K": [9.8, 9.9, 10.0, 9.7],
        "M": [7.1, 7.9, 7.4, 7.6],
        "P": [7.0, 7.7, 7.5, 7.2],
    }
    found = ranking(_readings(reading_of, logs), 0.1)
    assert found.text.startswith(
        "K is ahead of the rest; M and P cannot be told apart with four panels each."
    )
    by_name = {r.formulation: r for r in found.ranks}
    assert [r.formulation for r in found.ranks] == ["K", "M", "P"]
    assert (by_name["K"].rank_low, by_name["K"].rank_high, by_name["K"].group) == (1, 1, "a")
    for name in ("M", "P"):
        assert (by_name[name].rank_low, by_name[name].rank_high) == (2, 3)
        assert by_name[name].group == "b"


def test_overlapping_groups_and_words(reading_of: Made) -> None:
    logs = {"A": [9.0, 9.05, 9.1, 9.15], "B": [8.4, 8.9, 8.2, 9.2], "C": [8.0, 8.1, 8.05, 8.15]}
    found = ranking(_readings(reading_of, logs), 0.1)
    by_name = {r.formulation: r for r in found.ranks}
    assert by_name["A"].group == "a"
    assert by_name["B"].group == "ab"
    assert by_name["C"].group == "b"
    assert (by_name["B"].rank_low, by_name["B"].rank_high) == (1, 3)
    assert "A is ahead of C" in found.text
    assert "cannot be told apart" in found.text


def test_complete_order(reading_of: Made) -> None:
    logs = {"A": [9.0, 9.01, 9.02], "B": [8.0, 8.01, 8.02], "C": [7.0, 7.01, 7.02]}
    found = ranking(_readings(reading_of, logs), 0.1)
    assert found.text.startswith("A is ahead of the rest; B is ahead of C.")
    assert [(r.rank_low, r.rank_high) for r in found.ranks] == [(1, 1), (2, 2), (3, 3)]


def test_one_panel_is_too_few(reading_of: Made) -> None:
    found = ranking(_readings(reading_of, {"K": [9.0, 9.1], "M": [7.0]}), 0.1)
    assert found.ranks == ()
    assert "M has fewer than two panels" in found.text


def test_one_formulation_is_not_compared(reading_of: Made) -> None:
    assert ranking(_readings(reading_of, {"K": [9.0, 9.1]}), 0.1).ranks == ()


def test_last_shared_inspection_is_used(reading_of: Made) -> None:
    early = _readings(reading_of, {"K": [9.0, 9.1, 9.2], "M": [7.0, 7.1, 7.2]}, 336.0)
    late = _readings(reading_of, {"K": [6.0, 6.1, 6.2]}, 1008.0)
    found = ranking({"K": early["K"] + late["K"], "M": early["M"]}, 0.1)
    assert found.ranks[0].formulation == "K"
    assert "336 h" in found.text


def test_bounds_enter_and_are_said(reading_of: Made) -> None:
    high = _readings(reading_of, {"K": [10.9, 11.0, 11.1]}, bound=Bound.AT_LEAST)
    low = _readings(reading_of, {"M": [7.0, 7.1, 7.2]})
    found = ranking(high | low, 0.1)
    assert [r.group for r in found.ranks] == ["a", "b"]
    assert "3 values at the measuring limit entered as lower bounds" in found.text


def test_a_lower_bound_is_not_proved_worse(reading_of: Made) -> None:
    high = _readings(reading_of, {"K": [11.9, 12.0, 12.1]})
    bounded = _readings(reading_of, {"M": [10.0, 10.1, 10.2]}, bound=Bound.AT_LEAST)
    found = ranking(high | bounded, 0.1)
    assert {r.group for r in found.ranks} == {"a"}
    assert "cannot be told apart" in found.text


@given(factor=st.floats(0.01, 100.0))
def test_scaling_all_areas_changes_no_rank(factor: float) -> None:
    logs = {"K": [9.8, 9.9, 10.0], "M": [7.1, 7.9, 7.4], "P": [7.0, 7.7, 7.5]}

    def groups(shift: float) -> list[float]:
        return [
            welch([v + shift for v in logs[a]], [v + shift for v in logs[b]])
            for a, b in combinations(logs, 2)
        ]

    assert groups(float(np.log10(factor))) == pytest.approx(groups(0.0), rel=1e-6)


def _panels(random: np.random.Generator, means: list[float], panels: int) -> list[list[float]]:
    """log₁₀|Z| of formulations whose spread between panels is itself between 0.15 and 0.5."""
    return [random.normal(m, random.uniform(0.15, 0.5), panels).tolist() for m in means]


@pytest.mark.parametrize("method", [Method.WELCH, Method.RANKS])
def test_identical_formulations_are_seldom_called_different(method: Method) -> None:
    """At most 5 percent of a thousand campaigns, with 3 to 5 panels of each of three
    formulations."""
    random = np.random.default_rng(11)
    total = 1000
    wrong = 0
    for number in range(total):
        logs = _panels(random, [8.0, 8.0, 8.0], 3 + number % 3)
        entries = [[Entry(v, v, v) for v in values] for values in logs]
        _, adjusted = probabilities("KMP", entries, method, "")
        wrong += min(adjusted.values()) < rule("ranking.significance")
    assert wrong <= 0.05 * total


@pytest.mark.parametrize(("panels", "least"), [(3, 0.30), (4, 0.50), (5, 0.65)])
def test_power_at_one_decade(panels: int, least: float) -> None:
    """Two formulations a decade apart, 0.15 to 0.5 decades between panels: how often proved."""
    random = np.random.default_rng(12)
    proved = 0
    for _ in range(300):
        a, b = _panels(random, [8.0, 7.0], panels)
        entries = {"A": [Entry(v, v, v) for v in a], "B": [Entry(v, v, v) for v in b]}
        proved += ("A", "B") in compare(entries, Method.WELCH, "decades").proved
    assert proved >= least * 300


def test_drawn_ranks_hold_the_order_open(reading_of: Made) -> None:
    logs = {"K": [9.8, 9.9, 10.0, 9.7], "M": [7.1, 7.9, 7.4, 7.6], "P": [7.0, 7.7, 7.5, 7.2]}
    by_name = {r.formulation: r for r in ranking(_readings(reading_of, logs), 0.1).ranks}
    assert (by_name["K"].bootstrap_low, by_name["K"].bootstrap_high) == (1, 1)
    assert (by_name["M"].bootstrap_low, by_name["M"].bootstrap_high) == (2, 3)


def test_effort_says_what_it_would_take(reading_of: Made) -> None:
    logs = {"K": [8.6, 8.2, 8.9], "M": [8.0, 7.9, 8.5]}
    (said,) = ranking(_readings(reading_of, logs), 0.1).effort
    assert said.startswith("K and M differ by 0.43 decades, not proved.")
    assert "panels each would" in said
    assert "with 3 panels each a difference from" in said
    bounded = _readings(reading_of, {"K": [11.0, 11.1, 11.2]}, bound=Bound.AT_LEAST)
    (said,) = ranking(bounded | _readings(reading_of, {"M": [10.9, 11.1, 11.3]}), 0.1).effort
    assert "measuring limit" in said


def test_growing_distance_says_how_much_longer(reading_of: Made) -> None:
    random = np.random.default_rng(1)
    readings: dict[str, list[ReadingAssessment]] = {"K": [], "M": []}
    offsets = {name: random.normal(0, 0.25, 3) for name in readings}
    for hours in (168.0, 336.0, 504.0, 672.0, 840.0):
        for name, slope in (("K", 0.0), ("M", -0.5)):
            logs = 9 + slope * hours / 840 + offsets[name]
            readings[name] += _readings(reading_of, {name: logs.tolist()}, hours)[name]
    (said,) = ranking(readings, 0.1).effort
    assert "has been growing" in said
    assert "not a prediction" in said


def test_against_a_reference(reading_of: Made) -> None:
    logs = {"K": [9.8, 9.9, 10.0], "M": [7.1, 7.9, 7.4], "P": [7.0, 7.7, 7.5]}
    question = Question(method=Method.DUNNETT, reference="M")
    found = answer(question, _readings(reading_of, logs))
    assert found.text.startswith("K is ahead of M; P cannot be told from M with three panels each.")
    assert {(p.first, p.second) for p in found.pairs} == {("K", "M"), ("M", "P")}
    with pytest.raises(ValueError, match="reference"):
        answer(Question(method=Method.DUNNETT, reference="Q"), _readings(reading_of, logs))


@pytest.mark.parametrize("method", [Method.TUKEY, Method.DUNNETT, Method.WELCH])
def test_pooled_tests_say_where_the_spreads_are_not_alike(reading_of: Made, method: Method) -> None:
    question = Question(method=method, reference="K" if method is Method.DUNNETT else "")
    uneven = _readings(reading_of, {"K": [9.0, 9.1, 9.2], "M": [8.0, 8.4, 8.8]})
    said = "takes it to be alike" in answer(question, uneven).text
    assert said == (method is not Method.WELCH)
    even = _readings(reading_of, {"K": [9.0, 9.1, 9.2], "M": [8.0, 8.1, 8.2]})
    assert "takes it to be alike" not in answer(question, even).text


def test_less_water_is_better(reading_of: Made) -> None:
    readings = {
        name: [
            reading_of(name, f"{name}{i}", 168.0, 1e9, uptake=value)
            for i, value in enumerate(values)
        ]
        for name, values in {"dry": [1.0, 1.1, 1.2], "wet": [5.0, 5.2, 5.1]}.items()
    }
    found = answer(Question(quantity="water_uptake", frequency_hz=None), readings)
    assert found.text.startswith("dry is ahead of wet. Judged by Apparent water uptake at 168 h")
    (pair,) = found.pairs
    assert pair.difference is not None
    assert pair.difference.value == pytest.approx(-4.0)
    assert pair.difference.unit == "vol-%"


def test_average_over_the_course(reading_of: Made) -> None:
    """K is ahead early and level at the end: over the course it is ahead."""
    readings: dict[str, list[ReadingAssessment]] = {"K": [], "M": []}
    for hours, k, m in ((24.0, 10.0, 8.0), (168.0, 10.0, 8.0), (336.0, 8.0, 8.0)):
        for i, offset in enumerate((-0.1, 0.0, 0.1)):
            readings["K"].append(reading_of("K", f"K{i}", hours, 10 ** (k + offset)))
            readings["M"].append(reading_of("M", f"M{i}", hours, 10 ** (m + offset)))
    found = answer(Question(judge=Judge.AREA_UNDER_COURSE), readings)
    (pair,) = found.pairs
    assert pair.differ
    assert pair.difference is not None
    expected = (2 * 144 + 1 * 168) / 312  # trapezes, by hand
    assert pair.difference.value == pytest.approx(expected)
    assert "from 24 h to 336 h" in found.text


def test_time_to_a_limit_is_compared_by_ranks(reading_of: Made) -> None:
    readings: dict[str, list[ReadingAssessment]] = {"K": [], "M": []}
    for i in range(5):
        for hours in (24.0, 168.0, 336.0, 672.0):
            readings["K"].append(reading_of("K", f"K{i}", hours, 1e9))
            fallen = hours >= (168.0, 336.0)[i % 2]
            readings["M"].append(reading_of("M", f"M{i}", hours, 1e5 if fallen else 1e9))
    limit = Limit("Barrier limit", "modulus", 1e7, "Ω cm²", "", frequency_hz=0.1)
    found = answer(Question(judge=Judge.TIME_TO_LIMIT, limit=limit), readings)
    assert found.text.startswith("K is ahead of M. Judged by the time until below 10⁷ Ω cm²")
    assert "Gehan" in found.text
    with pytest.raises(ValueError, match="needs the limit"):
        answer(Question(judge=Judge.TIME_TO_LIMIT), readings)


def test_ratings_are_compared_by_ranks_and_never_averaged(reading_of: Made) -> None:
    readings = {
        name: [reading_of(name, f"{name}{i}", 672.0, 1e9) for i in range(3)] for name in ("K", "M")
    }
    ratings = [
        VisualRating(f"{name}{i}", 672.0, "iso_4628_3", f"Ri {grade}")
        for name, grade in (("K", 0), ("M", 3))
        for i in range(3)
    ]
    seen = Rated({r.panel_id: (r.panel_id[0], r.panel_id) for r in ratings}, tuple(ratings))
    question = Question(judge=Judge.RATING, scale="iso_4628_3")
    found = answer(question, readings, seen)
    assert [r.formulation for r in found.ranks] == ["K", "M"]
    assert "a test by ranks cannot prove any difference" in found.text
    assert found.pairs[0].difference is None
    assert answer(question, readings).ranks == ()
