"""Tests of whether samples of panels differ. All two-sided; every sample has at least two values.

* Welch: t = (m₁−m₂)/√(v₁+v₂), v = s²/n, ν = (v₁+v₂)²/(v₁²/(n₁−1)+v₂²/(n₂−1)).
* Tukey and Kramer: q = |m₁−m₂|/√(s²/2·(1/n₁+1/n₂)) with the pooled s², on the studentised range of
  k means; Games and Howell: the same with (v₁+v₂)/2 and Welch's ν.
* Dunnett against a reference: P(max|T_i| ≥ t) for t with correlation λ_iλ_j,
  λ_i = √(n_i/(n_i+n_0)): given the reference's mean z and the pooled standard deviation s, the
  comparisons are independent, so the probability is a double integral over z (Gauss and Hermite)
  and s (χ, Gauss and Legendre).
* Ranks: Gehan's score of two panels is +1, −1 or, where bounds or ties leave the order open, 0; the
  sum over all pairs of panels is compared with that of every way to deal the panels out (Mann and
  Whitney's test where nothing is censored or tied). Serves ordinal ratings and censored times, too.
* Kruskal and Wallis over all samples, and Dunn for pairs, on mean scores, which are 2 R − (N+1)
  for ranks R: H = Σ n_i s̄_i²/S² against χ², z = (s̄_i − s̄_j)/√(S²(1/n_i + 1/n_j)) against the
  normal law, S² = Σ s²/(N−1), which holds the correction for ties. Both are for large samples.
* Holm's step-down for many pairs.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from itertools import combinations

import numpy as np

from coatgui.records import FloatArray

_DEALS = 20_000
_SEED = 20_240_229


@dataclass(frozen=True, slots=True)
class Entry:
    """One panel on the footing of a comparison, on which more is better. `low` and `high` are where
    the truth may lie: infinite on the side that a bound leaves open, else equal to `value`."""

    value: float
    low: float
    high: float

    @property
    def censored(self) -> bool:
        return self.low != self.high


def welch(first: Sequence[float], second: Sequence[float]) -> float:
    """Probability that two samples of unequal variance share their mean. Samples without any spread
    differ for certain or not at all."""
    from scipy.special import stdtr

    a, b = np.asarray(first, dtype=np.float64), np.asarray(second, dtype=np.float64)
    error, freedom = _welch_error(a, b)
    difference = float(a.mean() - b.mean())
    if error == 0:
        return 1.0 if difference == 0 else 0.0
    return float(2 * stdtr(freedom, -abs(difference) / error))


def _welch_error(a: FloatArray, b: FloatArray) -> tuple[float, float]:
    """Standard error of the difference and its degrees of freedom."""
    va, vb = float(a.var(ddof=1)) / a.size, float(b.var(ddof=1)) / b.size
    if va + vb == 0:
        return 0.0, float(a.size + b.size - 2)
    freedom = (va + vb) ** 2 / (va**2 / (a.size - 1) + vb**2 / (b.size - 1))
    return math.sqrt(va + vb), freedom


def difference_limits(
    first: Sequence[float], second: Sequence[float]
) -> tuple[float, float, float]:
    """Difference of two means with its 95 % limits by Welch, not corrected for many pairs."""
    from scipy.special import stdtrit

    a, b = np.asarray(first, dtype=np.float64), np.asarray(second, dtype=np.float64)
    error, freedom = _welch_error(a, b)
    difference = float(a.mean() - b.mean())
    half = float(stdtrit(freedom, 0.975)) * error
    return difference, difference - half, difference + half


def holm(probabilities: Sequence[float]) -> list[float]:
    """Probabilities adjusted by Holm's step-down, in the order given."""
    order = sorted(range(len(probabilities)), key=lambda i: probabilities[i])
    adjusted = [0.0] * len(probabilities)
    running = 0.0
    for step, place in enumerate(order):
        running = max(running, min(1.0, (len(probabilities) - step) * probabilities[place]))
        adjusted[place] = running
    return adjusted


def pooled_variance(samples: Sequence[Sequence[float] | FloatArray]) -> tuple[float, int]:
    """Pooled variance of samples and its degrees of freedom."""
    arrays = [np.asarray(sample, dtype=np.float64) for sample in samples]
    freedom = sum(a.size - 1 for a in arrays)
    return sum(float(a.var(ddof=1)) * (a.size - 1) for a in arrays) / freedom, freedom


def all_pairs_range(
    samples: Sequence[Sequence[float]], equal_variance: bool
) -> dict[tuple[int, int], float]:
    """Tukey and Kramer's (`equal_variance`) or Games and Howell's probabilities, corrected for all
    pairs of samples, by their places."""
    from scipy.stats import studentized_range

    pooled, freedom = pooled_variance(samples)
    found = {}
    for i, j in combinations(range(len(samples)), 2):
        a, b = (np.asarray(samples[k], dtype=np.float64) for k in (i, j))
        if equal_variance:
            error, own = math.sqrt(pooled * (1 / a.size + 1 / b.size)), float(freedom)
        else:
            error, own = _welch_error(a, b)
        difference = abs(float(a.mean() - b.mean()))
        if error == 0:
            found[i, j] = 1.0 if difference == 0 else 0.0
        else:
            q = math.sqrt(2) * difference / error
            found[i, j] = float(np.clip(studentized_range.sf(q, len(samples), own), 0, 1))
    return found


