"""Fickian sorption against outside values, and the dry capacitance of known courses."""

from __future__ import annotations

import csv
import math
from collections.abc import Sequence
from pathlib import Path

import numpy as np
import pytest

from coatgui.assessment.amounts import from_logarithm
from coatgui.assessment.sorption import (
    Sorption,
    diffusion_coefficient,
    dry_capacitance,
    fickian_uptake,
)
from coatgui.assessment.water import apparent_uptake
from coatgui.records import Bound, Quantity

REFERENCES = Path(__file__).parents[1] / "references" / "crank"
INSPECTIONS_H = (1.0, 4.0, 8.0, 24.0, 72.0, 168.0, 336.0, 672.0, 1008.0)
LOG_WATER = math.log(78.3033)


def _rows() -> list[dict[str, str]]:
    with (REFERENCES / "crank_plane_sheet.csv").open(encoding="utf-8", newline="") as file:
        return list(csv.DictReader(file))


def _tolerance(row: dict[str, str]) -> float:
    if row["kind"] == "textbook_chart":
        return float(row["note"].split()[1])
    digits = len(row["Mt_over_Minf"].split(".")[1])
    # Values of the chart and the table are rounded; the half-uptake root is exact to its x.
    return max(0.51 * 10.0**-digits, 1e-8) if digits > 1 else 1e-7


@pytest.mark.parametrize("row", _rows(), ids=lambda r: f"{r['kind']}-{r['Fo_half_thickness']}")
def test_share_agrees_with_outside_values(row: dict[str, str]) -> None:
    """A film on metal of thickness L is half a sheet of thickness l = 2L: D t/L² = 4 D t/l²."""
    x = 4 * float(row["Dt_over_l2_full_thickness"])
    assert x == pytest.approx(float(row["Fo_half_thickness"]), rel=1e-6)
    assert float(fickian_uptake(x)) == pytest.approx(
        float(row["Mt_over_Minf"]), abs=_tolerance(row)
    )


def test_both_series_meet_and_the_ends_are_right() -> None:
    below, above = fickian_uptake(np.array([0.2, np.nextafter(0.2, 1)]))
    assert below == pytest.approx(above, abs=1e-14)
    assert float(fickian_uptake(0.0)) == 0.0
    assert float(fickian_uptake(1e9)) == 1.0
    x = np.geomspace(1e-12, 50, 400)
    assert (np.diff(fickian_uptake(x)) >= 0).all()


def test_root_law_is_off_by_the_known_amounts() -> None:
    """2√(x/π) is 0.1, 0.6 and 2.3 percent high at shares of 0.5, 0.6 and 0.7; half at 0.1967."""
    x = np.geomspace(1e-3, 2, 200_001)
    share = fickian_uptake(x)
    for reached, percent in ((0.5, 0.1), (0.6, 0.6), (0.7, 2.3)):
        at = float(np.interp(reached, share, x))
        assert 100 * (2 * math.sqrt(at / math.pi) / reached - 1) == pytest.approx(percent, abs=0.06)
    assert float(np.interp(0.5, share, x)) == pytest.approx(0.1967, abs=5e-5)


def test_half_time_of_a_fifty_micrometre_film() -> None:
    """50 µm at 1e-9 cm²/s: half full after 1.37 h."""
    assert float(fickian_uptake(1e-9 * 1.37 * 3600 / 50e-4**2)) == pytest.approx(0.5, abs=1e-3)


def _course(
    hours: Sequence[float],
    *,
    thickness_um: float = 80.0,
    diffusion: float = 1e-9,
    uptake: float = 0.03,
    noise: float = 0.005,
    seed: int = 1,
    second_stage: float = 0.0,
) -> list[Quantity]:
    """Capacitances of a film with 100 pF/cm² when dry."""
    time = np.asarray(hours)
    share = fickian_uptake(diffusion * time * 3600 / (thickness_um * 1e-4) ** 2)
    log_c = math.log(1e-10) + uptake * LOG_WATER * share + second_stage * np.maximum(time - 200, 0)
    log_c = log_c + noise * np.random.default_rng(seed).standard_normal(time.size)
    return [from_logarithm(float(c), max(noise, 1e-4), "F/cm²", "") for c in np.exp(log_c)]


def _dry(hours: Sequence[float], course: Sequence[Quantity]) -> Sorption:
    found = dry_capacitance(hours, course, "fitted film")
    assert found is not None
    return found


