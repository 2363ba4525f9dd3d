"""Least squares for many small problems at once: Levenberg–Marquardt with bounds, batched.

Mathematics. Row i minimises S_i(θ) = Σ_m r_im(θ)² within low ≤ θ ≤ high. With J the Jacobian of r,
A = JᵀJ and g = Jᵀr, a step δ solves (A + λ D) δ = −g, D the diagonal of A.
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
from typing import Protocol

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
        """S (W,), g = Jᵀr (P, W) and A = JᵀJ (P, P, W) at `theta` (P, W) for problem `rows` (W,).
        A row that cannot be evaluated there has an S or a g that is not finite."""
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
# Rows at work at once: enough to make the price of a call small for each of them, few enough for
# their matrices to stay in the processor's cache.
_WORKING_SET = 1024
_FASTEST_EASING = 0.2
# A pivot below this, of a matrix with a unit diagonal, is rounding.
_SMALLEST_PIVOT = 1e-15
_IMMOVABLE = 1e200
_FEW = 96
_GOING = -1


def _diagonal(matrices: FloatArray) -> FloatArray:
    """The diagonal (P, W) of (P, P, W), to be read and written."""
    count, _, size = matrices.shape
    return matrices.reshape(count * count, size)[:: count + 1]


def _steps(
    normal: FloatArray, gradient: FloatArray, free: BoolArray, damping: FloatArray
) -> FloatArray:
    """Damped steps (P, W); held parameters do not move.

    Gaussian elimination over all W at once: a call of LAPACK for each takes several times as long.
    Symmetric and positive, it needs no exchange of rows, and its rounding is the same whatever the
    size of the parameters. A few systems are done sooner by LAPACK."""
    count, size = gradient.shape
    diagonal = _diagonal(normal)
    system = normal.copy()
    step = -gradient
    # The last term keeps an exact tie between parameters solvable. A parameter without any effect
    # stays where it is.
    pivots = _diagonal(system)
    np.multiply(diagonal, 1.0 + 1e-15 + damping, out=pivots)
    pivots[~free | (diagonal <= 0)] = _IMMOVABLE
    if size < _FEW:
        try:
            found = np.linalg.solve(system.transpose(2, 0, 1), step.T[:, :, None])
            return np.asarray(found[:, :, 0].T, dtype=np.float64)
        except np.linalg.LinAlgError:
            pass  # one of them is singular to the last digit
    smallest = _SMALLEST_PIVOT * diagonal
    for j in range(count):
        pivot = pivots[j]
        np.maximum(pivot, smallest[j], out=pivot)
        np.reciprocal(pivot, out=pivot)
        if j + 1 < count:
            row = system[j, j + 1 :]
            below = row * pivot
            system[j + 1 :, j + 1 :] -= below[:, None] * row
            step[j + 1 :] -= below * step[j]
    for j in reversed(range(count)):
        own = step[j]
        own *= pivots[j]
        if j:
            step[:j] -= system[:j, j] * own
    return step


class _Working:
    """The rows at work. Everything is kept with the row as its last axis, so that one operation
    works on a run of numbers of all rows. Rows that end give their places to waiting ones."""

    def __init__(
        self,
        rows: IndexArray,
        start: FloatArray,
        low: FloatArray,
        high: FloatArray,
        fixed: BoolArray,
        damping: float,
    ) -> None:
        count, size = start.shape
        self.rows = rows
        self.low, self.high, self.fixed = low.copy(), high.copy(), fixed.copy()
        self.theta = start.copy()
        self.trial = start.copy()
        self.cost = np.full(size, np.inf)
        self.normal = np.zeros((count, count, size))
        self.gradient = np.zeros((count, size))
        # The first evaluation counts as a gain, and eases the damping.
        self.damping = np.full(size, damping / _FASTEST_EASING)
        self.growth = np.full(size, 2.0)
        self.predicted = np.ones(size)
        self.spent = np.zeros(size, dtype=np.int64)

    def replace(self, places: IndexArray, other: _Working) -> None:
        for name, value in vars(self).items():
            value[..., places] = getattr(other, name)

    def remove(self, places: IndexArray) -> None:
        kept = np.ones(self.rows.size, dtype=np.bool_)
        kept[places] = False
        for name, value in vars(self).items():
            setattr(self, name, value[..., kept])


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
    low, high = np.broadcast_to(low, start.shape), np.broadcast_to(high, start.shape)
    held = np.broadcast_to(np.bool_(False) if fixed is None else fixed, start.shape)
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

    def begin(some: slice) -> _Working:
        own = np.arange(size)[some]
        return _Working(
            own, theta[some].T, low[some].T, high[some].T, held[some].T, tolerance.damping
        )

    begun = min(size, working_set)
    work = begin(slice(0, begun))
    while work.rows.size:
        if check is not None:
            check()
        with np.errstate(all="ignore"):
            status = _iterate(objective, work, rows[work.rows], tolerance)
        ended = np.flatnonzero(status >= 0)
        if ended.size:
            place = work.rows[ended]
            result.theta[place] = work.theta[:, ended].T
            result.cost[place] = work.cost[ended]
            result.normal[place] = work.normal[:, :, ended].transpose(2, 0, 1)
            result.gradient[place] = work.gradient[:, ended].T
            result.iterations[place] = work.spent[ended]
            result.status[place] = status[ended]
            waiting = min(size - begun, ended.size)
            if waiting:
                work.replace(ended[:waiting], begin(slice(begun, begun + waiting)))
                begun += waiting
            if waiting < ended.size:
                work.remove(ended[waiting:])
    at_bound = (result.theta <= low) | (result.theta >= high)
    np.logical_and(at_bound, ~held, out=result.at_bound)
    return result


def _iterate(
    objective: Objective, work: _Working, rows: IndexArray, tolerance: Tolerance
) -> NDArray[np.int64]:
    """Evaluate the trial points, accept or refuse them, and set the next ones. Returns (W,) the
    status of rows that have ended, −1 for the others."""
    cost, gradient, normal = objective.normal(work.trial, rows)
    work.spent += 1
    fall = work.cost - cost
    better = (fall > 0) & np.isfinite(cost + gradient.sum(axis=0))
    # Nielsen's rule: trust grows smoothly with the gain, and shrinks ever faster on refusals.
    gain = 2.0 * np.minimum(fall / np.maximum(work.predicted, _TINY), 1.5) - 1.0
    easing = np.maximum(1.0 - gain * gain * gain, _FASTEST_EASING)
    work.damping *= np.where(better, easing, work.growth)
    np.maximum(work.damping, 1e-15, out=work.damping)
    work.growth = np.where(better, 2.0, 2.0 * work.growth)
    np.copyto(work.theta, work.trial, where=better)
    np.copyto(work.cost, cost, where=better)
    np.copyto(work.gradient, gradient, where=better)
    np.copyto(work.normal, normal, where=better)
    small = better & (fall <= tolerance.reduction * work.cost)
    outward = (work.theta <= work.low) & (work.gradient > 0)
    outward |= (work.theta >= work.high) & (work.gradient < 0)
    free = ~(work.fixed | outward)
    cosine = work.gradient * work.gradient
    cosine /= np.maximum(_diagonal(work.normal) * work.cost, _TINY)
    cosine *= free
    settled = (cosine.max(axis=0) <= tolerance.cosine**2) | (work.cost <= _TINY)
    stuck = (work.damping > 1e12) | np.isinf(work.cost)
    status = np.where(work.spent >= tolerance.iterations, Status.ITERATIONS, _GOING)
    for ended, why in (
        (stuck, Status.STUCK),
        (small, Status.REDUCTION),
        (settled, Status.GRADIENT),
    ):
        status[ended] = why

    # Rows that have ended take part once more: sorting them out would cost as much.
    step = _steps(work.normal, work.gradient, free, work.damping)
    step = np.maximum(np.minimum(step, tolerance.step), -tolerance.step)
    step += work.theta
    np.minimum(np.maximum(step, work.low), work.high, out=work.trial)
    step = work.trial - work.theta
    curved = (work.normal * step).sum(axis=1)
    curved += 2.0 * work.gradient
    curved *= step
    work.predicted = -curved.sum(axis=0)
    return status
