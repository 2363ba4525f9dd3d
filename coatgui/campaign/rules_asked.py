"""Rules for what is asked of an assessment and for a campaign's own electrolytes and regimes.

Whether a scale, a formulation or a unit that is named exists is the assessment's to say, in words:
it may come to exist later.
"""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterable
from typing import Any

from coatgui.campaign.demands import finite, named, not_negative, positive, right_types
from coatgui.campaign.errors import OperationRefused
from coatgui.records import (
    QUANTITIES,
    Electrolyte,
    Judge,
    Limit,
    Method,
    ProjectionWanted,
    Question,
    Regime,
    Settings,
    Side,
)


def refuse_unsound_questions(settings: Settings) -> None:
    for limit in settings.limits:
        _limit(limit)
    _unlike([limit.name for limit in settings.limits], "a limit", "name")
    for question in settings.comparisons:
        _comparison(question)
    _unlike(settings.comparisons, "a comparison", "question")
    for wanted in settings.projections:
        _of_kind(wanted, ProjectionWanted, "A projection")
        right_types(wanted)
        _quantity(wanted.quantity, wanted.frequency_hz)
        positive(wanted.until_h, "The exposure time of a projection in h")


def _limit(limit: Any) -> None:
    _of_kind(limit, Limit, "A limit")
    right_types(limit)
    named(limit.name, "A limit")
    _of_kind(limit.side, Side, "The side of a limit")
    _quantity(limit.quantity, limit.frequency_hz)
    if limit.unit != QUANTITIES[limit.quantity]:
        raise OperationRefused(
            f"The limit {limit.name} must be given in {QUANTITIES[limit.quantity] or 'no unit'}, "
            f"not in {limit.unit or 'no unit'}."
        )
    finite(limit.value, f"The value of limit {limit.name}")
    if limit.quantity != "water_uptake":
        positive(limit.value, f"The value of limit {limit.name}")


def _comparison(question: Any) -> None:
    _of_kind(question, Question, "A comparison")
    right_types(question)
    _of_kind(question.judge, Judge, "What a comparison goes by")
    _of_kind(question.method, Method, "The method of a comparison")
    if question.judge is Judge.RATING:
        named(question.scale, "A comparison of ratings", "scale")
    else:
        _quantity(question.quantity, question.frequency_hz)
    if question.exposure_h is not None:
        not_negative(question.exposure_h, "The exposure time of a comparison in h")
    if question.judge is Judge.TIME_TO_LIMIT:
        if question.limit is None:
            raise OperationRefused("A comparison of times to a limit needs a limit.")
        _limit(question.limit)
    if question.method is Method.DUNNETT:
        named(question.reference, "A comparison with Dunnett's test", "reference formulation")


def _quantity(code: str, frequency_hz: float | None) -> None:
    if code not in QUANTITIES:
        raise OperationRefused(f"There is no quantity “{code}”. Known are {', '.join(QUANTITIES)}.")
    if (code == "modulus") != (frequency_hz is not None):
        raise OperationRefused("A frequency belongs to the modulus, and to it only.")
    positive(frequency_hz, "The frequency of the modulus in Hz")


def refuse_unsound_presets(settings: Settings) -> None:
    for electrolyte in settings.electrolytes:
        _of_kind(electrolyte, Electrolyte, "An electrolyte")
        right_types(electrolyte)
        named(electrolyte.electrolyte_id, "An electrolyte", "id")
        named(electrolyte.name, "An electrolyte")
        positive(electrolyte.resistivity_ohm_cm, f"The resistivity of {electrolyte.name} in Ω cm")
        for words in electrolyte.known_by:
            if not words or not all(isinstance(word, str) and word.strip() for word in words):
                raise OperationRefused(
                    f"{electrolyte.name} can only be known by words that are not empty."
                )
    _unlike([e.electrolyte_id for e in settings.electrolytes], "an electrolyte", "id")
    for regime in settings.regimes:
        _of_kind(regime, Regime, "An exposure regime")
        right_types(regime)
        named(regime.regime_id, "An exposure regime", "id")
        named(regime.name, "An exposure regime")
        positive(regime.cycle_h, f"The cycle of {regime.name} in h")
        for hours in regime.duration_h or ():
            not_negative(hours, f"The duration of {regime.name} in h")
        if regime.duration_h is not None and regime.duration_h[0] > regime.duration_h[1]:
            raise OperationRefused(f"The duration of {regime.name} ends before it begins.")
    _unlike([r.regime_id for r in settings.regimes], "an exposure regime", "id")


def _of_kind(value: Any, kind: type, what: str) -> None:
    if not isinstance(value, kind):
        raise OperationRefused(f"{what} cannot be {value!r}.")


def _unlike(values: Iterable[Any], what: str, fact: str) -> None:
    for value, times in Counter(values).items():
        if times > 1:
            which = f" “{value}”" if isinstance(value, str) else ""
            raise OperationRefused(f"There is already {what} with this {fact}{which}.")
