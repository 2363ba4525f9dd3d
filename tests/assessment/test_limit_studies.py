"""Interval-censored times against a published example, scipy and known truths."""

from __future__ import annotations

import csv
import math
from collections.abc import Callable
from pathlib import Path

import numpy as np
import pytest
from scipy import stats

from coatgui.assessment.limit_studies import limit_studies, panel_standings
from coatgui.assessment.survival import curve, exact_limits, turnbull, weibull
from coatgui.records import Bound, Limit, ReadingAssessment, Side

MakeReading = Callable[..., ReadingAssessment]
REFERENCE = Path(__file__).parents[1] / "references" / "interval_censored"
# Masses published for this set, from memory, to be checked: interval, share.
PUBLISHED = {
    (4, 5): 0.0463,
    (6, 7): 0.0334,
    (7, 8): 0.0887,
    (11, 12): 0.0708,
    (24, 25): 0.0926,
    (33, 34): 0.0818,
    (38, 40): 0.1209,
    (46, 48): 0.4656,
}
INSPECTIONS_H = np.array([24.0, 72, 168, 336, 504, 672, 1008, 1344])
LIMIT = Limit("Barrier limit", "modulus", 1e7, "Ω cm²", "", frequency_hz=0.1)


def _set() -> tuple[list[float], list[float]]:
    with (REFERENCE / "breast_radiotherapy.csv").open(encoding="utf-8", newline="") as file:
        rows = list(csv.DictReader(file))
    return (
        [float(row["after"]) for row in rows],
        [float(row["by"]) if row["by"] else math.inf for row in rows],
    )


def test_turnbull_gives_the_published_masses() -> None:
    found = turnbull(*_set())
    shares = {
        (int(a), int(b)): s
        for a, b, s in zip(found.after_h, found.by_h, found.share, strict=True)
        if s > 1e-4
    }
    assert set(shares) == set(PUBLISHED)
    for interval, share in PUBLISHED.items():
        assert shares[interval] == pytest.approx(share, abs=6e-5)


def test_turnbull_cannot_be_bettered() -> None:
    """Kuhn–Tucker: at the maximum no interval's derivative exceeds the number of panels."""
    left, right = (np.array(side) for side in _set())
    found = turnbull(left.tolist(), right.tolist())
    inside = (found.after_h >= left[:, None]) & (found.by_h <= right[:, None])
    gain = (inside / (inside @ found.share)[:, None]).sum(axis=0)
    assert gain.max() <= left.size * (1 + 1e-6)
    assert gain[found.share > 1e-6] == pytest.approx(left.size, rel=1e-5)


def test_known_times_give_kaplan_and_meier() -> None:
    random = np.random.default_rng(3)
    times = np.round(random.weibull(1.5, 30) * 50)  # with ties
    held = random.random(30) < 0.3
    by_h = np.where(held, math.inf, times)
    found = turnbull(times.tolist(), by_h.tolist())
    reference = stats.ecdf(stats.CensoredData(uncensored=times[~held], right=times[held])).sf
    for time in times[~held]:
        expected = float(reference.evaluate(time))
        assert found.standing(time)[1] == pytest.approx(expected, abs=1e-6)


def test_weibull_agrees_with_scipy() -> None:
    left, right = _set()
    interval = np.array([(a, b) for a, b in zip(left, right, strict=True) if b < math.inf])
    held = [a for a, b in zip(left, right, strict=True) if b == math.inf]
    shape, _, scale = stats.weibull_min.fit(
        stats.CensoredData(interval=interval, right=held), floc=0
    )
    found = weibull(left, right)
    assert found is not None
    assert found.shape.value == pytest.approx(shape, rel=1e-4)
    assert found.scale_h.value == pytest.approx(scale, rel=1e-4)
    assert found.median_h.value == pytest.approx(scale * math.log(2) ** (1 / shape), rel=1e-4)


def test_exact_limits_agree_with_scipy() -> None:
    for total in (1, 3, 7):
        for events in range(total + 1):
            reference = stats.binomtest(events, total).proportion_ci(method="exact")
            assert exact_limits(events, total) == pytest.approx(
                (reference.low, reference.high), abs=1e-9
            )


def _inspected(times: np.ndarray) -> tuple[list[float], list[float]]:
    place = np.searchsorted(INSPECTIONS_H, times)
    after = [0.0 if i == 0 else float(INSPECTIONS_H[i - 1]) for i in place]
    by = [math.inf if i == INSPECTIONS_H.size else float(INSPECTIONS_H[i]) for i in place]
    return after, by


