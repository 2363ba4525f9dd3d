"""From panels and readings to what is decided about formulations: limits, trends, comparisons,
projections, ratings, advice."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

from coatgui.assessment.limit_studies import criterion_studies, limit_studies
from coatgui.assessment.planning import early_advice
from coatgui.assessment.quantities import kind
from coatgui.assessment.ranking import answer, ranking
from coatgui.assessment.ratings import correlations, order, rating_courses
from coatgui.assessment.samples import Readings
from coatgui.assessment.trends import project, trend
from coatgui.records import (
    Comparison,
    Criterion,
    LimitStudy,
    PanelAssessment,
    Projection,
    Questions,
    RatingCorrelation,
    RatingCourse,
    Trend,
)


@dataclass(frozen=True, slots=True)
class Decided:
    panels: tuple[PanelAssessment, ...]
    limit_studies: tuple[LimitStudy, ...]
    trends: tuple[Trend, ...]
    comparison: Comparison
    further_comparisons: tuple[Comparison, ...]
    projections: tuple[Projection, ...]
    ratings: tuple[RatingCourse, ...]
    rating_correlations: tuple[RatingCorrelation, ...]


def decide(
    readings: Readings,
    modulus_frequency_hz: float,
    criteria: Sequence[Criterion],
    questions: Questions,
    panels: Sequence[PanelAssessment],
) -> Decided:
    """`readings` by formulation. Raises ValueError for a question that cannot be understood."""
    for rating in questions.ratings:
        order(rating.scale, rating.value)  # says what is wrong with a rating before it is used
    kinds = [
        kind("modulus", modulus_frequency_hz),
        kind("coating_capacitance"),
        kind("pore_resistance"),
        kind("water_uptake"),
    ]
    trends = [trend(name, own, of) for name, own in readings.items() for of in kinds]
    return Decided(
        tuple(_advised(panels)),
        (
            *criterion_studies(panels, list(readings), criteria),
            *limit_studies(readings, questions.limits),
        ),
        tuple(t for t in trends if t is not None),
        ranking(readings, modulus_frequency_hz),
        tuple(answer(q, readings, questions.ratings) for q in questions.comparisons),
        tuple(
            project(name, own, kind(wanted.quantity, wanted.frequency_hz), wanted)
            for wanted in questions.projections
            for name, own in readings.items()
        ),
        rating_courses(readings, questions.ratings),
        correlations(readings, questions.ratings, kinds),
    )


def _advised(panels: Sequence[PanelAssessment]) -> list[PanelAssessment]:
    sisters: dict[str, list[PanelAssessment]] = {}
    for panel in panels:
        sisters.setdefault(panel.formulation, []).append(panel)
    return [replace(p, advice=early_advice(p, sisters[p.formulation])) for p in panels]