@pytest.mark.parametrize("seed", range(5))
@pytest.mark.parametrize(
    ("thickness_um", "diffusion"), [(80.0, 1e-9), (120.0, 1e-9), (50.0, 2e-10), (80.0, 1e-10)]
)
def test_known_course_is_recovered(thickness_um: float, diffusion: float, seed: int) -> None:
    """At 0.5 percent noise with readings from 1 h on: the plateau within 0.3 vol-% on the whole,
    and never outside limits wide enough for 99.7 percent."""
    course = _course(INSPECTIONS_H, thickness_um=thickness_um, diffusion=diffusion, seed=seed)
    sorption = _dry(INSPECTIONS_H, course)
    dry = sorption.dry_capacitance
    assert dry.bound is Bound.TWO_SIDED
    assert sorption.reference_h == 0.0
    assert dry.value is not None
    assert dry.low is not None
    assert dry.high is not None
    assert dry.low < dry.value < dry.high
    half = math.log(dry.high / dry.low) / 2
    assert abs(math.log(dry.value / 1e-10)) < 1.5 * half
    uptake = apparent_uptake(course[-1], dry, 25.0)
    assert uptake is not None
    assert uptake.value == pytest.approx(3.0, abs=0.6)


def test_uptake_is_within_three_tenths_of_a_percent_for_two_thirds_and_limits_cover() -> None:
    inside = covered = 0
    total = 60
    for seed in range(total):
        course = _course(INSPECTIONS_H, seed=100 + seed)
        sorption = _dry(INSPECTIONS_H, course)
        uptake = apparent_uptake(course[-1], sorption.dry_capacitance, 25.0)
        assert uptake is not None
        assert uptake.value is not None
        assert uptake.low is not None
        assert uptake.high is not None
        inside += abs(uptake.value - 3.0) <= 0.3
        covered += uptake.low <= 3.0 <= uptake.high
    assert inside >= 0.67 * total
    assert covered >= 0.90 * total


def test_extrapolating_beats_the_first_reading() -> None:
    """80 µm at 1e-9 cm²/s has taken up a quarter of its water within the first hour."""
    course = _course(INSPECTIONS_H, noise=1e-4)
    extrapolated = _dry(INSPECTIONS_H, course).dry_capacitance.value
    first = course[0].value
    assert extrapolated is not None
    assert first is not None
    assert extrapolated == pytest.approx(1e-10, rel=1e-3)
    assert first > 1.03e-10


def test_diffusion_coefficient_is_recovered_where_the_thickness_is_known() -> None:
    sorption = _dry(INSPECTIONS_H, _course(INSPECTIONS_H, noise=0.001))
    diffusion = diffusion_coefficient(sorption, 80.0)
    assert diffusion is not None
    assert diffusion.low is not None
    assert diffusion.high is not None
    assert diffusion.low < 1e-9 < diffusion.high
    assert diffusion.high < 2 * diffusion.low
    assert diffusion_coefficient(sorption, None) is None


def test_saturated_film_keeps_the_first_reading_and_says_so() -> None:
    hours = (24.0, 72.0, 168.0, 336.0)
    sorption = _dry(hours, _course(hours, thickness_um=25.0))
    assert sorption.dry_capacitance.bound is Bound.AT_MOST
    assert sorption.reference_h == 24.0
    assert sorption.rate_per_h is None
    assert "already wet" in sorption.dry_capacitance.method


def test_one_reading_is_kept_as_a_bound() -> None:
    sorption = _dry(INSPECTIONS_H[:1], _course(INSPECTIONS_H[:1]))
    assert sorption.dry_capacitance.bound is Bound.AT_MOST
    assert sorption.reference_h == 1.0


@pytest.mark.parametrize("thickness_um", [40.0, 80.0, 160.0])
def test_two_readings_bound_the_dry_film_by_the_root_line(thickness_um: float) -> None:
    """The line meets 0 h at or above the dry value, whether or not the film was still on √t."""
    above = 0
    for seed in range(40):
        course = _course((1.0, 4.0), thickness_um=thickness_um, seed=seed)
        sorption = _dry((1.0, 4.0), course)
        dry = sorption.dry_capacitance
        assert dry.bound is Bound.AT_MOST
        assert dry.value is not None
        above += dry.value >= 1e-10
    assert above >= 38
    course = _course((1.0, 4.0), thickness_um=thickness_um, noise=1e-3)
    bound = _dry((1.0, 4.0), course).dry_capacitance.value
    assert bound is not None
    assert course[0].value is not None
    assert bound < course[0].value


