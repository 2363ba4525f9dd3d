"""Shapes of courses, projections and their refusals, what to measure next."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace

import numpy as np
import pytest

from coatgui.assessment.decide import decide
from coatgui.assessment.fick import fickian_uptake
from coatgui.assessment.planning import early_advice, early_times_h, next_inspection
from coatgui.assessment.quantities import kind
from coatgui.assessment.trends import course_table, project, shapes, trend
from coatgui.records import (
    Bound,
    Campaign,
    Criterion,
    Event,
    Formulation,
    Judge,
    Limit,
    LimitCrossing,
    Method,
    Panel,
    PanelAssessment,
    ProjectionWanted,
    Quantity,
    Question,
    Rating,
    ReadingAssessment,
    Settings,
    VisualRating,
)

MakeReading = Callable[..., ReadingAssessment]
HOURS = np.array([24.0, 168, 336, 504, 672, 840, 1008, 1176])
OF = kind("modulus", 0.1)
LIMIT = Criterion("Barrier limit", 0.1, 1e7, "")


def _readings(
    made: MakeReading,
    course: Callable[[float], float],
    *,
    panels: int = 4,
    spread: float = 0.3,
    scatter: float = 0.03,
    seed: int = 1,
    bend: float = 0.0,
) -> list[ReadingAssessment]:
    random = np.random.default_rng(seed)
    found = []
    for panel in range(panels):
        level, tilt = spread * random.standard_normal(), bend * random.standard_normal()
        for hour in HOURS.tolist():
            log = course(hour) + level + tilt * hour / 1000 + scatter * random.standard_normal()
            found.append(made("K", f"K{panel}", hour, 10.0**log))
    return found


COURSES: dict[str, Callable[[float], float]] = {
    "plateau": lambda t: 9.0,
    "linear": lambda t: 9.0 - t / 1000,
    "segmented": lambda t: 9.0 - 2 * max(0.0, t - 504) / 1000,
}


@pytest.mark.parametrize("name", COURSES)
def test_shape_is_found(reading_of: MakeReading, name: str) -> None:
    right = 0
    for seed in range(40):
        found = trend("K", _readings(reading_of, COURSES[name], seed=seed), OF)
        assert found is not None
        right += found.shape == name
    assert right >= 36


def test_break_and_slope_hold_the_truth(reading_of: MakeReading) -> None:
    inside = slope_inside = 0
    for seed in range(40):
        readings = _readings(reading_of, COURSES["segmented"], seed=seed, bend=0.1)
        found = trend("K", readings, OF)
        assert found is not None
        assert found.slope.low is not None
        assert found.slope.high is not None
        inside += found.since_h[0] <= 504 <= found.since_h[1]
        slope_inside += found.slope.low <= -2.0 <= found.slope.high
    assert inside >= 36
    assert slope_inside >= 34
    assert "since some time between" in found.text


def test_shapes_agree_with_plain_least_squares(reading_of: MakeReading) -> None:
    """The sums of squares behind AICc against numpy's own, with a column for every panel."""
    table = course_table(_readings(reading_of, COURSES["segmented"], seed=3), OF)
    assert table is not None
    rows, columns = np.nonzero(np.isfinite(table.values))
    y, t = table.values[rows, columns], table.hours[columns]
    levels = (rows[:, None] == np.arange(table.values.shape[0])).astype(float)
    for shape in shapes(table):
        design = [levels]
        if shape.name != "plateau":
            design.append(t[:, None] / 1000)
        if shape.name == "segmented":
            design.append(np.maximum(0, t - table.hours[shape.start])[:, None] / 1000)
        squares = np.linalg.lstsq(np.column_stack(design), y, rcond=None)[1]
        assert shape.squares == pytest.approx(float(squares[0]) + y.size * 1e-6, rel=1e-6)


