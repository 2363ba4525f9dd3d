"""Which formulation is ahead, and which cannot be told apart.

Compared is log₁₀(|Z|·A) at the first wanted frequency (0.1 Hz), at the last inspection that all
formulations share; the panel is the unit. Each pair is tested by Welch's t (unequal variances),

    t = (m₁ − m₂)/√(v₁ + v₂),  v = s²/n,  ν = (v₁ + v₂)²/(v₁²/(n₁−1) + v₂²/(n₂−1)),

and Holm's step-down keeps the chance of any false difference among all pairs below 5 %. Values that
are only a lower bound enter at the bound. A formulation whose *lower* mean rests on such bounds may
in truth be as high as any other, so it is then not told apart.

The best place of a formulation is one more than the number of those proved better, its worst place
the number of all less those proved worse. Formulations share a letter when no difference inside
their group is proved: the letters are the maximal sets without a proved difference.
"""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from itertools import combinations

import numpy as np

from coatgui.assessment.courses import inspections, panel_values
from coatgui.assessment.rules import rule
from coatgui.assessment.words import counted, hours, listed
from coatgui.records import Bound, Quantity, Rank, ReadingAssessment

_FEWEST_PANELS = 2


def welch(first: Sequence[float], second: Sequence[float]) -> float:
    """Two-sided probability that two samples of unequal variance share their mean. Each sample has
    at least two values. Samples without any spread differ for certain or not at all."""
    from scipy.special import stdtr

    a, b = np.asarray(first, dtype=np.float64), np.asarray(second, dtype=np.float64)
    va, vb = float(a.var(ddof=1)) / a.size, float(b.var(ddof=1)) / b.size
    difference = float(a.mean() - b.mean())
    if va + vb == 0:
        return 1.0 if difference == 0 else 0.0
    freedom = (va + vb) ** 2 / (va**2 / (a.size - 1) + vb**2 / (b.size - 1))
    return float(2 * stdtr(freedom, -abs(difference) / math.sqrt(va + vb)))


def holm(probabilities: Sequence[float]) -> list[float]:
    """Probabilities adjusted by Holm's step-down, in the order given."""
    order = sorted(range(len(probabilities)), key=lambda i: probabilities[i])
    adjusted = [0.0] * len(probabilities)
    running = 0.0
    for step, place in enumerate(order):
        running = max(running, min(1.0, (len(probabilities) - step) * probabilities[place]))
        adjusted[place] = running
    return adjusted


def group_letters(names: Sequence[str], differ: set[frozenset[str]]) -> dict[str, str]:
    """Letters such that two names share one exactly where their pair is not in `differ`. `names`
    from best to worst; "a" goes to the group of the best."""
    groups: list[set[str]] = []

    def grow(group: set[str], candidates: list[str], seen: list[str]) -> None:
        if not candidates and not seen:
            groups.append(group)
        for place, name in enumerate(candidates):
            alike = [o for o in candidates[place + 1 :] if frozenset((name, o)) not in differ]
            also_seen = [o for o in seen + candidates[:place] if frozenset((name, o)) not in differ]
            grow(group | {name}, alike, also_seen)

    grow(set(), list(names), [])
    groups.sort(key=lambda group: sorted(names.index(name) for name in group))
    letters = dict.fromkeys(names, "")
    for place, group in enumerate(groups):
        for name in group:
            letters[name] += _letter(place)
    return letters


def _letter(place: int) -> str:
    alphabet = "abcdefghijklmnopqrstuvwxyz"
    return alphabet[place] if place < len(alphabet) else f"{alphabet[place % 26]}{place // 26}"


@dataclass(frozen=True, slots=True)
class Ranking:
    ranks: tuple[Rank, ...]
    text: str


