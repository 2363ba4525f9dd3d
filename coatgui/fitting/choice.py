"""Which coating model the data support, along an exposure series.

Mathematics. Each model's evidence on each spectrum is AICc with the number of independent residuals
N_eff = 2N (1 − ρ)/(1 + ρ), ρ the lag-one correlation of the richest model's residuals: residuals
that follow one another would otherwise buy elements that describe nothing but each other. Every
parameter costs a little more than AICc asks, and changing the model between two inspections has a
price of its own, so that the choice does not go back and forth within the scatter. The catalogue
stands in the order in which films give way, and a film goes on more readily than it heals: going
back costs more, and no stage is skipped only to save the price of a change. The cheapest path
through the series is found by dynamic programming (Viterbi). Prices stand in
`resources/fitting.toml`.
"""

from __future__ import annotations

import numpy as np

from coatgui.fitting.rules import rule
from coatgui.fitting.solver import FloatArray


def evidence(
    cost: FloatArray, points: FloatArray, correlation: FloatArray, parameters: int
) -> FloatArray:
    """AICc (B,) of a model with `parameters` parameters and sums of squares `cost` (B,) over
    `points` (B,) complex points. Infinite where there are too few points for the model."""
    number = 2.0 * points
    floor = rule("smallest_believable_residual") ** 2
    independent = number * (1.0 - correlation) / (1.0 + correlation)
    per_point = np.maximum(cost / np.maximum(number, 1.0), floor)
    spare = number - parameters - 1.0
    with np.errstate(divide="ignore"):
        price = 2.0 * parameters + 2.0 * parameters * (parameters + 1.0) / spare
    score = independent * np.log(per_point) + price
    return np.where((spare > 0) & np.isfinite(cost), score, np.inf)


def choose_path(scores: FloatArray, pinned: list[int | None]) -> list[int]:
    """The model of each reading of one series: `scores` (T, M) are prices in the order of exposure
    time; a pinned reading has its model given. Ties go to the earlier model of the catalogue."""
    times, models = scores.shape
    earlier, later = np.indices((models, models))
    change = np.where(
        later > earlier,
        rule("aicc_price_of_going_on"),
        np.where(later < earlier, rule("aicc_price_of_going_back"), 0.0),
    )
    total = np.empty((times, models))
    came_from = np.zeros((times, models), dtype=np.intp)
    for t in range(times):
        own = scores[t].copy()
        given = pinned[t]
        if given is not None:
            own[:] = np.inf
            own[given] = 0.0
        elif not np.isfinite(own).any():
            own[:] = 0.0
        if t == 0:
            total[t] = own
            continue
        # A person's pin is no evidence about its neighbours: leaving it costs nothing.
        free = pinned[t - 1] is not None or given is not None
        routes = total[t - 1][:, None] + change * (not free)
        cheapest = routes.min(axis=0)
        stays = np.diagonal(routes) <= cheapest
        came_from[t] = np.where(stays, np.arange(models), np.argmin(routes, axis=0))
        total[t] = cheapest + own
    path = [int(np.argmin(total[-1]))]
    for t in range(times - 1, 0, -1):
        path.append(int(came_from[t, path[-1]]))
    return path[::-1]