def dunnett(samples: Sequence[Sequence[float]], reference: Sequence[float]) -> list[float]:
    """Probability of each sample against the reference, corrected for all of them together."""
    from scipy.special import gammaln, ndtr

    control = np.asarray(reference, dtype=np.float64)
    arrays = [np.asarray(sample, dtype=np.float64) for sample in samples]
    pooled, freedom = pooled_variance([*arrays, control])
    weight = np.sqrt([a.size / (a.size + control.size) for a in arrays])
    rest = np.sqrt(1 - weight**2)
    z, z_weight = np.polynomial.hermite_e.hermegauss(64)
    z_weight = z_weight / math.sqrt(2 * math.pi)
    node, node_weight = np.polynomial.legendre.leggauss(96)
    # s = √(χ²/ν) has practically all its mass within 9 of its standard errors about 1.
    low, high = max(0.0, 1 - 9 / math.sqrt(2 * freedom)), 1 + 9 / math.sqrt(2 * freedom)
    s = low + (high - low) * (node + 1) / 2
    half = freedom / 2
    log_density = (
        math.log(2)
        + half * math.log(half)
        - float(gammaln(half))
        + (freedom - 1) * np.log(np.maximum(s, 1e-300))
        - half * s**2
    )
    s_weight = node_weight * (high - low) / 2 * np.exp(log_density)
    found = []
    for a in arrays:
        difference = abs(float(a.mean() - control.mean()))
        error = math.sqrt(pooled * (1 / a.size + 1 / control.size))
        if error == 0:
            found.append(1.0 if difference == 0 else 0.0)
            continue
        t = difference / error
        middle = weight[:, None, None] * z[:, None]
        inside = ndtr((t * s + middle) / rest[:, None, None]) - ndtr(
            (-t * s + middle) / rest[:, None, None]
        )
        below = float(z_weight @ inside.prod(axis=0) @ s_weight)
        found.append(min(max(1 - below, 0.0), 1.0))
    return found


def gehan(first: Sequence[Entry], second: Sequence[Entry]) -> float:
    """Probability that two samples come from one: Gehan's scores, every deal of the panels, or
    20,000 drawn ones where there are more."""
    pool = [*first, *second]
    scores = np.array([[_ahead(a, b) for b in pool] for a in pool], dtype=np.float64).sum(axis=1)
    observed = abs(float(scores[: len(first)].sum()))
    if math.comb(len(pool), len(first)) <= _DEALS:
        deals = np.array(list(combinations(range(len(pool)), len(first))))
        sums = np.abs(scores[deals].sum(axis=1))
        return float((sums >= observed - 1e-9).mean())
    random = np.random.default_rng(_SEED)
    order = random.permuted(np.tile(scores, (_DEALS, 1)), axis=1)
    sums = np.abs(order[:, : len(first)].sum(axis=1))
    return float(((sums >= observed - 1e-9).sum() + 1) / (_DEALS + 1))


def _ahead(a: Entry, b: Entry) -> int:
    """+1 where a is certainly better, −1 where b is, 0 where the order is open. Intervals of time
    (L, R] that only touch are in order."""
    if a.low >= b.high and (a.low > b.low or a.high > b.high):
        return 1
    if b.low >= a.high and (b.low > a.low or b.high > a.high):
        return -1
    return 0


def kruskal_wallis(samples: Sequence[Sequence[Entry]]) -> float:
    """Probability that all samples come from one, by Kruskal and Wallis on Gehan's scores."""
    from scipy.special import chdtrc

    means, variance = _scored(samples)
    if variance == 0:
        return 1.0
    h = sum(len(own) * mean**2 for own, mean in zip(samples, means, strict=True)) / variance
    return float(chdtrc(len(samples) - 1, h))


def dunn(samples: Sequence[Sequence[Entry]]) -> dict[tuple[int, int], float]:
    """Dunn's probability of each pair of samples, by their places; not corrected for many pairs."""
    from scipy.special import ndtr

    means, variance = _scored(samples)
    found = {}
    for i, j in combinations(range(len(samples)), 2):
        error = math.sqrt(variance * (1 / len(samples[i]) + 1 / len(samples[j])))
        found[i, j] = float(2 * ndtr(-abs(means[i] - means[j]) / error)) if error else 1.0
    return found


def _scored(samples: Sequence[Sequence[Entry]]) -> tuple[list[float], float]:
    """Mean score of each sample against all, and the variance of a score."""
    pool = [entry for sample in samples for entry in sample]
    squares = sum(float(sum(_ahead(a, b) for b in pool)) ** 2 for a in pool)
    return mean_scores(samples), squares / (len(pool) - 1)


def mean_scores(samples: Sequence[Sequence[Entry]]) -> list[float]:
    """Mean Gehan score of each sample's panels against all others: the order by ranks."""
    pool = [entry for sample in samples for entry in sample]
    return [float(np.mean([sum(_ahead(a, b) for b in pool) for a in sample])) for sample in samples]


def fewest_provable(first: int, second: int) -> float:
    """The least probability that a rank test of so many panels can give."""
    return 2 / math.comb(first + second, first)
