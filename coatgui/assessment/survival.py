"""How long panels hold a limit: Turnbull's curve and a Weibull distribution from intervals.

Every panel gives an interval (L, R] that holds its time: between two readings, before the first
(L = 0), or after the last that told (R = ∞).

* Turnbull (J. R. Stat. Soc. B 38 (1976) 290): the likelihood is greatest with all mass on the
  innermost intervals, those that begin at some L and end at some R with no other end between; their
  masses are found by self-consistency, p_j ← mean over panels of α_ij p_j / Σ_k α_ik p_k. Where
  inside its interval the mass lies is not known: the curve has two ends there. With all times known
  it is the curve of Kaplan and Meier.
* Limits of the share that holds at a time t: panels known to have broken the limit by t, panels
  known to hold at t, and those of which neither is known. Clopper and Pearson's exact limits with
  the unknown ones counted first as holding, then as broken.
* Weibull, S(t) = exp(−(t/η)^β): maximum of Σ ln[S(L) − S(R)] over (ln η, ln β) by a grid that draws
  together, limits from the region where the logarithm of the likelihood is within t²/2 of its
  maximum, t = Student's 97.5 % point with one less degree of freedom than panels that broke the
  limit (1.96, the value for many panels, is too narrow for few). Nelson 1982; Meeker and Escobar.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from itertools import pairwise

import numpy as np

from coatgui.assessment.courses import student_95
from coatgui.assessment.rules import rule
from coatgui.records import Bound, CurveStep, FloatArray, Quantity, WeibullFit

_ITERATIONS = 20_000
_CLOSE = 1e-10
_GRID, _ROUNDS, _RAYS, _HALVINGS, _FARTHEST = 15, 14, 72, 40, 30.0


@dataclass(frozen=True, slots=True)
class Turnbull:
    """Innermost intervals (J,) and the share of panels in each."""

    after_h: FloatArray
    by_h: FloatArray
    share: FloatArray

    def standing(self, time_h: float) -> tuple[float, float]:
        """Least and greatest share that still holds at a time."""
        certain = float(self.share[self.by_h <= time_h].sum())
        possible = float(self.share[(self.after_h < time_h) | (self.by_h <= time_h)].sum())
        return max(1 - possible, 0.0), max(1 - certain, 0.0)


def turnbull(after_h: Sequence[float], by_h: Sequence[float]) -> Turnbull:
    """The curve from intervals (after_h, by_h], by_h infinite for a panel that still holds. An
    exact time has after_h = by_h. At least one panel."""
    left = np.asarray(after_h, dtype=np.float64)
    right = np.asarray(by_h, dtype=np.float64)
    # At one time, an exact left end comes before the right ends, an open one after them.
    exact = left == right
    ends = sorted(
        [(t, 0 if e else 2, True) for t, e in zip(left, exact, strict=True)]
        + [(t, 1, False) for t in right]
    )
    inner = [(a[0], b[0]) for a, b in pairwise(ends) if a[2] and not b[2]]
    start = np.array([a for a, _ in inner])
    stop = np.array([b for _, b in inner])
    inside = (start >= left[:, None]) & (stop <= right[:, None])
    inside &= exact[:, None] | (start > left[:, None]) | (start < stop)  # (L, R] is open at L
    inside, count = np.unique(inside, axis=0, return_counts=True)
    weight = count / count.sum()
    share = np.full(start.size, 1 / start.size)
    for _ in range(_ITERATIONS):
        new = share * ((weight / (inside @ share)) @ inside)
        moved = float(np.abs(new - share).max())
        share = new
        if moved < _CLOSE:
            break
    return Turnbull(start, stop, share)


def exact_limits(events: int, total: int) -> tuple[float, float]:
    """Clopper and Pearson's 95 % limits of a share."""
    from scipy.special import betaincinv

    low = 0.0 if events == 0 else float(betaincinv(events, total - events + 1, 0.025))
    high = 1.0 if events == total else float(betaincinv(events + 1, total - events, 0.975))
    return low, high


def curve(after_h: Sequence[float], by_h: Sequence[float]) -> tuple[CurveStep, ...]:
    """The share that holds at every time at which something is known of a panel."""
    found = turnbull(after_h, by_h)
    left, right = np.asarray(after_h, dtype=np.float64), np.asarray(by_h, dtype=np.float64)
    times = np.unique(np.concatenate([left[left > 0], right[np.isfinite(right)]]))
    steps = []
    for time in times.tolist():
        broken, holding = int((right <= time).sum()), int((left >= time).sum())
        if ((left == right) & (left == time)).any():
            holding -= int(((left == right) & (left == time)).sum())
        unknown = left.size - broken - holding
        low, high = found.standing(time)
        least, _ = exact_limits(holding, left.size)
        _, most = exact_limits(holding + unknown, left.size)
        steps.append(CurveStep(time, low, high, least, most))
    return tuple(steps)