def test_reading_at_zero_hours_is_the_dry_value() -> None:
    sorption = _dry((0.0, 500.0), _course((0.0, 500.0)))
    assert sorption.dry_capacitance.bound is Bound.TWO_SIDED
    assert sorption.reference_h == 0.0
    assert "measured at 0 h" in sorption.dry_capacitance.method


def test_second_stage_is_left_away_and_said() -> None:
    course = _course(INSPECTIONS_H, noise=0.001, second_stage=2e-4)
    sorption = _dry(INSPECTIONS_H, course)
    assert sorption.dry_capacitance.bound is Bound.TWO_SIDED
    assert sorption.followed < len(INSPECTIONS_H)
    assert f"the first {sorption.followed} of 9 readings" in sorption.text
    assert sorption.dry_capacitance.value == pytest.approx(1e-10, rel=0.01)


def test_nothing_with_limits_gives_nothing() -> None:
    assert (
        dry_capacitance((1.0,), [Quantity(1e-10, None, None, Bound.UNDETERMINED, "F")], "") is None
    )


def test_second_stage_is_found_where_it_is_and_not_where_it_is_not() -> None:
    hours = tuple(float(h) for h in np.geomspace(0.5, 3000, 20))
    late = _dry(hours, _course(hours, noise=0.002, second_stage=2e-5))
    assert late.second_stage_h is not None
    assert late.second_stage_h[0] < 600
    assert late.second_stage_h[1] > 100
    assert "second stage" in late.text
    falling = _dry(hours, _course(hours, noise=0.002, second_stage=-2e-5))
    assert falling.second_stage_h is None
    assert "loses water" in falling.text
    assert falling.dry_capacitance.value == pytest.approx(1e-10, rel=0.01)
    falsely = sum(
        _dry(hours, _course(hours, noise=0.002, seed=seed)).second_stage_h is not None
        for seed in range(200)
    )
    assert falsely <= 4


def test_measured_dry_value_enters_at_zero_hours() -> None:
    dry = from_logarithm(1e-10, 0.002, "F/cm²", "measured dry")
    hours = (24.0, 72.0, 168.0)
    sorption = dry_capacitance(hours, _course(hours, thickness_um=30.0), "film", dry)
    assert sorption is not None
    assert sorption.dry_capacitance.bound is Bound.TWO_SIDED
    assert sorption.reference_h == 0.0
    assert sorption.dry_capacitance.value == pytest.approx(1e-10, rel=0.005)


def test_three_readings_cannot_check_the_law_so_no_rate_is_given() -> None:
    sorption = _dry(INSPECTIONS_H[:3], _course(INSPECTIONS_H[:3], noise=1e-4))
    assert sorption.rate_per_h is None
    assert diffusion_coefficient(sorption, 80.0) is None


@pytest.mark.parametrize(
    ("thickness_um", "diffusion"), [(80.0, 1e-9), (120.0, 1e-9), (50.0, 2e-10), (80.0, 1e-10)]
)
def test_saturation_and_rate_hold_the_truth(thickness_um: float, diffusion: float) -> None:
    """Capacitances with 0.5 percent scatter of their own, far more than a fitted film has: limits
    hold the truth. With the 0.1 percent that spectra of 0.5 percent noise leave, the uptake at
    saturation is within 0.3 vol-% every time."""
    uptake_inside = rate_inside = told = 0
    total = 100
    truth = diffusion * 3600 / (thickness_um * 1e-4) ** 2
    for seed in range(total):
        course = _course(
            INSPECTIONS_H, thickness_um=thickness_um, diffusion=diffusion, seed=300 + seed
        )
        sorption = _dry(INSPECTIONS_H, course)
        assert sorption.log_rise is not None
        rise = sorption.log_rise
        assert rise.low is not None
        uptake_inside += rise.low <= 0.03 * LOG_WATER <= (rise.high or math.inf)
        if sorption.rate_per_h is not None:
            assert sorption.rate_per_h.low is not None
            assert sorption.rate_per_h.high is not None
            told += 1
            rate_inside += sorption.rate_per_h.low <= truth <= sorption.rate_per_h.high
    assert told >= 0.95 * total
    assert uptake_inside >= 0.90 * total
    assert rate_inside >= 0.90 * told
    for seed in range(40):
        course = _course(
            INSPECTIONS_H, thickness_um=thickness_um, diffusion=diffusion, noise=0.001, seed=seed
        )
        log_rise = _dry(INSPECTIONS_H, course).log_rise
        assert log_rise is not None
        assert log_rise.value is not None
        assert 100 * log_rise.value / LOG_WATER == pytest.approx(3.0, abs=0.3)
