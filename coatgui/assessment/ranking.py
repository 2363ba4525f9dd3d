"""Comparisons in words: who is ahead, who cannot be told apart, and what it would take.

The usual question is asked of every campaign: log₁₀(|Z|·A) at the first wanted frequency (0.1 Hz),
at the last inspection that all formulations share, by Welch's test with Holm's correction. The
tests themselves are in `significance.py`, the samples in `samples.py`.
"""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from itertools import pairwise

import numpy as np

from coatgui.assessment.comparison import BY_RANKS, FEWEST_PANELS, Outcome, compare
from coatgui.assessment.courses import inspections, panel_values
from coatgui.assessment.effort import detectable, panels_needed
from coatgui.assessment.quantities import Kind, kind
from coatgui.assessment.ratings import NOTHING_RATED, Rated
from coatgui.assessment.rules import rule
from coatgui.assessment.samples import Readings, Samples, samples
from coatgui.assessment.significance import Entry, fewest_provable, kruskal_wallis
from coatgui.assessment.words import counted, hours, listed, power_of_ten
from coatgui.records import (
    Comparison,
    Judge,
    Method,
    Question,
    ReadingAssessment,
)

_NAMES = {
    Method.WELCH: "Welch, Holm",
    Method.TUKEY: "Tukey and Kramer",
    Method.GAMES_HOWELL: "Games and Howell",
    Method.DUNNETT: "Dunnett",
    Method.RANKS: "Gehan's ranks, Holm",
    Method.DUNN: "Dunn's ranks, Holm",
}
_POOLED = (Method.TUKEY, Method.DUNNETT)
_ALIKE = 2.0  # times; own choice: with spreads further apart, 6 in 100 of equals are told apart
_ORDINAL = (Judge.TIME_TO_LIMIT, Judge.RATING)
_MOST_ADVICE = 3


def ranking(readings: Mapping[str, Sequence[ReadingAssessment]], frequency_hz: float) -> Comparison:
    """The usual comparison of formulations, given the readings of each by name; those that do not
    count are passed over. Ranks run from best to worst; empty where there is nothing to compare."""
    return answer(Question(frequency_hz=frequency_hz), readings)


def answer(question: Question, readings: Readings, seen: Rated = NOTHING_RATED) -> Comparison:
    """Answer a question. What is ordinal or censored in itself (ratings, times to a limit) is
    compared by ranks whatever the method. Raises ValueError for a question that cannot be
    understood."""
    if len(readings) < 2:
        return _nothing(question, "There is only one formulation, so there is nothing to compare.")
    found = samples(question, readings, seen)
    if found.text or not found.by_name:
        return _nothing(question, found.text, found.what)
    few = [name for name, panels in found.by_name.items() if len(panels) < FEWEST_PANELS]
    if few:
        when = found.when[:1].upper() + found.when[1:]
        shared = ", the last inspection that all formulations share," if found.exposure_h else ""
        start = f"{when}{shared} " if when else ""
        return _nothing(
            question,
            f"{start}{listed(few)} {'has' if len(few) == 1 else 'have'} fewer than two panels "
            f"with {found.what}: without replicates the formulations cannot be compared.",
            found.what,
        )
    method = question.method
    if question.judge in _ORDINAL and method not in BY_RANKS:
        method = Method.RANKS
    outcome = compare(found.by_name, method, found.unit, question.reference, found.better)
    return Comparison(
        question,
        found.what,
        found.exposure_h,
        outcome.ranks,
        outcome.pairs,
        _in_words(outcome, found, method, question.reference),
        _effort(outcome, found, method, question, readings),
    )


def _nothing(question: Question, text: str, what: str = "") -> Comparison:
    return Comparison(question, what, None, (), (), text)


