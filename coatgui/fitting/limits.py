"""95 % limits of fitted parameters, and the kind of bound the data hold.

Mathematics. With ν = 2N − p degrees of freedom and s² = S/ν, the covariance is s² (JᵀJ)⁻¹ over the
free parameters, and limits are θ ± t s.e. with Student's t. Where such a limit is wide (beyond
±50 %), the parameter sits at an end of its search, or it is tied closely to another, the sum of
squares is not a parabola there and the limits come from the profile: θ_j is held, all else is
fitted again, and the limit is where S = S_min (1 + t²/ν). With w = √((S − S_min)/(S_min t²/ν)) that
is w = 1, and w is nearly linear in θ_j, so a few secant steps find it. A side on which w never
reaches 1 before the end of the search has no limit: the result is "at least", "at most" or cannot
be determined. Residuals that follow one another carry less than they seem to; then t² is raised by
(1 + ρ)/(1 − ρ), ρ the lag-one correlation along the sweep.

Sources: Bates & Watts, Nonlinear Regression Analysis (profile likelihood), from memory, to be
checked; the correction for ρ is the usual first-order one.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from coatgui.circuits import CoatingModel
from coatgui.circuits.elements import ComplexArray
from coatgui.fitting.search import Batch
from coatgui.fitting.solver import (
    BoolArray,
    FloatArray,
    IndexArray,
    Solution,
    Tolerance,
    minimise,
)

_WIDE = 0.405  # ln 1.5
_TIED = 0.95
_ROUNDS = 9
_FARTHEST = 14.0  # in natural units: a factor of a million is no limit any more
_NEAR_ENOUGH = 0.03
_REFIT = Tolerance(cosine=1e-3, reduction=1e-5, iterations=30, damping=1e-3)


@dataclass(frozen=True)
class Limits:
    """`low`, `high` (B, P) in natural coordinates, infinite where the data hold none; `covariance`
    (B, P, P) of natural coordinates, zero rows for parameters at an end of the search."""

    low: FloatArray
    high: FloatArray
    covariance: FloatArray


def correlation_along(residual: ComplexArray, used: BoolArray) -> FloatArray:
    """Lag-one correlation (B,) of the residuals along the sweep, between 0 and 0.9. What scatter
    alone gives (two standard deviations of it) counts as none."""
    both = used[:, 1:] & used[:, :-1]
    product = (residual[:, 1:] * residual[:, :-1].conj()).real * both
    power = (np.abs(residual) ** 2 * used).sum(axis=1)
    pairs = np.maximum(both.sum(axis=1), 1)
    points = np.maximum(used.sum(axis=1), 1)
    rho = (product.sum(axis=1) / pairs) / np.maximum(power / points, 1e-300)
    return np.where(rho > 2.0 / np.sqrt(2.0 * pairs), np.clip(rho, 0.0, 0.9), 0.0)


def student_t(freedom: FloatArray) -> FloatArray:
    """Two-sided 95 % point of Student's t."""
    from scipy.special import stdtrit

    return np.asarray(stdtrit(freedom, 0.975), dtype=np.float64)


def _covariance(normal: FloatArray, held: BoolArray, variance: FloatArray) -> FloatArray:
    count = held.shape[1]
    free = ~held
    system = normal * (free[:, :, None] & free[:, None, :])
    diagonal = np.einsum("bii->bi", system)
    scale = np.where(free & (diagonal > 0), np.sqrt(np.maximum(diagonal, 1e-300)), 1.0)
    scaled = system / (scale[:, :, None] * scale[:, None, :])
    # Held and ineffective parameters get a one; a breath on the diagonal keeps exact ties solvable.
    scaled[:, np.arange(count), np.arange(count)] = 1.0 + 1e-13
    inverse = np.linalg.pinv(scaled, rcond=1e-14, hermitian=True)
    covariance: FloatArray = inverse / (scale[:, :, None] * scale[:, None, :])
    covariance *= variance[:, None, None] * (free[:, :, None] & free[:, None, :])
    return covariance