def ranking(readings: Mapping[str, Sequence[ReadingAssessment]], frequency_hz: float) -> Ranking:
    """Rank formulations, given the readings of each by name; those that do not count are passed
    over. Ranks run from best to worst; empty where there is nothing to compare."""
    if len(readings) < 2:
        return Ranking((), "There is only one formulation, so there is nothing to compare.")
    time, values = _last_shared(readings, frequency_hz)
    what = f"|Z|·A at {frequency_hz:g} Hz"
    if time is None:
        return Ranking(
            (), f"The formulations share no inspection with {what}, so they are not compared."
        )
    few = [name for name, panels in values.items() if len(panels) < _FEWEST_PANELS]
    if few:
        return Ranking(
            (),
            f"At {hours(time)}, the last inspection that all formulations share, {listed(few)} "
            f"{'has' if len(few) == 1 else 'have'} fewer than two panels with {what}: without "
            "replicates the formulations cannot be compared.",
        )
    logs = {name: [math.log10(q.value or 1.0) for q in panels] for name, panels in values.items()}
    names = sorted(logs, key=lambda name: (-float(np.mean(logs[name])), name))
    bounded = {n: sum(q.bound is not Bound.TWO_SIDED for q in values[n]) for n in names}
    pairs = list(combinations(names, 2))  # the first of each pair has the higher mean
    adjusted = holm(
        [1.0 if bounded[worse] else welch(logs[better], logs[worse]) for better, worse in pairs]
    )
    proved = {
        pair for pair, p in zip(pairs, adjusted, strict=True) if p < rule("ranking.significance")
    }
    letters = group_letters(names, {frozenset(pair) for pair in proved})
    ranks = tuple(
        Rank(
            name,
            1 + sum(worse == name for _, worse in proved),
            len(names) - sum(better == name for better, _ in proved),
            letters[name],
        )
        for name in names
    )
    counts = {name: len(panels) for name, panels in values.items()}
    return Ranking(ranks, _in_words(names, proved, counts, bounded, time, what))


def _last_shared(
    readings: Mapping[str, Sequence[ReadingAssessment]], frequency_hz: float
) -> tuple[float | None, dict[str, list[Quantity]]]:
    """The last inspection at which every formulation has two panels with a value, or else one."""

    def take(reading: ReadingAssessment) -> Quantity | None:
        modulus = reading.modulus_at(frequency_hz)
        return None if modulus is None else modulus.quantity

    times = [r.exposure_h for group in readings.values() for r in group if r.counts]
    single: tuple[float, dict[str, list[Quantity]]] | None = None
    for group in reversed(inspections(times)):
        there = set(group)
        values = {
            name: list(
                panel_values([r for r in those if r.exposure_h in there], take, True).values()
            )
            for name, those in readings.items()
        }
        fewest = min(len(panels) for panels in values.values())
        if fewest >= _FEWEST_PANELS and _one_unit(values):
            return float(np.mean(group)), values
        if fewest and single is None and _one_unit(values):
            single = float(np.mean(group)), values
    return single or (None, {})


def _one_unit(values: Mapping[str, Sequence[Quantity]]) -> bool:
    return len({q.unit for panels in values.values() for q in panels}) == 1


def _in_words(
    names: Sequence[str],
    proved: set[tuple[str, str]],
    counts: Mapping[str, int],
    bounded: Mapping[str, int],
    time: float,
    what: str,
) -> str:
    """Who is ahead, who is behind, who cannot be told apart; then what it was judged by."""
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
    text = "; ".join(parts) + f". Judged by {what} at {hours(time)} (Welch, Holm, 5 percent)."
    total = sum(bounded.values())
    if total:
        text += (
            f" {counted(total, 'value')} at the measuring limit entered as "
            f"{'a lower bound' if total == 1 else 'lower bounds'}, so the true distance of "
            f"{listed([n for n in names if bounded[n]])} may be larger."
        )
    return text


def _how_many(counts: Sequence[int]) -> str:
    words = {2: "two", 3: "three", 4: "four", 5: "five", 6: "six"}
    if len(set(counts)) == 1:
        return f"{words.get(counts[0], str(counts[0]))} panels each"
    return f"{min(counts)} to {max(counts)} panels each"
