"""Visual ratings beside the spectra: what a scale allows, what measured sizes give, correlation.

Scales, their grades and where each comes from are in `resources/ratings.toml`. Ratings are ordinal:
they are put in order and counted, never averaged, and one scale is never turned into another (the
published correlations of rust grades conflict; adhesion and rust scales run in opposite
directions).
"""

from __future__ import annotations

import math
import re
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass
from itertools import permutations
from typing import Any

import numpy as np

from coatgui.assessment.courses import inspections, panel_values
from coatgui.assessment.quantities import Kind
from coatgui.assessment.readings import NO_FORMULATION
from coatgui.assessment.rules import rule, table
from coatgui.assessment.significance import Entry
from coatgui.assessment.words import hours, listed
from coatgui.records import (
    Campaign,
    Finding,
    RatingCorrelation,
    RatingCourse,
    ReadingAssessment,
    Severity,
    VisualRating,
)

_ALL_ORDERS, _DRAWN_ORDERS, _SEED = 8, 20_000, 3


def scales() -> dict[str, dict[str, Any]]:
    """The scales by their ids, as they stand in the data. Do not change what is handed out."""
    return {str(scale["id"]): scale for scale in table("ratings")["scale"]}


def _scale(scale_id: str) -> dict[str, Any]:
    found = scales().get(scale_id)
    if found is None:
        raise ValueError(
            f"There is no rating scale “{scale_id}”. Known are {listed(list(scales()))}."
        )
    return found


def order(scale_id: str, value: str) -> float:
    """Place of a rating on its scale, more is better. Raises ValueError, in a sentence that can be
    shown, where the scale does not know the value.

    Where a rating has a size or a depth besides its quantity, the quantity alone orders it: the
    standards define no order between, say, 2(S3) and 3(S2).
    """
    scale = _scale(scale_id)
    match = re.fullmatch(str(scale["pattern"]), value.strip())
    if match is None:
        raise ValueError(f"“{value}” is no rating by {scale['name']}: {scale['example']} is meant.")
    if scale["kind"] == "number":
        return float(match.group("number").replace(",", ".")) * int(scale["better"])
    grades = [str(grade) for grade in scale["best_to_worst"]]
    return float(-grades.index(match.group("grade")))


def edition(rating: VisualRating) -> str:
    """The edition that a rating names, else the one whose table the program carries."""
    return rating.edition or str(_scale(rating.scale)["edition"])


# ---------------------------------------------------------------------------------------------
# Grades from measured sizes


def grade_of(scale_id: str, measured: float) -> str:
    """The grade that a measured area in percent, or a creepage in mm, has on a scale whose table
    gives an upper limit for every grade; a value on the limit still has the better grade. Raises
    ValueError for a negative measure or a scale without such a table.

    `rounded_up`: the table leaves gaps between whole numbers, so the measure is first rounded up to
    the next whole one (our rule).
    """
    scale = _scale(scale_id)
    if "upper_limits" not in scale:
        raise ValueError(f"{scale['name']} has no grades by a measured size.")
    if not (math.isfinite(measured) and measured >= 0):
        raise ValueError(f"A measured size of {measured} is not possible.")
    if scale.get("rounded_up"):
        measured = math.ceil(measured - 1e-9)
    for grade, limit in zip(scale["best_to_worst"], scale["upper_limits"], strict=False):
        if measured <= limit:
            return str(grade)
    return str(scale["best_to_worst"][len(scale["upper_limits"])])


def delamination_at_scribe_mm(mean_width_mm: float, scribe_width_mm: float) -> float:
    """d = (d₁ − w)/2 of ISO 4628-8 (formula from memory), one side, from the mean total width of
    the delaminated zone; with the corroded zone's width it is the corrosion c. Raises ValueError
    where the zone is narrower than the scribe."""
    if not 0 <= scribe_width_mm <= mean_width_mm:
        raise ValueError("The zone at a scribe cannot be narrower than the scribe itself.")
    return (mean_width_mm - scribe_width_mm) / 2


def creepage_by_area_mm(
    area_mm2: float, scribe_length_mm: float, scribe_area_mm2: float = 0.0
) -> float:
    """(A − A₀)/(2L) of ASTM D7087, one side. Raises ValueError for impossible sizes."""
    if scribe_length_mm <= 0 or not 0 <= scribe_area_mm2 <= area_mm2:
        raise ValueError("Creepage needs a scribe with a length, and an area no less than its own.")
    return (area_mm2 - scribe_area_mm2) / (2 * scribe_length_mm)


# ---------------------------------------------------------------------------------------------
# Beside each other and beside the spectra


@dataclass(frozen=True, slots=True)
class Rated:
    """What was seen: `panels` gives formulation and name of each panel id, with readings or not."""

    panels: Mapping[str, tuple[str, str]]
    ratings: tuple[VisualRating, ...]


NOTHING_RATED = Rated({}, ())


def rated(campaign: Campaign) -> tuple[Rated, list[Finding]]:
    """The campaign's ratings, and a doubt for each that its scale does not know."""
    names = {f.formulation_id: f.name for f in campaign.formulations}
    panels = {
        p.panel_id: (names.get(p.formulation_id, NO_FORMULATION), p.name) for p in campaign.panels
    }
    sound, findings = [], []
    for rating in campaign.ratings:
        try:
            order(rating.seen.scale, rating.seen.value)
        except ValueError as problem:
            where = f"panel {panels[rating.seen.panel_id][1]} at {hours(rating.seen.exposure_h)}"
            text = f"A rating of {where} is left aside: {problem}"
            findings.append(Finding("rating_unknown", Severity.DOUBT, text))
        else:
            sound.append(rating.seen)
    return Rated(panels, tuple(sound)), findings