def _in_words(outcome: Outcome, found: Samples, method: Method, reference: str) -> str:
    """Who is ahead, who is behind, who cannot be told apart; then what it was judged by."""
    counts = {name: len(panels) for name, panels in found.by_name.items()}
    if method is Method.DUNNETT:
        parts = _against(outcome, reference, counts)
    else:
        parts = _order(outcome.names, outcome.proved, counts)
    when = f" {found.when}" if found.when else ""
    percent = 100 * rule("ranking.significance")
    judged = f"{found.what}{when} ({_NAMES[method]}, {percent:g} percent)"
    text = f"{'; '.join(parts)}. Judged by {judged}."
    bounded = found.bounded
    total = sum(bounded.values())
    if total and method not in BY_RANKS:
        text += (
            f" {counted(total, 'value')} at the measuring limit entered as "
            f"{'a lower bound' if total == 1 else 'lower bounds'}, so the true distance of "
            f"{listed([n for n in outcome.names if bounded[n]])} may be larger."
        )
    doubted = [(name, found.doubtful.get(name, 0)) for name in outcome.names]
    if any(count for _, count in doubted):
        rest = listed([f"{count} of {name}" for name, count in doubted if count])
        text += f" Readings under doubt are among them: {rest}."
    if method in _POOLED:
        text += _spread_warning(found)
    if method is Method.RANKS:
        text += _rank_warning(outcome, counts)
    if method is Method.DUNN:
        whole = kruskal_wallis(list(found.by_name.values()))
        text += (
            f" Over all formulations together p = {power_of_ten(whole)} (Kruskal and Wallis). Both "
            "are laws for many panels; with few they see less than there is."
        )
    return text


def _order(
    names: Sequence[str], proved: set[tuple[str, str]], counts: Mapping[str, int]
) -> list[str]:
    parts: list[str] = []
    rest = list(names)
    # Peel off whoever is proved better than all that remain, from the top.
    while len(rest) > 1 and all((rest[0], other) in proved for other in rest[1:]):
        if len(rest) == 2:
            parts.append(f"{rest[0]} is ahead of {rest[1]}")
        else:
            parts.append(f"{rest[0]} is ahead of {'the rest' if not parts else 'the others'}")
        rest = rest[1:]
    if len(rest) > 1:
        inside = [pair for pair in proved if pair[0] in rest and pair[1] in rest]
        panels = _how_many([counts[name] for name in rest])
        if not inside:
            parts.append(f"{listed(rest)} cannot be told apart with {panels}")
        else:
            for better in rest:
                behind = [worse for worse in rest if (better, worse) in inside]
                if behind:
                    parts.append(f"{better} is ahead of {listed(behind)}")
            parts.append(f"the other pairs cannot be told apart with {panels}")
    return parts


def _against(outcome: Outcome, reference: str, counts: Mapping[str, int]) -> list[str]:
    ahead = [a for a, b in outcome.proved if b == reference]
    behind = [b for a, b in outcome.proved if a == reference]
    rest = [n for n in outcome.names if n not in (*ahead, *behind, reference)]
    parts = []
    if ahead:
        parts.append(f"{listed(sorted(ahead))} {_is(ahead)} ahead of {reference}")
    if behind:
        parts.append(f"{listed(sorted(behind))} {_is(behind)} behind {reference}")
    if rest:
        panels = _how_many([counts[name] for name in (*rest, reference)])
        parts.append(f"{listed(rest)} cannot be told from {reference} with {panels}")
    return parts


def _is(names: Sequence[str]) -> str:
    return "is" if len(names) == 1 else "are"


def _spread_warning(found: Samples) -> str:
    """Said where a test that takes the spread between panels to be alike is used and it is not."""
    spreads = [_sd(sample) for sample in found.by_name.values()]
    least, most = min(spreads), max(spreads)
    if most <= _ALIKE * least:
        return ""
    return (
        f" The spread between panels is {least:.2g} to {most:.2g} {found.unit}, while this test "
        "takes it to be alike in all formulations: Welch's and Games and Howell's do not."
    )


def _rank_warning(outcome: Outcome, counts: Mapping[str, int]) -> str:
    """Said where so few panels cannot give a significant rank test whatever they read."""
    pairs = len(outcome.pairs)
    level = rule("ranking.significance")
    mute = [
        pair
        for pair in outcome.pairs
        if fewest_provable(counts[pair.first], counts[pair.second]) * pairs > level
    ]
    if not mute or len(mute) < pairs:
        return ""
    return (
        " With so few panels a test by ranks cannot prove any difference, however large: read the "
        "order, and take more panels."
    )


def _how_many(counts: Sequence[int]) -> str:
    words = {2: "two", 3: "three", 4: "four", 5: "five", 6: "six"}
    if len(set(counts)) == 1:
        return f"{words.get(counts[0], str(counts[0]))} panels each"
    return f"{min(counts)} to {max(counts)} panels each"


