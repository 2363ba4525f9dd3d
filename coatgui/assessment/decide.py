"""From panels and readings to what is decided about formulations: limits, trends, comparisons,
projections, ratings, advice."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace
from typing import TypeVar

from coatgui.assessment.limit_studies import criterion_studies, limit_studies
from coatgui.assessment.planning import early_advice
from coatgui.assessment.quantities import kind
from coatgui.assessment.ranking import answer, ranking
from coatgui.assessment.ratings import Rated, correlations, rated, rating_courses
from coatgui.assessment.samples import Readings
from coatgui.assessment.trends import project, trend
from coatgui.records import (
    Assessment,
    Campaign,
    Comparison,
    Criterion,
    Finding,
    Limit,
    LimitStudy,
    PanelAssessment,
    Projection,
    ProjectionWanted,
    Question,
    RatingCorrelation,
    RatingCourse,
    ReadingAssessment,
    Severity,
    Trend,
)

Found = TypeVar("Found")


@dataclass(frozen=True, slots=True)
class Decided:
    """`findings` name what was asked and cannot be answered at all."""

    panels: tuple[PanelAssessment, ...]
    limit_studies: tuple[LimitStudy, ...]
    trends: tuple[Trend, ...]
    comparison: Comparison
    further_comparisons: tuple[Comparison, ...]
    projections: tuple[Projection, ...]
    ratings: tuple[RatingCourse, ...]
    rating_correlations: tuple[RatingCorrelation, ...]
    findings: tuple[Finding, ...]


def by_formulation(
    formulations: Sequence[str], readings: Sequence[ReadingAssessment]
) -> dict[str, list[ReadingAssessment]]:
    """The readings of each formulation that has any that count."""
    found: dict[str, list[ReadingAssessment]] = {name: [] for name in formulations}
    for reading in readings:
        if reading.formulation in found:
            found[reading.formulation].append(reading)
    return {name: own for name, own in found.items() if any(r.counts for r in own)}


def decide(
    campaign: Campaign,
    readings: Readings,
    modulus_frequency_hz: float,
    criteria: Sequence[Criterion],
    panels: Sequence[PanelAssessment],
) -> Decided:
    """`readings` by formulation; what is asked stands in the campaign's settings."""
    asked = campaign.settings
    seen, findings = rated(campaign)
    kinds = [
        kind("modulus", modulus_frequency_hz),
        kind("coating_capacitance"),
        kind("pore_resistance"),
        kind("water_uptake"),
    ]
    trends = [trend(name, own, of) for name, own in readings.items() for of in kinds]
    studies = [
        *criterion_studies(panels, list(readings), criteria),
        *_each(asked.limits, lambda limit: _studied(limit, readings), findings),
    ]
    return Decided(
        tuple(_advised(panels)),
        tuple(studies),
        tuple(t for t in trends if t is not None),
        ranking(readings, modulus_frequency_hz),
        tuple(_answered(question, readings, seen) for question in asked.comparisons),
        tuple(_each(asked.projections, lambda wanted: _projected(wanted, readings), findings)),
        rating_courses(seen),
        correlations(readings, seen.ratings, kinds),
        tuple(findings),
    )


def answer_beside(campaign: Campaign, assessment: Assessment, question: Question) -> Comparison:
    """The answer to a question that the campaign does not keep, from its assessment as it is."""
    names = [f.formulation for f in assessment.formulations]
    return _answered(question, by_formulation(names, assessment.readings), rated(campaign)[0])


def _answered(question: Question, readings: Readings, seen: Rated) -> Comparison:
    try:
        return answer(question, readings, seen)
    except ValueError as problem:
        return Comparison(question, "", None, (), (), str(problem))


Asked = TypeVar("Asked", Limit, ProjectionWanted)


def _each(
    asked: Sequence[Asked],
    answer_to: Callable[[Asked], Sequence[Found]],
    findings: list[Finding],
) -> list[Found]:
    """The answers to all that is asked, and a doubt for each that cannot be answered."""
    found: list[Found] = []
    for one in asked:
        try:
            found += answer_to(one)
        except ValueError as problem:
            findings.append(Finding("question_unanswered", Severity.DOUBT, str(problem)))
    return found


def _studied(limit: Limit, readings: Readings) -> tuple[LimitStudy, ...]:
    found = limit_studies(readings, [limit])
    if readings and not found:
        raise ValueError(
            f"No panel can be held against the limit {limit.name}: none tells its "
            f"{kind(limit.quantity, limit.frequency_hz).name} in {limit.unit or 'its unit'}."
        )
    return found


def _projected(wanted: ProjectionWanted, readings: Readings) -> list[Projection]:
    of = kind(wanted.quantity, wanted.frequency_hz)
    return [project(name, own, of, wanted) for name, own in readings.items()]


def _advised(panels: Sequence[PanelAssessment]) -> list[PanelAssessment]:
    sisters: dict[str, list[PanelAssessment]] = {}
    for panel in panels:
        sisters.setdefault(panel.formulation, []).append(panel)
    return [replace(p, advice=early_advice(p, sisters[p.formulation])) for p in panels]