@pytest.mark.parametrize("panels", [3, 5, 10])
def test_limits_hold_the_truth_with_few_panels(panels: int) -> None:
    random = np.random.default_rng(panels)
    median_inside = told = 0
    curve_inside = []
    for _ in range(120):
        after, by = _inspected(600 * random.weibull(2.0, panels))
        for step in curve(after, by):
            truth = math.exp(-((step.exposure_h / 600) ** 2))
            curve_inside.append(step.low <= truth <= step.high)
            assert 0 <= step.low <= step.share_high
            assert step.share_low <= step.share_high <= 1
        found = weibull(after, by)
        if found is not None:
            told += 1
            low, high = found.median_h.low or 0.0, found.median_h.high or math.inf
            median_inside += low <= 600 * math.log(2) ** 0.5 <= high
    assert np.mean(curve_inside) >= 0.95
    assert told >= 100
    assert median_inside >= 0.95 * told


def test_nothing_is_made_of_too_little() -> None:
    assert weibull([10.0, 10.0, 5.0], [math.inf, math.inf, 8.0]) is None
    assert weibull([168.0] * 3, [336.0] * 3) is None  # all at once: the shape has no end


def test_a_campaign_of_one_formulation(reading_of: MakeReading) -> None:
    courses = {
        "A1": [1e9, 1e8, 1e6, 1e5],
        "A2": [1e9, 1e9, 1e9, 1e6],
        "A3": [1e6, 1e6, 1e5, 1e5],
        "A4": [1e9, 1e9, 1e9, 1e9],
    }
    readings = [
        reading_of("A", panel, hours, value)
        for panel, values in courses.items()
        for hours, value in zip((24.0, 168.0, 336.0, 672.0), values, strict=True)
    ]
    standings = {s.panel: (s.after_h, s.by_h) for s in panel_standings(readings, LIMIT)}
    assert standings == {
        "A1": (168.0, 336.0),
        "A2": (336.0, 672.0),
        "A3": (None, 24.0),
        "A4": (None, None),
    }
    (study,) = limit_studies({"A": readings}, [LIMIT])
    assert "3 of 4 panels below 10⁷ Ω cm² at 0.1 Hz" in study.text
    assert "A3 before the first reading that tells" in study.text
    assert study.weibull is not None
    assert [s.share_high for s in study.curve if s.exposure_h == 672.0] == [pytest.approx(0.25)]


def test_nobody_broke_it_and_it_says_how_little_that_is(reading_of: MakeReading) -> None:
    readings = [reading_of("A", f"A{i}", 168.0, 1e9) for i in range(3)]
    (study,) = limit_studies({"A": readings}, [LIMIT])
    assert study.weibull is None
    assert "none of 3 panels" in study.text
    assert "up to 71 percent" in study.text  # 1 − 0.025^(1/3)


def test_value_at_the_measuring_limit_is_censored(reading_of: MakeReading) -> None:
    readings = [
        reading_of("A", "A1", 24.0, 1e6, bound=Bound.AT_LEAST),
        reading_of("A", "A1", 168.0, 1e9, bound=Bound.AT_LEAST),
        reading_of("A", "A1", 336.0, 1e5),
    ]
    (standing,) = panel_standings(readings, LIMIT)
    assert (standing.after_h, standing.by_h) == (168.0, 336.0)
    assert panel_standings(readings[:1], LIMIT) == ()


def test_limit_on_another_quantity_from_above(reading_of: MakeReading) -> None:
    wet = Limit("Too wet", "water_uptake", 4.0, "vol-%", "ours", Side.ABOVE)
    readings = [
        reading_of("A", "A1", hours, 1e9, uptake=uptake)
        for hours, uptake in ((1.0, 1.0), (24.0, 3.0), (168.0, 5.0))
    ]
    (standing,) = panel_standings(readings, wet)
    assert (standing.after_h, standing.by_h) == (24.0, 168.0)
    with pytest.raises(ValueError, match="no quantity"):
        panel_standings(readings, Limit("?", "gloss", 1.0, "", ""))


def test_crossing_intervals_hold_the_truth(reading_of: MakeReading) -> None:
    """|Z| falls exponentially through the limit at a known time and is read with 3 % scatter,
    stated as such: at least 95 of 100 intervals must hold the time."""
    random = np.random.default_rng(8)
    inside = 0
    total = 400
    for number in range(total):
        truth_h = float(random.uniform(30, 1300))
        slope = float(random.uniform(0.5, 4)) / 1000
        readings = []
        for hours in INSPECTIONS_H:
            modulus = 1e7 * 10 ** (-slope * (hours - truth_h))
            scatter = math.exp(0.03 * random.standard_normal())
            reading = reading_of("A", f"A{number}", float(hours), modulus * scatter, percent=3.0)
            readings.append(reading)
        (standing,) = panel_standings(readings, LIMIT)
        after_h = standing.after_h or 0.0
        by_h = math.inf if standing.by_h is None else standing.by_h
        if standing.by_h is None:
            after_h = standing.watched_h or 0.0
        inside += after_h <= truth_h <= by_h
    assert inside >= 0.95 * total
