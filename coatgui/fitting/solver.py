"""Least squares for many small problems at once: Levenberg–Marquardt with bounds, batched.

Mathematics. Row i minimises S_i(θ) = Σ_m r_im(θ)² within low ≤ θ ≤ high. With J the Jacobian of r,
A = JᵀJ and g = Jᵀr, a step δ solves (A + λ D) δ = −g, D the diagonal of A held above a floor.
A parameter at a bound whose gradient points outward is taken out of the step; the step is clipped
to the bounds. The gain ratio (S − S_new)/(predicted fall) steers λ after Nielsen (1999). A row ends
when the cosine between r and every free column of J is small (the test of MINPACK, free of any
scale), when a step no longer lowers S to speak of, or when λ is beyond use.

A working set of rows is kept full: whenever rows end, waiting ones take their places, so arrays
stay large enough to be fast and small enough to stay in the processor's cache, and memory does not
grow with the number of rows. An objective is asked for A, g and S of a set of rows; residuals,
weights and masks are its business alone.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from enum import IntEnum
from typing import Any, Protocol

import numpy as np
from numpy.typing import NDArray

FloatArray = NDArray[np.float64]
BoolArray = NDArray[np.bool_]
IndexArray = NDArray[np.intp]


class Status(IntEnum):
    """Why a row ended."""

    ITERATIONS = 0
    GRADIENT = 1
    REDUCTION = 2
    STUCK = 3


MESSAGES = {
    Status.ITERATIONS: "the fit was stopped before it settled",
    Status.GRADIENT: "the fit settled",
    Status.REDUCTION: "the fit settled",
    Status.STUCK: "the fit settled as far as the arithmetic allows",
}


class Objective(Protocol):
    """Sums of squares for chosen rows."""

    def normal(
        self, theta: FloatArray, rows: IndexArray
    ) -> tuple[FloatArray, FloatArray, FloatArray]:
        """S (B,), g = Jᵀr (B, P) and A = JᵀJ (B, P, P) at `theta` (B, P) for problem `rows` (B,).
        A row that cannot be evaluated there has an S that is not finite."""
        ...


@dataclass(frozen=True)
class Solution:
    """`theta` (B, P), `cost` S (B,), `normal` A (B, P, P), `gradient` (B, P), `iterations` (B,)
    evaluations spent, `status` (B,) of `Status`, `at_bound` (B, P)."""

    theta: FloatArray
    cost: FloatArray
    normal: FloatArray
    gradient: FloatArray
    iterations: NDArray[np.int64]
    status: NDArray[np.int64]
    at_bound: BoolArray


@dataclass(frozen=True)
class Tolerance:
    """When a row has settled. `cosine` is the largest cosine between residual and Jacobian
    columns; `reduction` the smallest relative fall of S worth another step; `step` the largest
    change of a coordinate in one step; `damping` the λ of the first step: far from the solution
    full first steps tend to run off along a direction that the data hardly hold."""

    cosine: float = 1e-5
    reduction: float = 1e-8
    step: float = 3.0
    iterations: int = 100
    damping: float = 0.3


_TINY = 1e-300
_WORKING_SET = 512
_FASTEST_EASING = 0.2


def _steps(
    normal: FloatArray, gradient: FloatArray, free: BoolArray, damping: FloatArray
) -> FloatArray:
    """Damped steps (B, P); held parameters do not move. The system is scaled to a unit diagonal
    first, so that parameters of very different size do not spoil the arithmetic."""
    count = gradient.shape[1]
    places = np.arange(count)
    diagonal = normal[:, places, places]
    moving = free & (diagonal > 0)  # a parameter without any effect stays where it is
    scale = np.where(moving, 1.0 / np.sqrt(np.where(moving, diagonal, 1.0)), 0.0)
    system = normal * (scale[:, :, None] * scale[:, None, :])
    # The last term keeps an exact tie between parameters solvable.
    system[:, places, places] = np.where(moving, 1.0 + damping[:, None] + 1e-15, 1.0)
    right = -gradient * scale
    scaled = np.linalg.solve(system, right[:, :, None])[:, :, 0]
    return np.asarray(scaled * scale, dtype=np.float64)


def _of_rows(values: NDArray[Any], rows: IndexArray) -> NDArray[Any]:
    """The rows' own values, or the one row of values that all share."""
    return values if values.shape[0] == 1 else values[rows]


def _free(
    theta: FloatArray, gradient: FloatArray, low: FloatArray, high: FloatArray, fixed: BoolArray
) -> BoolArray:
    return ~(fixed | ((theta <= low) & (gradient > 0)) | ((theta >= high) & (gradient < 0)))


class _Working:
    """The rows at work: arrays of one length. Rows that end give their places to waiting ones."""

    def __init__(self, rows: IndexArray, start: FloatArray, damping: float) -> None:
        size, count = start.shape
        self.rows = rows
        self.theta = start.copy()
        self.trial = start.copy()
        self.cost = np.full(size, np.inf)
        self.normal = np.zeros((size, count, count))
        self.gradient = np.zeros((size, count))
        self.damping = np.full(size, damping)
        self.growth = np.full(size, 2.0)
        self.predicted = np.zeros(size)
        self.spent = np.zeros(size, dtype=np.int64)

    def replace(self, places: IndexArray, other: _Working) -> None:
        for name, value in vars(self).items():
            value[places] = getattr(other, name)

    def remove(self, places: IndexArray) -> None:
        kept = np.ones(self.rows.size, dtype=np.bool_)
        kept[places] = False
        for name, value in vars(self).items():
            setattr(self, name, value[kept])


