"""Fit one model to many spectra: several starts, the best kept, neighbours asked once more."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass

import numpy as np

from coatgui.circuits import CoatingModel
from coatgui.circuits.elements import ComplexArray
from coatgui.fitting.objective import ImpedanceObjective
from coatgui.fitting.solver import (
    BoolArray,
    FloatArray,
    IndexArray,
    Solution,
    Tolerance,
    minimise,
)
from coatgui.fitting.starts import approach_bounds, best_starts, candidates

_STARTS = 4
_ENOUGH_POINTS = 12
_FAR_WORSE = 30.0  # in sum of squares
_FAR_OFF = 100.0  # likewise, of a start that comes from another fit
_OFFERS = 2
_WELL_INSIDE = 5.0  # in natural coordinates
_SAME_PLACE = 0.2  # in natural coordinates
_SAME_COST = 1.005
APPROACH = Tolerance(cosine=1e-2, reduction=1e-3, step=2.0, iterations=16)
# Near enough to compare models: the cost is then known to a few parts in 100,000.
_COMPARE = Tolerance(cosine=1e-4, reduction=1e-5, iterations=40, damping=1e-2)
_SETTLE = Tolerance(damping=1e-3)


@dataclass(frozen=True)
class Batch:
    """Spectra that share a grid. `frequency_hz` (N,), `impedance` (B, N), `used` (B, N);
    `deviation` (B, N) the relative standard deviation of each point up to a factor, or None where
    all points of a spectrum scatter alike."""

    frequency_hz: FloatArray
    impedance: ComplexArray
    used: BoolArray
    deviation: FloatArray | None = None

    def rows(self, places: Sequence[int]) -> Batch:
        """Some of the spectra."""
        chosen = list(places)
        deviation = None if self.deviation is None else self.deviation[chosen]
        return Batch(self.frequency_hz, self.impedance[chosen], self.used[chosen], deviation)

    def thinned(self) -> Batch:
        """Every third point, where there are enough: what the way from afar needs."""
        if self.frequency_hz.size < 3 * _ENOUGH_POINTS:
            return self
        kept = slice(None, None, 3)
        deviation = None if self.deviation is None else self.deviation[:, kept]
        return Batch(
            self.frequency_hz[kept], self.impedance[:, kept], self.used[:, kept], deviation
        )

    def objective(self, model: CoatingModel, *, logarithmic: bool = False) -> ImpedanceObjective:
        return ImpedanceObjective(
            model,
            self.frequency_hz,
            self.impedance,
            self.used,
            deviation=None if self.deviation is None else self.deviation * np.abs(self.impedance),
            logarithmic=logarithmic,
        )


def _best_of(solution: Solution, rows: IndexArray, size: int) -> Solution:
    """Of several solutions per row, the one of least cost."""
    order = np.lexsort((solution.cost, rows))
    _, first = np.unique(rows[order], return_index=True)
    chosen = order[first]
    assert chosen.size == size
    spent = np.bincount(rows, weights=solution.iterations, minlength=size).astype(np.int64)
    return Solution(
        solution.theta[chosen],
        solution.cost[chosen],
        solution.normal[chosen],
        solution.gradient[chosen],
        spent,
        solution.status[chosen],
        solution.at_bound[chosen],
    )


def better_of(first: Solution, second: Solution) -> Solution:
    """Row by row the solution of smaller cost."""
    take = second.cost < first.cost

    def pick(one: FloatArray, other: FloatArray) -> FloatArray:
        return np.where(take.reshape((-1,) + (1,) * (one.ndim - 1)), other, one)

    return Solution(
        pick(first.theta, second.theta),
        pick(first.cost, second.cost),
        pick(first.normal, second.normal),
        pick(first.gradient, second.gradient),
        first.iterations + second.iterations,
        np.where(take, second.status, first.status),
        np.where(take[:, None], second.at_bound, first.at_bound),
    )


def _best_few(cost: FloatArray, rows: IndexArray, count: int) -> IndexArray:
    """Places (K,) of the `count` least costs of each of `rows` (S,)."""
    order = np.lexsort((cost, rows))
    begins = np.searchsorted(rows[order], rows[order])
    few: IndexArray = order[np.arange(order.size) - begins < count]
    return few


def _worth_going_on(theta: FloatArray, cost: FloatArray, rows: IndexArray) -> BoolArray:
    """Of the places (S, P) near an optimum of each of `rows`, which to follow to the end: those not
    far worse than the best, and of several that arrived at one place only the best."""
    order = np.lexsort((cost, rows))
    best = np.full(int(rows.max()) + 1, np.inf)
    np.minimum.at(best, rows, cost)
    going = cost <= _FAR_WORSE * best[rows]
    followed: dict[int, list[int]] = {}
    for i in order:
        if not going[i]:
            continue
        kept = followed.setdefault(int(rows[i]), [])
        place = np.abs(theta[kept] - theta[i]).max(axis=1) < _SAME_PLACE
        # Starts of a model that is too rich end all along one flat valley, at one cost.
        if (place | (cost[i] <= _SAME_COST * cost[kept])).any():
            going[i] = False
        else:
            kept.append(int(i))
    return going


def approach(
    model: CoatingModel,
    batch: Batch,
    starts: FloatArray,
    rows: IndexArray,
    check: Callable[[], None] | None = None,
) -> Solution:
    """From afar to near, on every third point and by the logarithmic residual: `starts` (K, P) for
    spectra `rows` (K,). A start that led nowhere comes back as it was, with an infinite cost."""
    rough = batch.thinned()
    low, high = approach_bounds(model, batch.impedance, batch.used)
    near = minimise(
        rough.objective(model, logarithmic=True),
        starts,
        low[rows],
        high[rows],
        tolerance=APPROACH,
        rows=rows,
        check=check,
    )
    lost = ~np.isfinite(near.cost)
    near.theta[lost] = starts[lost]
    near.cost[lost] = np.inf
    return near


def finish(
    model: CoatingModel,
    batch: Batch,
    near: FloatArray,
    rows: IndexArray,
    check: Callable[[], None] | None = None,
) -> Solution:
    """From `near` (K, P) to the optimum, well enough to compare models."""
    low, high = model.bounds
    return minimise(
        batch.objective(model), near, low, high, tolerance=_COMPARE, rows=rows, check=check
    )


def search(
    model: CoatingModel,
    batch: Batch,
    check: Callable[[], None] | None = None,
    *,
    offers: Sequence[FloatArray] | None = None,
) -> Solution:
    """The best fit of `model` to each spectrum of the batch, from the spectrum's own starts
    and from its `offers` (K, P) that may lie near an optimum already."""
    offered = candidates(model, batch.frequency_hz, batch.impedance, batch.used)
    starts, rows = best_starts(batch.thinned().objective(model), offered, _STARTS)
    near = approach(model, batch, starts, rows, check)
    theta, cost = near.theta, near.cost
    if offers is not None and any(map(len, offers)):
        further = np.clip(np.concatenate(offers), *model.bounds)
        place = np.repeat(np.arange(len(offers)), [len(offer) for offer in offers])
        rough = batch.thinned().objective(model, logarithmic=True)
        theta = np.concatenate([theta, further])
        cost = np.concatenate([cost, rough.cost(further, place)])
        rows = np.concatenate([rows, place])
    going = _worth_going_on(theta, cost, rows)
    found = finish(model, batch, theta[going], rows[going], check)
    return _best_of(found, rows[going], batch.impedance.shape[0])


def settle(
    model: CoatingModel,
    batch: Batch,
    theta: FloatArray,
    check: Callable[[], None] | None = None,
) -> Solution:
    """The fits `theta` (B, P), known well enough to compare models, brought to rest."""
    low, high = model.bounds
    return minimise(batch.objective(model), theta, low, high, tolerance=_SETTLE, check=check)


def try_from_inside(
    model: CoatingModel,
    batch: Batch,
    found: Solution,
    check: Callable[[], None] | None = None,
) -> Solution:
    """Start rows that stopped at an end of their search once more from well inside it, and bring to
    rest what is better: a step may have thrown them there, and the way back is easily missed."""
    rows = np.flatnonzero(found.at_bound.any(axis=1))
    if not rows.size:
        return found
    low, high = model.bounds
    inside = np.minimum(_WELL_INSIDE, 0.25 * (high - low))
    offers: list[FloatArray | None] = [None] * found.cost.size
    for row in rows:
        moved = np.clip(found.theta[row], low + inside, high - inside)
        offers[row] = np.where(found.at_bound[row], moved, found.theta[row])[None, :]
    again = ask_neighbours(model, batch, found, offers, check, follow_all=True)
    if not (again.cost < found.cost).any():
        return found
    return better_of(found, settle(model, batch, again.theta, check))


def ask_neighbours(
    model: CoatingModel,
    batch: Batch,
    found: Solution,
    neighbours: Sequence[FloatArray | None],
    check: Callable[[], None] | None = None,
    *,
    follow_all: bool = False,
) -> Solution:
    """Start once more from other solutions of the same model, (K, P) for each row or None, and keep
    what is better. Of those that start out not far worse than what was found, the best two of each
    row are followed, or all."""
    size = found.cost.size
    counts = [0 if offer is None else len(offer) for offer in neighbours]
    if not any(counts):
        return found
    low, high = model.bounds
    objective = batch.objective(model)
    offers = np.concatenate([offer for offer in neighbours if offer is not None and len(offer)])
    place = np.repeat(np.arange(size), counts)
    if not follow_all:
        begins = objective.cost(np.clip(offers, low, high), place)
        chosen = _best_few(begins, place, _OFFERS)
        chosen = chosen[begins[chosen] < _FAR_OFF * found.cost[place[chosen]]]
        offers, place = offers[chosen], place[chosen]
    if not place.size:
        return found
    again = minimise(objective, offers, low, high, tolerance=_COMPARE, rows=place, check=check)
    rows = np.unique(place)
    best = _best_of(again, np.searchsorted(rows, place), rows.size)
    full = Solution(
        found.theta.copy(),
        np.full_like(found.cost, np.inf),
        found.normal.copy(),
        found.gradient.copy(),
        np.zeros_like(found.iterations),
        found.status.copy(),
        found.at_bound.copy(),
    )
    full.theta[rows], full.cost[rows], full.normal[rows] = best.theta, best.cost, best.normal
    full.gradient[rows], full.iterations[rows] = best.gradient, best.iterations
    full.status[rows], full.at_bound[rows] = best.status, best.at_bound
    return better_of(found, full)