def _likelihood(log_scale: FloatArray, log_shape: FloatArray, ends: FloatArray) -> FloatArray:
    """Σ ln[S(L) − S(R)] at points of any shape; `ends` (2, n) are ln L and ln R."""
    shape = np.exp(np.clip(log_shape, -50, 50))[..., None]
    z, y = (np.exp(np.clip(shape * (end - log_scale[..., None]), -700, 7)) for end in ends)
    z = np.where(np.isneginf(ends[0]), 0.0, z)
    rest = np.where(np.isposinf(ends[1]), 1.0, -np.expm1(-np.maximum(y - z, 0.0)))
    return np.asarray((-z + np.log(np.maximum(rest, 1e-300))).sum(axis=-1), dtype=np.float64)


def weibull(after_h: Sequence[float], by_h: Sequence[float]) -> WeibullFit | None:
    """Weibull distribution of interval-censored times; None where the readings do not hold both of
    its parameters: fewer panels broke the limit than a rule asks, or all between the same two
    readings."""
    left, right = np.asarray(after_h, dtype=np.float64), np.asarray(by_h, dtype=np.float64)
    broken = int(np.isfinite(right).sum())
    if broken < rule("survival.fewest_broken"):
        return None
    with np.errstate(divide="ignore"):
        ends = np.log(np.stack([left, right]))
    finite = ends[np.isfinite(ends)]
    low = np.array([finite.min() - 3.0, math.log(0.1)])
    high = np.array([finite.max() + 7.0, math.log(50.0)])
    best, peak = _peak(low, high, ends)
    if best is None:
        return None
    allowed = student_95(max(broken - 1, 1)) ** 2 / 2
    edge = _region(best, peak - allowed, ends)

    def limits(function: FloatArray, at: float, how: str, unit: str) -> Quantity:
        """Limits of exp(function) over the region's edge; open where a ray never ended."""
        lower, upper = float(function.min()), float(function.max())
        held_low, held_high = lower > at - _FARTHEST / 2, upper < at + _FARTHEST / 2
        if held_low and held_high:
            bound = Bound.TWO_SIDED
        elif held_low:
            bound = Bound.AT_LEAST
        else:
            bound = Bound.AT_MOST if held_high else Bound.UNDETERMINED
        value = {Bound.AT_LEAST: lower, Bound.AT_MOST: upper}.get(bound, at)
        return Quantity(
            None if bound is Bound.UNDETERMINED else math.exp(value),
            math.exp(lower) if held_low else None,
            math.exp(upper) if held_high else None,
            bound,
            unit,
            how,
        )

    def time_of(share: float) -> Quantity:
        """Time by which a share has broken the limit: ln t = ln η + ln(−ln(1−p))/β."""
        level = math.log(-math.log(1 - share))
        at = float(best[0] + level * math.exp(-best[1]))
        return limits(
            edge[0] + level * np.exp(-np.minimum(edge[1], 50)),
            at,
            f"Weibull, time by which {100 * share:g} percent of panels break the limit",
            "h",
        )

    return WeibullFit(
        limits(edge[1], float(best[1]), "Weibull, maximum likelihood", ""),
        limits(edge[0], float(best[0]), "Weibull, maximum likelihood", "h"),
        time_of(0.5),
        time_of(0.1),
    )


def _peak(low: FloatArray, high: FloatArray, ends: FloatArray) -> tuple[FloatArray | None, float]:
    """Place and height of the greatest likelihood; the place None where it lies on the rim."""
    first_low, first_high = low, high
    for _ in range(_ROUNDS):
        scale = np.linspace(low[0], high[0], _GRID)[:, None]
        shape = np.linspace(low[1], high[1], _GRID)[None, :]
        height = _likelihood(scale + 0 * shape, 0 * scale + shape, ends)
        i, j = np.unravel_index(int(np.argmax(height)), height.shape)
        best, peak = np.array([scale[i, 0], shape[0, j]]), float(height[i, j])
        half = (high - low) / 5
        low = np.maximum(best - half, first_low)
        high = np.minimum(best + half, first_high)
    room = 1e-3 * (first_high - first_low)
    if ((best < first_low + room) | (best > first_high - room)).any():
        return None, peak
    return best, peak


def _region(best: FloatArray, level: float, ends: FloatArray) -> FloatArray:
    """Points (2, rays) where the likelihood falls to `level` along rays from the peak, in
    coordinates in which the region is about as wide as high."""
    angle = 2 * np.pi * np.arange(_RAYS) / _RAYS
    width = np.array([_reach(best, np.eye(2)[i], level, ends) for i in range(2)])
    rays = np.stack([width[0] * np.cos(angle), width[1] * np.sin(angle)])
    near, far = np.zeros(_RAYS), np.full(_RAYS, _FARTHEST / width.min())
    for _ in range(_HALVINGS):
        middle = (near + far) / 2
        at = best[:, None] + middle * rays
        inside = _likelihood(at[0], at[1], ends) >= level
        near, far = np.where(inside, middle, near), np.where(inside, far, middle)
    edge: FloatArray = best[:, None] + near * rays
    return edge


def _reach(best: FloatArray, direction: FloatArray, level: float, ends: FloatArray) -> float:
    near, far = 0.0, _FARTHEST
    for _ in range(_HALVINGS):
        middle = (near + far) / 2
        at = best + middle * direction
        inside = float(_likelihood(at[0], at[1], ends)) >= level
        near, far = (middle, far) if inside else (near, middle)
    return max(near, 1e-6)
