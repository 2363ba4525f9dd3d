"""Comparisons in words: what is asked, and what there is to say besides the answer."""

from __future__ import annotations

from coatgui.assessment.ratings import scales
from coatgui.records import Assessment, Comparison, Judge, Method, Question

METHODS = {
    "Welch, Holm": Method.WELCH,
    "Games–Howell": Method.GAMES_HOWELL,
    "Tukey–Kramer": Method.TUKEY,
    "Dunnett, against the first": Method.DUNNETT,
    "Ranks, exact": Method.RANKS,
    "Dunn, on ranks": Method.DUNN,
}


def in_words(question: Question) -> str:
    """A question as a short line."""
    what = question.quantity.replace("_", " ")
    if question.frequency_hz is not None:
        what = f"|Z|·A at {question.frequency_hz:g} Hz"
    when = "at the last shared inspection"
    if question.exposure_h is not None:
        when = f"at {question.exposure_h:g} h"
    if question.judge is Judge.AREA_UNDER_COURSE:
        when = "over the whole course"
    elif question.judge is Judge.TIME_TO_LIMIT:
        what, when = "time", f"to {question.limit.name}" if question.limit else ""
    elif question.judge is Judge.RATING:
        what = str(scales().get(question.scale, {}).get("name", question.scale))
    by = next((words for words, m in METHODS.items() if m is question.method), "")
    return f"{what} {when}, {by}"


def more(assessment: Assessment, comparison: Comparison) -> list[str]:
    """What it would take, what to do next, the limits, the courses: a line each."""
    lines = [*comparison.effort]
    if assessment.next_inspection is not None:
        lines.append(assessment.next_inspection.text)
    lines += [study.text for study in assessment.limit_studies]
    lines += [trend.text for trend in assessment.trends]
    return [f"◦  {line}" for line in lines if line]