# ---------------------------------------------------------------------------------------------
# What it would take


def _effort(
    outcome: Outcome, found: Samples, method: Method, question: Question, readings: Readings
) -> tuple[str, ...]:
    """For neighbours in the order that are not told apart: panels needed, or a longer exposure."""
    if method in BY_RANKS:
        return ()
    proved = outcome.proved
    alpha = rule("ranking.significance") / max(len(outcome.pairs), 1)
    wanted = rule("ranking.power")
    said: list[str] = []
    for ahead, behind in pairwise(outcome.names):
        if (ahead, behind) in proved or len(said) == _MOST_ADVICE:
            continue
        first, second = found.by_name[ahead], found.by_name[behind]
        if any(e.censored for e in (*first, *second)):
            said.append(
                f"{ahead} and {behind} read at the measuring limit: more panels do not separate "
                "them, a longer exposure or a more sensitive set-up may."
            )
            continue
        said.append(_one_effort(ahead, behind, first, second, alpha, wanted, found))
        longer = _longer(ahead, behind, first, second, alpha, question, readings)
        if longer:
            said[-1] += " " + longer
    return tuple(said)


def _sd(sample: Sequence[Entry]) -> float:
    return float(np.std([e.value for e in sample], ddof=1))


def _one_effort(
    ahead: str,
    behind: str,
    first: Sequence[Entry],
    second: Sequence[Entry],
    alpha: float,
    wanted: float,
    found: Samples,
) -> str:
    apart = abs(float(np.mean([e.value for e in first]) - np.mean([e.value for e in second])))
    needed = panels_needed(apart, _sd(first), _sd(second), alpha, wanted)
    few = min(len(first), len(second))
    shows = detectable(_sd(first), _sd(second), few, alpha, wanted)
    start = f"{ahead} and {behind} differ by {apart:.2g} {found.unit}, not proved. "
    if needed is None:
        start += "At this distance and scatter more than 50 panels each would not prove it"
    else:
        start += f"At this distance and scatter about {needed} panels each would"
    return (
        f"{start} (chance {100 * wanted:.0f} percent); with {few} panels each a difference from "
        f"{shows:.2g} {found.unit} on would show."
    )


def _longer(
    ahead: str,
    behind: str,
    first: Sequence[Entry],
    second: Sequence[Entry],
    alpha: float,
    question: Question,
    readings: Readings,
) -> str:
    """Where the distance has been growing, when it would show if it went on; else nothing."""
    if question.judge is not Judge.AT_TIME:
        return ""
    of = kind(question.quantity, question.frequency_hz)
    times, apart = _distances(of, readings[ahead], readings[behind])
    if len(times) < 4:
        return ""
    t, d = np.array(times[-6:]), of.better * np.array(apart[-6:])
    slope, level = np.polyfit(t, d, 1)
    residual = d - np.polyval([slope, level], t)
    spread = float(residual @ residual) / (t.size - 2) / float(((t - t.mean()) ** 2).sum())
    if slope <= 0 or slope < 2 * math.sqrt(spread):
        return ""
    few = min(len(first), len(second))
    shows = detectable(_sd(first), _sd(second), few, alpha, rule("ranking.power"))
    at = float((shows - level) / slope)
    if not t[-1] < at <= 2 * t[-1]:
        return ""
    return (
        "The distance has been growing; if that goes on, it would show at about "
        f"{hours(round(at))} with the panels there are (a rough guide, not a prediction)."
    )


def _distances(
    of: Kind, first: Sequence[ReadingAssessment], second: Sequence[ReadingAssessment]
) -> tuple[list[float], list[float]]:
    times, apart = [], []
    for group in inspections([r.exposure_h for r in (*first, *second) if r.counts]):
        means = []
        for own in (first, second):
            there = [r for r in own if r.exposure_h in group]
            values = [q.value or 1.0 for q in panel_values(there, of.take, of.logarithmic).values()]
            if values:
                means.append(float(np.mean(np.log10(values) if of.logarithmic else values)))
        if len(means) == 2:
            times.append(float(np.mean(group)))
            apart.append(means[0] - means[1])
    return times, apart