@dataclass(frozen=True, slots=True)
class RatedEntries:
    by_name: dict[str, list[Entry]]
    what: str
    exposure_h: float | None
    text: str = ""


def _by_panel(
    scale_id: str, ratings: Sequence[VisualRating]
) -> dict[tuple[float, ...], dict[str, VisualRating]]:
    """Ratings of one scale by inspection and panel; of several on one panel the worst."""
    own = [r for r in ratings if r.scale == scale_id]
    found: dict[tuple[float, ...], dict[str, VisualRating]] = {}
    for group in inspections([r.exposure_h for r in own]):
        there = found.setdefault(group, {})
        for rating in own:
            if rating.exposure_h not in group:
                continue
            known = there.get(rating.panel_id)
            if known is None or order(scale_id, rating.value) < order(scale_id, known.value):
                there[rating.panel_id] = rating
    return found


def rated_entries(
    scale_id: str,
    exposure_h: float | None,
    formulations: Iterable[str],
    seen: Rated,
) -> RatedEntries:
    """Ratings of one scale at the wanted inspection, or at the last that all formulations share."""
    what = f"the rating by {_scale(scale_id)['name']}"
    for group, there in reversed(_by_panel(scale_id, seen.ratings).items()):
        if exposure_h is not None and not group[0] <= exposure_h <= group[-1]:
            continue
        by_name: dict[str, list[Entry]] = {name: [] for name in formulations}
        for panel_id, rating in there.items():
            place = order(scale_id, rating.value)
            name = seen.panels[panel_id][0]
            by_name.setdefault(name, []).append(Entry(place, place, place))
        if all(by_name.values()):
            return RatedEntries(by_name, what, float(np.mean(group)))
    return RatedEntries({}, what, None, f"The formulations share no inspection with {what}.")


def rating_courses(seen: Rated) -> tuple[RatingCourse, ...]:
    """Every formulation's ratings, scale by scale and inspection by inspection."""
    formulations = dict.fromkeys(formulation for formulation, _ in seen.panels.values())
    found = []
    for scale_id in dict.fromkeys(r.scale for r in seen.ratings):
        for group, there in _by_panel(scale_id, seen.ratings).items():
            for name in formulations:
                those = {p: r for p, r in there.items() if seen.panels[p][0] == name}
                own = [
                    (seen.panels[panel_id][1], rating.value) for panel_id, rating in those.items()
                ]
                if own:
                    ordered = sorted(own, key=lambda pair: order(scale_id, pair[1]))
                    found.append(
                        RatingCourse(
                            name,
                            scale_id,
                            float(np.mean(group)),
                            tuple(own),
                            ordered[-1][1],
                            ordered[0][1],
                            "; ".join(dict.fromkeys(edition(r) for r in those.values())),
                        )
                    )
    return tuple(found)


def spearman(first: Sequence[float], second: Sequence[float]) -> tuple[float, float]:
    """Spearman's coefficient and its two-sided probability over all orders (20,000 drawn ones for
    more than eight pairs). NaN and 1 where one side has no order."""
    a, b = _ranks(first), _ranks(second)
    a, b = a - a.mean(), b - b.mean()
    size = math.sqrt(float(a @ a) * float(b @ b))
    if size == 0:
        return math.nan, 1.0
    observed = float(a @ b) / size
    if len(first) <= _ALL_ORDERS:
        sums = np.array([a @ b[list(order_)] for order_ in permutations(range(len(first)))])
        probability = float((np.abs(sums) >= abs(float(a @ b)) - 1e-9).mean())
    else:
        random = np.random.default_rng(_SEED)
        sums = random.permuted(np.tile(b, (_DRAWN_ORDERS, 1)), axis=1) @ a
        beyond = int((np.abs(sums) >= abs(float(a @ b)) - 1e-9).sum())
        probability = (beyond + 1) / (_DRAWN_ORDERS + 1)
    return observed, probability


def _ranks(values: Sequence[float]) -> Any:
    array = np.asarray(values, dtype=np.float64)
    below = (array[None, :] < array[:, None]).sum(axis=1)
    same = (array[None, :] == array[:, None]).sum(axis=1)
    return below + (same + 1) / 2


def correlations(
    readings: Mapping[str, Sequence[ReadingAssessment]],
    ratings: Sequence[VisualRating],
    kinds: Sequence[Kind],
) -> tuple[RatingCorrelation, ...]:
    """Each scale with each quantity, at the last inspection that has both for four panels or more.

    Bounds take part at the bound. All formulations are thrown together, so a correlation may be
    only that of formulations with each other: the sentence says so.
    """
    every = [r for own in readings.values() for r in own]
    same = 1 + rule("inspection.same_within")
    found = []
    for scale_id in dict.fromkeys(r.scale for r in ratings):
        by_group = _by_panel(scale_id, ratings)
        for of in kinds:
            for group, there in reversed(by_group.items()):
                low, high = group[0] / same, group[-1] * same
                at = [r for r in every if low <= r.exposure_h <= high]
                values = panel_values(at, of.take, of.logarithmic)
                both = [panel for panel in there if panel in values]
                if len(both) < 4:
                    continue
                x = [values[p].value or 0.0 for p in both]
                y = [order(scale_id, there[p].value) for p in both]
                coefficient, probability = spearman(x, y)
                if math.isnan(coefficient):
                    break
                text = (
                    f"{of.name} and {_scale(scale_id)['name']} at {np.mean(group):g} h: Spearman "
                    f"{coefficient:+.2f} over {len(both)} panels of all formulations together "
                    f"(p = {probability:.2g}); + means the higher the one, the better the other."
                )
                found.append(
                    RatingCorrelation(scale_id, of.code, len(both), coefficient, probability, text)
                )
                break
    return tuple(found)