def parameter_limits(
    model: CoatingModel,
    batch: Batch,
    fits: Solution,
    check: Callable[[], None] | None = None,
) -> Limits:
    """Limits of the `fits` of `model` to the spectra of `batch`, row by row."""
    theta, cost, at_bound = fits.theta, fits.cost, fits.at_bound
    size, count = theta.shape
    rows = np.arange(size)
    objective = batch.objective(model)
    freedom = np.maximum(2.0 * batch.used.sum(axis=1) - count, 1.0)
    rho = correlation_along(objective.residuals(theta, rows), batch.used)
    reach = student_t(freedom) * np.sqrt((1.0 + rho) / (1.0 - rho))
    variance = np.maximum(cost, 1e-300) / freedom
    covariance = _covariance(fits.normal, at_bound, variance * (1.0 + rho) / (1.0 - rho))
    error = np.sqrt(np.maximum(np.einsum("bii->bi", covariance), 0.0))
    half = student_t(freedom)[:, None] * error
    with np.errstate(divide="ignore", invalid="ignore"):
        correlation = covariance / (error[:, :, None] * error[:, None, :])
    correlation[:, np.arange(count), np.arange(count)] = 0.0
    tied = np.nan_to_num(np.abs(correlation)).max(axis=2) > _TIED
    doubtful = at_bound | (half > _WIDE) | (tied & (half > 0.25 * _WIDE)) | ~np.isfinite(half)
    # A parameter near the end of its search cannot have a limit beyond it.
    lowest, highest = model.bounds
    doubtful |= (theta - half < lowest) | (theta + half > highest)
    low, high = theta - half, theta + half
    row, place = np.nonzero(doubtful)
    if row.size:
        both = np.tile(row, 2), np.tile(place, 2), np.repeat([-1.0, 1.0], row.size)
        ends = _profile(model, batch, theta, cost, half, *both, reach, freedom, check)
        low[row, place], high[row, place] = np.split(ends, 2)
    return Limits(low, high, covariance)


def _profile(
    model: CoatingModel,
    batch: Batch,
    theta: FloatArray,
    cost: FloatArray,
    half: FloatArray,
    row: IndexArray,
    place: IndexArray,
    side: FloatArray,
    reach: FloatArray,
    freedom: FloatArray,
    check: Callable[[], None] | None,
) -> FloatArray:
    """The limit of each (row, place) on its `side`, −1 or 1; ±inf where there is none."""
    lowest, highest = model.bounds
    start = theta[row, place]
    end = np.where(side < 0, lowest[place], highest[place])
    farthest = np.minimum(np.abs(end - start), _FARTHEST)
    rise = np.maximum(cost[row], 1e-300) * reach[row] ** 2 / freedom[row]
    objective = batch.objective(model)
    number = row.size
    # A parameter at an end of its search has no width of its own to start from.
    width = half[row, place]
    width = np.where(np.isfinite(width) & (width > 0), np.clip(width, 1e-4, 1.0), 1.0)
    distance = np.minimum(width, farthest)
    below = np.zeros(number)
    below_w = np.zeros(number)
    above = np.full(number, np.inf)
    above_w = np.full(number, np.inf)
    limit = np.full(number, side * np.inf)
    guess = theta[row].copy()
    going = farthest > 0
    for _ in range(_ROUNDS):
        index = np.nonzero(going)[0]
        if not index.size:
            break
        fixed = np.zeros((index.size, theta.shape[1]), dtype=np.bool_)
        fixed[np.arange(index.size), place[index]] = True
        trial = guess[index]
        trial[np.arange(index.size), place[index]] = start[index] + side[index] * distance[index]
        found = minimise(
            objective, trial, lowest, highest,
            fixed=fixed, tolerance=_REFIT, rows=row[index], check=check,
        )  # fmt: skip
        w = np.sqrt(np.maximum(found.cost - cost[row[index]], 0.0) / rise[index])
        limit[index] = start[index] + side[index] * distance[index]
        short = w < 1.0
        guess[index[short]] = found.theta[short]
        below[index[short]], below_w[index[short]] = distance[index[short]], w[short]
        above[index[~short]], above_w[index[~short]] = distance[index[~short]], w[~short]
        arrived = np.abs(w - 1.0) < _NEAR_ENOUGH
        lost = short & (distance[index] >= farthest[index] * (1.0 - 1e-12)) & ~arrived
        limit[index[lost]] = side[index[lost]] * np.inf
        going[index[arrived | lost]] = False
        left = index[~(arrived | lost)]
        bracketed = np.isfinite(above[left])
        with np.errstate(divide="ignore", invalid="ignore"):
            secant = below[left] + (1.0 - below_w[left]) * (above[left] - below[left]) / (
                np.minimum(above_w[left], 50.0) - below_w[left]
            )
            stretch = distance[left] * np.clip(1.02 / np.maximum(below_w[left], 0.1), 1.05, 4.0)
        middle = 0.5 * (below[left] + np.where(bracketed, above[left], below[left]))
        secant = np.where(np.isfinite(secant), 0.8 * secant + 0.2 * middle, middle)
        distance[left] = np.minimum(np.where(bracketed, secant, stretch), farthest[left])
    # Still short after all rounds: the side is open for all the data can say.
    open_side = going & ~np.isfinite(above)
    limit[open_side] = side[open_side] * np.inf
    return limit