def test_projection_band_holds_new_panels(reading_of: MakeReading) -> None:
    wanted = ProjectionWanted("modulus", 1500.0, 0.1)
    random = np.random.default_rng(5)
    inside = told = 0
    for seed in range(150):
        readings = _readings(reading_of, COURSES["linear"], seed=seed, bend=0.2)
        found = project("K", readings, OF, wanted)
        if found.quantity is None:
            continue
        told += 1
        assert found.quantity.low is not None
        assert found.quantity.high is not None
        new = 9.0 - 1.5 + 0.3 * random.standard_normal() + 0.2 * 1.5 * random.standard_normal()
        inside += found.quantity.low <= 10.0**new <= found.quantity.high
    assert told >= 120
    assert inside >= 0.90 * told
    assert "not a prediction of service life" in found.text


@pytest.mark.parametrize(
    ("until_h", "panels", "reason"),
    [
        (1000.0, 4, "not beyond its last reading"),
        (9000.0, 4, "too far"),
        (1400.0, 2, "too few panels"),
    ],
)
def test_projection_is_refused(
    reading_of: MakeReading, until_h: float, panels: int, reason: str
) -> None:
    readings = _readings(reading_of, COURSES["linear"], panels=panels)
    found = project("K", readings, OF, ProjectionWanted("modulus", until_h, 0.1))
    assert found.quantity is None
    assert reason in found.text


def test_projection_is_refused_on_bounds_and_on_few_inspections(reading_of: MakeReading) -> None:
    wanted = ProjectionWanted("modulus", 1400.0, 0.1)
    bounds = [
        reading_of("K", f"K{p}", h, 1e10 * (1 + p / 10), bound=Bound.AT_LEAST)
        for p in range(4)
        for h in HOURS.tolist()
    ]
    assert "only bounds" in project("K", bounds, OF, wanted).text
    few = [reading_of("K", f"K{p}", h, 1e9) for p in range(4) for h in (24.0, 168.0, 336.0)]
    assert "fewer than four inspections" in project("K", few, OF, wanted).text
    assert trend("K", few, OF) is None


def test_early_times_are_when_the_shares_are_reached() -> None:
    times = early_times_h(80.0, 1e-9)
    shares = fickian_uptake(1e-9 * np.array(times) * 3600 / 80e-4**2)
    assert shares == pytest.approx([0.15, 0.3, 0.45, 0.6], abs=0.005)


def _panel(name: str, dry: Quantity | None, **more: object) -> PanelAssessment:
    return PanelAssessment(name, name, "K", 10.0, 80.0, dry, None, **more)  # type: ignore[arg-type]


def test_early_advice_is_given_where_the_dry_film_is_not_known() -> None:
    bound = Quantity(1e-10, None, 1e-10, Bound.AT_MOST, "F/cm²")
    known = Quantity(1e-10, 0.99e-10, 1.01e-10, Bound.TWO_SIDED, "F/cm²")
    (text,) = early_advice(_panel("K1", bound), [])
    assert "80 µm" in text
    assert "0.3, 1.3, 2.8 and 5 h" in text
    assert "as fast as it gets" in text
    assert early_advice(_panel("K1", known), []) == ()
    sister = PanelAssessment(
        "K2", "K2", "K", 10.0, 80.0, known, Quantity(4e-9, 3e-9, 5e-9, Bound.TWO_SIDED, "cm²/s")
    )
    (text,) = early_advice(_panel("K1", None), [sister])
    assert "sister panels have D = 4·10⁻⁹" in text


