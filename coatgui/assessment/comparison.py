"""Which formulation is ahead, and which cannot be told apart, on whatever is asked.

The panel is the unit: each gives one value, at an inspection that all formulations share, as a mean
over the course, as the interval in which it broke a limit, or as a rating. Values are put on a
footing on which more is better, logarithmic where the quantity spreads over decades.

Bounds enter the tests of means at the bound, and are watched: where the mean that is *behind* rests
on values that may be higher in truth, or the one ahead on values that may be lower, the pair is not
told apart. The tests by ranks give pairs whose order is open no weight at all.

The best place of a formulation is one more than the number of those proved better, its worst place
the number of all less those proved worse. Beside them stands where its place lies in 95 of 100
draws of the means: m + s/√n·t with Student's t, for with three panels drawing the panels themselves
again would make too little of the scatter; by ranks, the panels are drawn.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from itertools import combinations

import numpy as np

from coatgui.assessment.letters import group_letters
from coatgui.assessment.rules import rule
from coatgui.assessment.significance import (
    Entry,
    all_pairs_range,
    difference_limits,
    dunn,
    dunnett,
    gehan,
    holm,
    mean_scores,
    welch,
)
from coatgui.records import Bound, FloatArray, Method, PairTest, Quantity, Rank

FEWEST_PANELS = 2
BY_RANKS = (Method.RANKS, Method.DUNN)
_DRAWS, _SEED = 4000, 1


@dataclass(frozen=True, slots=True)
class Outcome:
    """`names` from best to worst; `pairs` in that order, the first of each ahead."""

    names: tuple[str, ...]
    pairs: tuple[PairTest, ...]
    ranks: tuple[Rank, ...]

    @property
    def proved(self) -> set[tuple[str, str]]:
        return {(pair.first, pair.second) for pair in self.pairs if pair.differ}


def entry(quantity: Quantity, footing: float, better: int) -> Entry:
    """A panel's quantity as an entry; `footing` is its value on the footing, `better` ±1."""
    low = -np.inf if quantity.bound in (Bound.AT_MOST, Bound.UNDETERMINED) else footing
    high = np.inf if quantity.bound in (Bound.AT_LEAST, Bound.UNDETERMINED) else footing
    if better < 0:
        low, high, footing = -high, -low, -footing
    return Entry(float(footing), float(low), float(high))


def compare(
    samples: Mapping[str, Sequence[Entry]],
    method: Method,
    unit: str,
    reference: str = "",
    better: int = 1,
) -> Outcome:
    """Compare formulations, each with at least two panels. `unit` and `better` are for the
    differences as they are shown. Raises ValueError for Dunnett without a known reference."""
    if method is Method.DUNNETT and reference not in samples:
        raise ValueError("Dunnett's comparison needs one of the formulations as its reference.")
    by_ranks = method in BY_RANKS
    middles = (
        mean_scores(list(samples.values()))
        if by_ranks
        else [float(np.mean([e.value for e in sample])) for sample in samples.values()]
    )
    middle = dict(zip(samples, middles, strict=True))
    names = tuple(sorted(samples, key=lambda name: (-middle[name], name)))
    ordered = [samples[name] for name in names]
    raw, adjusted = probabilities(names, ordered, method, reference)
    level = rule("ranking.significance")
    pairs = []
    for (i, j), probability in adjusted.items():
        difference = None if by_ranks else _difference(ordered[i], ordered[j], unit, better)
        proved = probability < level
        pairs.append(PairTest(names[i], names[j], difference, raw[i, j], probability, proved))
    proved_pairs = {(p.first, p.second) for p in pairs if p.differ}
    # Against a reference the other pairs are not tested, so there are no groups.
    letters = (
        dict.fromkeys(names, "")
        if method is Method.DUNNETT
        else group_letters(names, {frozenset(pair) for pair in proved_pairs})
    )
    drawn = _drawn_ranks(ordered, by_ranks)
    ranks = tuple(
        Rank(
            name,
            1 + sum(worse == name for _, worse in proved_pairs),
            len(names) - sum(best == name for best, _ in proved_pairs),
            letters[name],
            *drawn[place],
        )
        for place, name in enumerate(names)
    )
    return Outcome(names, tuple(pairs), ranks)