def minimise(
    objective: Objective,
    start: FloatArray,
    low: FloatArray,
    high: FloatArray,
    *,
    fixed: BoolArray | None = None,
    tolerance: Tolerance | None = None,
    rows: IndexArray | None = None,
    working_set: int = _WORKING_SET,
    check: Callable[[], None] | None = None,
) -> Solution:
    """Minimise every row from `start` (B, P) between `low` and `high`, (P,) or (B, P).

    `fixed` (B, P) holds parameters at their start. `rows` (B,) are the objective's row numbers,
    0…B−1 by default; a row may occur several times, with several starts. `check` is called once
    an iteration and may raise. A start outside the bounds is moved to the nearest bound. Rows that
    cannot be evaluated at their start come back with an infinite cost and status STUCK.
    """
    tolerance = tolerance or Tolerance()
    size, count = start.shape
    rows = np.arange(size) if rows is None else rows
    fixed = np.zeros((1, count), dtype=np.bool_) if fixed is None else fixed
    low, high = np.atleast_2d(low), np.atleast_2d(high)
    theta = np.clip(start, low, high)
    result = Solution(
        theta,
        np.full(size, np.inf),
        np.zeros((size, count, count)),
        np.zeros((size, count)),
        np.zeros(size, dtype=np.int64),
        np.zeros(size, dtype=np.int64),
        np.zeros((size, count), dtype=np.bool_),
    )
    begun = min(size, working_set)
    work = _Working(np.arange(begun), theta[:begun], tolerance.damping)
    while work.rows.size:
        if check is not None:
            check()
        own = work.rows
        limits = (_of_rows(low, own), _of_rows(high, own), _of_rows(fixed, own))
        status = _iterate(objective, work, rows[own], *limits, tolerance)
        ended = np.flatnonzero(status >= 0)
        if ended.size:
            place = own[ended]
            result.theta[place] = work.theta[ended]
            result.cost[place] = work.cost[ended]
            result.normal[place] = work.normal[ended]
            result.gradient[place] = work.gradient[ended]
            result.iterations[place] = work.spent[ended]
            result.status[place] = status[ended]
            waiting = np.arange(begun, min(size, begun + ended.size))
            begun += waiting.size
            if waiting.size:
                fresh = _Working(waiting, theta[waiting], tolerance.damping)
                work.replace(ended[: waiting.size], fresh)
            if waiting.size < ended.size:
                work.remove(ended[waiting.size :])
    at_bound = (result.theta <= low) | (result.theta >= high)
    np.logical_and(at_bound, ~fixed, out=result.at_bound)
    return result


def _iterate(
    objective: Objective,
    work: _Working,
    rows: IndexArray,
    low: FloatArray,
    high: FloatArray,
    fixed: BoolArray,
    tolerance: Tolerance,
) -> NDArray[np.int64]:
    """Evaluate the trial points, accept or refuse them, and set the next ones. Returns (B,) the
    status of rows that have ended, −1 for the others."""
    cost, gradient, normal = objective.normal(work.trial, rows)
    work.spent += 1
    finite = np.isfinite(cost) & np.isfinite(gradient).all(axis=1)
    first = ~np.isfinite(work.cost)
    with np.errstate(divide="ignore", invalid="ignore"):
        fall = np.where(first, np.inf, work.cost - np.where(finite, cost, np.inf))
        better = finite & (fall > 0)
        gain = np.where(first | (work.predicted <= 0), 1.0, fall / work.predicted)
        small = better & ~first & (fall <= tolerance.reduction * work.cost)
    # Nielsen's rule: trust grows smoothly with the gain, and shrinks ever faster on refusals.
    easing = np.maximum(_FASTEST_EASING, 1.0 - (2.0 * np.clip(gain, -1.0, 1.5) - 1.0) ** 3)
    work.damping = np.where(
        better, np.where(first, work.damping, work.damping * easing), work.damping * work.growth
    )
    work.damping = np.maximum(work.damping, 1e-15)
    work.growth = np.where(better, 2.0, work.growth * 2.0)
    work.theta[better] = work.trial[better]
    work.cost[better] = cost[better]
    work.gradient[better] = gradient[better]
    work.normal[better] = normal[better]

    free = _free(work.theta, work.gradient, low, high, fixed)
    count = work.theta.shape[1]
    with np.errstate(invalid="ignore"):
        scale = np.sqrt(work.normal[:, np.arange(count), np.arange(count)] * work.cost[:, None])
        cosine = np.where(
            free & (scale > 0), np.abs(work.gradient) / np.maximum(scale, _TINY), 0.0
        ).max(axis=1)
    status = np.full(work.rows.size, -1, dtype=np.int64)
    status[work.spent >= tolerance.iterations] = Status.ITERATIONS
    status[(work.damping > 1e12) | (first & ~finite)] = Status.STUCK
    status[small] = Status.REDUCTION
    status[np.isfinite(work.cost) & (cosine <= tolerance.cosine)] = Status.GRADIENT
    status[work.cost <= _TINY] = Status.GRADIENT

    # Rows that have ended take part once more: sorting them out would cost as much.
    step = _steps(work.normal, work.gradient, free, work.damping)
    np.clip(step, -tolerance.step, tolerance.step, out=step)
    np.clip(work.theta + step, low, high, out=work.trial)
    step = work.trial - work.theta
    curved = np.einsum("bij,bj->bi", work.normal, step)
    work.predicted = -(step * (2.0 * work.gradient + curved)).sum(axis=1)
    return status
