"""Rating tables at every boundary, refusals in words, Spearman against scipy, presets."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
import pytest
from scipy import stats

from coatgui.assessment.interface import pore_resistivity
from coatgui.assessment.presets import electrolytes, filled_in, recognised, regimes
from coatgui.assessment.quantities import kind
from coatgui.assessment.ratings import (
    Rated,
    correlations,
    creepage_by_area_mm,
    delamination_at_scribe_mm,
    edition,
    grade_of,
    order,
    rating_courses,
    scales,
    spearman,
)
from coatgui.records import Electrolyte, ReadingAssessment, Regime, Settings, VisualRating

MakeReading = Callable[..., ReadingAssessment]
# Upper limits as they are published or remembered, written out a second time on purpose.
TEN = [str(grade) for grade in range(10, 0, -1)]
LIMITS = {
    "astm_d610": dict(zip(TEN, (0.01, 0.03, 0.1, 0.3, 1, 3, 10, 16, 33, 50), strict=True)),
    "astm_d1654_a": dict(zip(TEN, (0, 0.5, 1, 2, 3, 5, 7, 10, 13, 16), strict=True)),
    "iso_2409": dict(zip("01234", (0, 5, 15, 35, 65), strict=True)),
    "astm_d3359_b": dict(zip(["5B", "4B", "3B", "2B", "1B"], (0, 5, 15, 35, 65), strict=True)),
}
WORST = {"astm_d610": "0", "astm_d1654_a": "0", "iso_2409": "5", "astm_d3359_b": "0B"}


@pytest.mark.parametrize("scale", LIMITS)
def test_every_boundary(scale: str) -> None:
    """A measure on a limit still has the better grade, one a hair above the next."""
    grades = [*LIMITS[scale], WORST[scale]]
    for place, (grade, limit) in enumerate(LIMITS[scale].items()):
        assert grade_of(scale, limit) == grade
        assert grade_of(scale, limit * (1 + 1e-9) + 1e-9) == grades[place + 1]
    assert grade_of(scale, 100.0) == WORST[scale]
    assert grade_of(scale, 0.0) == grades[0]


@pytest.mark.parametrize(
    ("percent", "grade"),
    [
        (0, "10"), (0.2, "9"), (1, "9"), (1.2, "8"), (2, "8"), (3, "8"), (3.1, "7"), (4, "7"),
        (6, "7"), (6.5, "6"), (7, "6"), (10, "6"), (10.1, "5"), (11, "5"), (20, "5"), (21, "4"),
        (30, "4"), (31, "3"), (40, "3"), (41, "2"), (55, "2"), (56, "1"), (75, "1"), (75.2, "0"),
        (100, "0"),
    ],
)  # fmt: skip
def test_failed_area_is_rounded_up_to_whole_percent(percent: float, grade: str) -> None:
    assert grade_of("astm_d1654_b", percent) == grade


def test_scales_without_limits_give_no_grade_by_measure() -> None:
    with pytest.raises(ValueError, match="no grades by a measured size"):
        grade_of("iso_4628_3", 0.5)
    with pytest.raises(ValueError, match="not possible"):
        grade_of("astm_d610", -1)
    with pytest.raises(ValueError, match="no rating scale"):
        grade_of("gloss", 1)


def test_every_scale_has_its_source_and_edition() -> None:
    for scale in scales().values():
        assert scale["source"]
        assert scale["edition"]
        assert scale["example"]
        if "upper_limits" in scale:
            assert len(scale["best_to_worst"]) == len(scale["upper_limits"]) + 1
            assert scale["upper_limits"] == sorted(scale["upper_limits"])


@pytest.mark.parametrize(
    ("scale", "better", "worse"),
    [
        ("astm_d610", "9-S", "3-P"),
        ("iso_4628_3", "Ri 1", "Ri 4"),
        ("iso_4628_2", "2(S3)", "3(S2)"),
        ("astm_d714", "8F", "4MD"),
        ("iso_4628_4", "1(S2)a", "4(S2)c"),
        ("iso_4628_5", "0", "3(S2)a"),
        ("iso_4628_8_delamination", "1.5", "2,5 mm"),
        ("iso_4628_8_corrosion", "0", "0.1"),
        ("astm_d1654_a", "10", "9"),
        ("astm_d1654_b", "7", "0"),
        ("iso_2409", "1", "4"),
        ("astm_d3359_a", "5A", "0A"),
        ("astm_d3359_b", "4B", "1B"),
        ("pull_off", "7.5 MPa A/B", "3 MPa -/Y"),
    ],
)
def test_better_is_higher_on_every_scale(scale: str, better: str, worse: str) -> None:
    """Adhesion and rust scales run in opposite directions; the order does not."""
    assert order(scale, better) > order(scale, worse)


def test_every_scale_was_put_in_order_above() -> None:
    assert len(scales()) == 14


@pytest.mark.parametrize(
    ("scale", "value"),
    [("astm_d610", "11"), ("iso_2409", "5B"), ("astm_d3359_b", "5"),
     ("astm_d3359_b", "5A"), ("astm_d3359_a", "5B"), ("pull_off", "strong"),
     ("astm_d714", "7"), ("iso_4628_2", "2(S9)"), ("iso_4628_8_delamination", "-1")],
)  # fmt: skip
def test_foreign_values_are_refused_in_words(scale: str, value: str) -> None:
    with pytest.raises(ValueError, match=r"is no rating by .* is meant"):
        order(scale, value)


def test_scribe() -> None:
    assert delamination_at_scribe_mm(5.0, 1.0) == 2.0
    assert creepage_by_area_mm(320.0, 80.0) == 2.0
    assert creepage_by_area_mm(320.0, 80.0, 80.0) == 1.5
    with pytest.raises(ValueError, match="narrower"):
        delamination_at_scribe_mm(0.5, 1.0)
    with pytest.raises(ValueError, match="scribe with a length"):
        creepage_by_area_mm(1.0, 0.0)


def test_edition_is_the_raters_or_the_tables() -> None:
    assert edition(VisualRating("p", 1.0, "astm_d610", "10")) == "ASTM D610-08 (2012)"
    assert edition(VisualRating("p", 1.0, "astm_d610", "10", edition="2019")) == "2019"


@pytest.mark.parametrize("size", [5, 6, 12, 30])
def test_spearman_agrees_with_scipy(size: int) -> None:
    random = np.random.default_rng(size)
    x = random.integers(0, 6, size).astype(float)
    y = x + random.normal(0, 2, size)
    coefficient, probability = spearman(x.tolist(), y.tolist())
    assert coefficient == pytest.approx(float(stats.spearmanr(x, y).statistic), rel=1e-9)
    if size <= 8:

        def statistic(order_: np.ndarray) -> float:
            return abs(float(stats.spearmanr(x, order_).statistic))

        expected = stats.permutation_test(
            (y,), statistic, permutation_type="pairings", alternative="greater", n_resamples=np.inf
        ).pvalue
        assert probability == pytest.approx(float(expected), abs=1e-9)
    assert spearman([1.0, 1.0, 1.0], [1.0, 2.0, 3.0])[1] == 1.0


PANELS = {name: (name[0], name) for name in ("K0", "K1", "M0", "M1", "M2")}


def test_ratings_beside_the_spectra(reading_of: MakeReading) -> None:
    grades = {"K0": "Ri 0", "K1": "Ri 1", "M0": "Ri 3", "M1": "Ri 4", "M2": "Ri 5"}
    moduli = {"K0": 1e10, "K1": 1e9, "M0": 1e7, "M1": 1e6, "M2": 1e5}
    readings: dict[str, list[ReadingAssessment]] = {"K": [], "M": []}
    for panel, modulus in moduli.items():
        readings[panel[0]].append(reading_of(panel[0], panel, 672.0, modulus))
    ratings = [VisualRating(p, 670.0, "iso_4628_3", g) for p, g in grades.items()]
    ratings.append(VisualRating("K0", 670.0, "iso_4628_3", "Ri 1"))  # a second look, worse
    courses = {c.formulation: c for c in rating_courses(Rated(PANELS, tuple(ratings)))}
    assert (courses["M"].best, courses["M"].worst) == ("Ri 3", "Ri 5")
    assert dict(courses["K"].ratings)["K0"] == "Ri 1"
    assert courses["K"].edition == "ISO 4628-3, edition to be entered"
    (found,) = correlations(readings, ratings, [kind("modulus", 0.1)])
    assert found.panels == 5
    assert found.coefficient > 0.9
    assert "5 panels of all formulations together" in found.text
    assert correlations(readings, ratings[:3], [kind("modulus", 0.1)]) == ()


def test_own_and_edited_presets_stand_in_place_of_the_programs() -> None:
    brine = Electrolyte("brine", "Brine", 8.0, "measured", (("brine",), ("5", "nacl", "warm")))
    warm = Electrolyte("nacl_5", "5 % sodium chloride, warm", 11.0, "at 35 °C", (("5", "nacl"),))
    house = Regime("house", "House cycle", "", "brine", 30.0)
    spray = Regime("astm_b117", "Salt spray as we run it", "", "nacl_5", 37.0)
    settings = Settings(electrolytes=(brine, warm), regimes=(house, spray))
    salts = {e.electrolyte_id: e for e in electrolytes(settings)}
    assert len(salts) == len(electrolytes(Settings())) + 1
    assert (salts["nacl_5"], salts["brine"]) == (warm, brine)
    known = {r.regime_id: r for r in regimes(settings)}
    assert (known["astm_b117"], known["house"]) == (spray, house)
    assert filled_in(house, settings) == {
        "regime": "House cycle", "electrolyte": "Brine", "temperature_c": 30.0,
    }  # fmt: skip
    assert filled_in(Regime("x", "X", electrolyte_id="tap water"), settings) == {
        "regime": "X", "electrolyte": "tap water",
    }  # fmt: skip
    own = settings.electrolytes
    for text, electrolyte in (
        ("brine", brine),
        ("warm NaCl, 5 %", brine),
        ("5 % NaCl", warm),
        ("5 % Sodium Chloride, warm", warm),
        ("3.5 % NaCl", salts["nacl_3_5"]),
        ("ocean_water", salts["ocean_water"]),
        ("oil", None),
        ("", None),
    ):
        assert recognised(text, own) == electrolyte, text
    assert pore_resistivity("5 % NaCl", own) == (11.0, warm.name)
    assert pore_resistivity("5 % NaCl")[0] == 14.0


def test_presets_are_whole() -> None:
    known = {r.regime_id: r for r in regimes(Settings())}
    assert known["astm_b117"].temperature_c == 35.0
    assert known["astm_b117"].electrolyte_id == "nacl_5"
    assert known["iso_12944_9"].duration_h == (4200.0, 4200.0)
    assert all(r.source and r.conditions for r in known.values())
    salts = {e.electrolyte_id: e for e in electrolytes(Settings())}
    assert salts["nacl_5"].resistivity_ohm_cm == 14.0
    assert all(e.source for e in salts.values())
    assert {r.electrolyte_id for r in known.values()} <= {*salts, ""}
    assert len(known) == 13