def test_next_inspection(reading_of: MakeReading) -> None:
    """K0 falls a decade a week towards the limit, K1 was rejected, K2 shows something new, K3 is
    sound."""
    readings = []
    for hour, log in ((168.0, 10.0), (336.0, 9.0), (504.0, 8.0)):
        readings.append(reading_of("K", "K0", hour, 10.0**log))
        readings.append(reading_of("K", "K1", hour, 1e9, counts=hour < 500))
        readings.append(reading_of("K", "K2", hour, 1e9))
        readings.append(reading_of("K", "K3", hour, 1e9))
    held = (LimitCrossing(LIMIT, None, None, "", 504.0),)
    event = Event("interface_reacting", "", 336.0, 504.0, confirmed=False)
    panels = [
        _panel("K0", None, limit_crossings=held),
        _panel("K1", None, limit_crossings=held),
        _panel("K2", None, limit_crossings=held, events=(event,)),
        _panel("K3", None, limit_crossings=held),
    ]
    found = next_inspection(panels, readings, [LIMIT])
    assert found is not None
    assert found.by_h == 504.0
    assert found.panels == ("K1", "K0", "K2")
    assert "epeat the last reading of K1 now" in found.text
    assert "read K0 by 588 h, on the way to a limit" in found.text
    assert "read K2 by 588 h to confirm" in found.text
    calm = next_inspection(panels[3:], readings, [LIMIT])
    assert calm is not None
    assert calm.by_h == 672.0
    assert calm.panels == ()
    assert next_inspection([], [], [LIMIT]) is None


def test_questions_are_answered_beside_the_usual(reading_of: MakeReading) -> None:
    readings = {
        name: [
            reading_of(name, f"{name}{p}", hour, 10.0 ** (level - hour / 1000 + p / 10))
            for p in range(3)
            for hour in HOURS.tolist()
        ]
        for name, level in (("K", 10.0), ("M", 8.0))
    }
    asked = Settings(
        limits=(Limit.of_criterion(LIMIT),),
        comparisons=(
            Question(judge=Judge.AREA_UNDER_COURSE),
            Question(method=Method.DUNNETT, reference="Q"),
        ),
        projections=(ProjectionWanted("modulus", 1400.0, 0.1),),
    )
    campaign = Campaign(
        "c",
        "C",
        asked,
        tuple(Formulation(name, name) for name in readings),
        tuple(Panel(f"{name}{p}", f"{name}{p}", name) for name in readings for p in range(3)),
        ratings=(
            Rating("a", VisualRating("K0", 1176.0, "iso_2409", "1")),
            Rating("b", VisualRating("M0", 1176.0, "iso_2409", "9")),
        ),
    )
    found = decide(campaign, readings, 0.1, [LIMIT], [])
    assert found.comparison.text.startswith("K is ahead of M")
    assert found.further_comparisons[0].text.startswith("K is ahead of M")
    assert [p.formulation for p in found.projections] == ["K", "M"]
    assert all(p.quantity is not None for p in found.projections)
    assert [s.formulation for s in found.limit_studies] == ["K", "M"]
    panels = [_panel("K0", None, limit_crossings=(LimitCrossing(LIMIT, 24.0, 168.0, "", 168.0),))]
    (study,) = decide(
        replace(campaign, settings=Settings()), readings, 0.1, [LIMIT], panels
    ).limit_studies
    assert (study.standings[0].after_h, study.standings[0].by_h) == (24.0, 168.0)
    assert [(r.formulation, r.worst) for r in found.ratings] == [("K", "1")]
    # What cannot be answered is said, and the rest is answered all the same.
    assert "one of the formulations as its reference" in found.further_comparisons[1].text
    (unknown,) = found.findings
    assert unknown.text.startswith("A rating of panel M0 at 1176 h is left aside: “9” is no rating")


def test_a_limit_that_no_panel_tells_of_is_said(reading_of: MakeReading) -> None:
    readings = {"K": [reading_of("K", "K0", 24.0, 1e9)]}
    asked = Settings(
        limits=(Limit("Film", "film_resistivity", 1e12, "Ω cm", "ours"),),
        projections=(ProjectionWanted("shine", 2000.0),),
    )
    found = decide(Campaign("c", "C", asked), readings, 0.1, [], [])
    assert found.limit_studies == ()
    limit, projection = (f.text for f in found.findings)
    assert limit == (
        "No panel can be held against the limit Film: none tells its Effective film resistivity "
        "in Ω cm."
    )
    assert projection.startswith("There is no quantity “shine”.")