def probabilities(
    names: Sequence[str], ordered: Sequence[Sequence[Entry]], method: Method, reference: str
) -> tuple[dict[tuple[int, int], float], dict[tuple[int, int], float]]:
    """Probability of each pair alone and after correction, by places."""
    values = [[e.value for e in sample] for sample in ordered]
    places = list(combinations(range(len(names)), 2))
    if method is Method.RANKS:
        raw = {pair: gehan(ordered[pair[0]], ordered[pair[1]]) for pair in places}
        return raw, dict(zip(raw, holm(list(raw.values())), strict=True))
    if method is Method.DUNN:
        raw = dunn(ordered)
        return raw, dict(zip(raw, holm(list(raw.values())), strict=True))
    if method is Method.DUNNETT:
        at = names.index(reference)
        others = [i for i in range(len(names)) if i != at]
        places = [(min(i, at), max(i, at)) for i in others]
        corrected = dunnett([values[i] for i in others], values[at])
        adjusted = dict(zip(places, corrected, strict=True))
    elif method is Method.WELCH:
        adjusted = {}
    else:
        adjusted = all_pairs_range(values, method is Method.TUKEY)
    raw = {pair: welch(values[pair[0]], values[pair[1]]) for pair in places}
    open_order = {pair for pair in places if _open_order(ordered[pair[0]], ordered[pair[1]])}
    raw = {pair: 1.0 if pair in open_order else p for pair, p in raw.items()}
    if method is Method.WELCH:
        return raw, dict(zip(raw, holm(list(raw.values())), strict=True))
    return raw, {pair: 1.0 if pair in open_order else adjusted[pair] for pair in places}


def _open_order(ahead: Sequence[Entry], behind: Sequence[Entry]) -> bool:
    """Whether bounds leave it open that the one behind is not behind."""
    return any(e.high > e.value for e in behind) or any(e.low < e.value for e in ahead)


def _difference(
    ahead: Sequence[Entry], behind: Sequence[Entry], unit: str, better: int
) -> Quantity:
    """Difference of the means, first less second, with its own 95 % limits."""
    value, low, high = difference_limits(
        [better * e.value for e in ahead], [better * e.value for e in behind]
    )
    method = "difference of the means, Welch's limits, not corrected for many pairs"
    if any(e.censored for e in (*ahead, *behind)):
        return Quantity(value, None, None, Bound.UNDETERMINED, unit, method + "; bounds in it")
    return Quantity(value, low, high, Bound.TWO_SIDED, unit, method)


def _drawn_ranks(ordered: Sequence[Sequence[Entry]], by_ranks: bool) -> list[tuple[int, int]]:
    """Places that each sample takes in 95 of 100 draws."""
    random = np.random.default_rng(_SEED)
    if by_ranks:
        drawn = _drawn_scores(ordered, random)
    else:
        columns = []
        for sample in ordered:
            values = np.array([e.value for e in sample])
            error = values.std(ddof=1) / np.sqrt(values.size)
            columns.append(values.mean() + error * random.standard_t(values.size - 1, _DRAWS))
        drawn = np.array(columns)
    places = 1 + np.array([(drawn > own).sum(axis=0) for own in drawn])
    low = np.percentile(places, 2.5, axis=1, method="lower")
    high = np.percentile(places, 97.5, axis=1, method="higher")
    return [(int(a), int(b)) for a, b in zip(low, high, strict=True)]


def _drawn_scores(ordered: Sequence[Sequence[Entry]], random: np.random.Generator) -> FloatArray:
    """Mean score of every sample with its panels drawn again, against all panels as they are."""
    pool = [e for sample in ordered for e in sample]
    scores = [mean_scores([[e], pool])[0] for e in pool]
    columns, start = [], 0
    for sample in ordered:
        own = np.array(scores[start : start + len(sample)])
        start += len(sample)
        columns.append(own[random.integers(0, own.size, (_DRAWS, own.size))].mean(axis=1))
    return np.array(columns)
