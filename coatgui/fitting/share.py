"""What is done with one share of the work: readings of whole series, in order of exposure time.

Spectra on the same grid are one array problem. Every model is fitted to every spectrum, from the
richest to the simplest, so that each can also start from what a richer one found; then the model
of each reading is chosen along its series, brought to rest, and given its limits.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from coatgui.circuits import CoatingModel, catalogue
from coatgui.fitting.choice import choose_path, evidence
from coatgui.fitting.limits import correlation_along, parameter_limits
from coatgui.fitting.results import build_fit, film_capacitance
from coatgui.fitting.rules import rule
from coatgui.fitting.search import Batch, ask_neighbours, search, settle, try_from_inside
from coatgui.fitting.solver import BoolArray, FloatArray, Solution
from coatgui.fitting.starts import outline_start
from coatgui.records import Fit, Spectrum, Trial


@dataclass(frozen=True)
class Share:
    """Readings of whole series, in order of series and exposure time."""

    spectra: tuple[Spectrum, ...]
    used: tuple[BoolArray, ...]
    area_cm2: tuple[float | None, ...]
    series: tuple[str, ...]
    pinned: tuple[str, ...]
    leads_ohm: float | None
    deviation: tuple[FloatArray | None, ...]
    own_models: tuple[CoatingModel, ...]


def _groups(task: Share) -> list[tuple[list[int], Batch]]:
    """Readings that share a grid, as batches."""
    places: dict[bytes, list[int]] = {}
    for i, spectrum in enumerate(task.spectra):
        places.setdefault(spectrum.frequency_hz.tobytes(), []).append(i)
    groups = []
    for own in places.values():
        frequency_hz = task.spectra[own[0]].frequency_hz
        given = [task.deviation[i] for i in own]
        alike = np.ones(frequency_hz.size)
        groups.append(
            (
                own,
                Batch(
                    frequency_hz,
                    np.stack([task.spectra[i].impedance_ohm for i in own]),
                    np.stack([task.used[i] for i in own]),
                    np.stack([alike if d is None else d for d in given])
                    if any(d is not None for d in given)
                    else None,
                ),
            )
        )
    return groups


def _neighbours(task: Share, theta: FloatArray) -> list[FloatArray]:
    """For each reading the solutions of the reading before and after it in its series."""
    number = len(task.series)
    return [
        theta[
            [
                j
                for j in (i - 1, i + 1)
                if 0 <= j < number
                and task.series[j] == task.series[i]
                and np.isfinite(theta[j]).all()
            ]
        ]
        for i in range(number)
    ]


def _projected(
    group: int,
    model: CoatingModel,
    richer: list[CoatingModel],
    solutions: dict[str, list[Solution]],
) -> list[FloatArray] | None:
    """For each reading of a group the richer models' solutions, with what `model` lacks left away;
    None where no richer model has been fitted."""
    kept = [
        solutions[other.model_id][group].theta[:, [other.index(s) for s in model.symbols]]
        for other in richer
    ]
    return list(np.stack(kept, axis=1)) if kept else None


def fit_share(task: Share) -> list[Fit]:
    """All fits of one share."""
    models = [
        model
        for model in (*catalogue().values(), *task.own_models)
        if model.automatic or model.model_id in task.pinned
    ]
    groups = _groups(task)
    solutions, cost, capacitance = _fit_models(task, models, groups)
    points = np.array([float(mask.sum()) for mask in task.used])
    richest = max(
        range(len(models)), key=lambda k: (models[k].automatic, len(models[k].parameters))
    )
    rho = np.zeros(len(task.spectra))
    for (own, batch), found in zip(groups, solutions[models[richest].model_id], strict=True):
        residual = batch.objective(models[richest]).residuals(found.theta, np.arange(len(own)))
        rho[own] = correlation_along(residual, batch.used)
    aicc = np.column_stack(
        [evidence(cost[:, k], points, rho, len(m.parameters)) for k, m in enumerate(models)]
    )
    area = np.array([a or rule("assumed_area_cm2") for a in task.area_cm2])
    chosen = _choose(task, models, aicc, capacitance / area[:, None])
    trials = [
        _trials(models, cost[i], points[i], aicc[i], chosen[i]) for i in range(len(task.spectra))
    ]
    fits: list[Fit | None] = [None] * len(task.spectra)
    for group, (own, batch) in enumerate(groups):
        for k, model in enumerate(models):
            place = [row for row, i in enumerate(own) if chosen[i] == k]
            if not place:
                continue
            part = batch.rows(place)
            settled = settle(model, part, solutions[model.model_id][group].theta[place])
            settled = try_from_inside(model, part, settled)
            limits = parameter_limits(model, part, settled)
            for row, where in enumerate(place):
                i = own[where]
                shown = _as_seen(model, capacitance[i, k] / area[i], task.pinned[i])
                fits[i] = build_fit(shown, part, row, settled, limits, trials[i], task.leads_ohm)
    return [fit for fit in fits if fit is not None]


def _fit_models(
    task: Share, models: list[CoatingModel], groups: list[tuple[list[int], Batch]]
) -> tuple[dict[str, list[Solution]], FloatArray, FloatArray]:
    """Solutions of every model, group by group; their sums of squares and rough capacitances of
    the outermost layer, both (B, M)."""
    number = len(task.spectra)
    solutions: dict[str, list[Solution]] = {}
    cost = np.full((number, len(models)), np.inf)
    capacitance = np.full((number, len(models)), np.nan)
    for k in sorted(range(len(models)), key=lambda k: -len(models[k].parameters)):
        model = models[k]
        richer = [
            other
            for other in models
            if other.model_id in solutions and set(model.symbols) < set(other.symbols)
        ]
        first = [
            search(model, batch, offers=_projected(group, model, richer, solutions))
            for group, (_, batch) in enumerate(groups)
        ]
        theta = np.full((number, len(model.parameters)), np.nan)
        found_cost = np.full(number, np.inf)
        for (own, _), found in zip(groups, first, strict=True):
            theta[own], found_cost[own] = found.theta, found.cost
        offers = _neighbours(task, theta)
        if not solutions:
            _add_outlined(offers, found_cost, task, model)
        solutions[model.model_id] = [
            ask_neighbours(model, batch, found, [offers[i] for i in own])
            for (own, batch), found in zip(groups, first, strict=True)
        ]
        for (own, _), found in zip(groups, solutions[model.model_id], strict=True):
            cost[own, k] = found.cost
            capacitance[own, k] = film_capacitance(model, found.theta)
    return solutions, cost, capacitance


def _add_outlined(
    offers: list[FloatArray], cost: FloatArray, task: Share, model: CoatingModel
) -> None:
    """Where even the richest model misses the points, offer it a start from the spectrum's
    relaxation outline: slow to make, and independent of where arcs were supposed to meet."""
    poor = rule("residual_worth_an_outline") ** 2
    for i, spectrum in enumerate(task.spectra):
        if cost[i] > poor * 2.0 * task.used[i].sum():
            start = outline_start(
                model, spectrum.frequency_hz, spectrum.impedance_ohm, task.used[i]
            )
            if start is not None:
                offers[i] = np.concatenate([offers[i], start[None, :]])


def _choose(
    task: Share, models: list[CoatingModel], aicc: FloatArray, per_area: FloatArray
) -> list[int]:
    """The model of every reading, series by series."""
    price = rule("aicc_price_per_parameter")
    interface_from = rule("interface_capacitance_from_f_per_cm2")
    scores = aicc.copy()
    for k, model in enumerate(models):
        scores[:, k] += price * len(model.parameters)
        if not model.automatic:
            scores[:, k] = np.inf
        elif model.layers[0].role == "interface":
            # An interface in front of everything must have an interface's capacitance.
            scores[per_area[:, k] < interface_from, k] = np.inf
    index = {model.model_id: k for k, model in enumerate(models)}
    chosen: list[int] = []
    start = 0
    for i in range(1, len(task.series) + 1):
        if i == len(task.series) or task.series[i] != task.series[start]:
            given = [index[name] if name else None for name in task.pinned[start:i]]
            chosen += choose_path(scores[start:i], given)
            start = i
    return chosen


def _as_seen(model: CoatingModel, per_area: float, pinned: str) -> CoatingModel:
    """The same circuit named for what it is: a film, or where even the outermost capacitance is a
    metal's, the twin that claims none."""
    if pinned or per_area < rule("interface_capacitance_from_f_per_cm2"):
        return model
    for twin in catalogue().values():
        if twin.twin == model.model_id and twin.layers[0].role in ("interface", "porous_layer"):
            return twin
    return model


def _trials(
    models: list[CoatingModel], cost: FloatArray, points: float, aicc: FloatArray, chosen: int
) -> tuple[Trial, ...]:
    """What was tried on one reading, and why this model."""
    trials = []
    for k, model in enumerate(models):
        behind = aicc[k] - aicc[chosen]
        if k == chosen:
            remark = "taken"
        elif not np.isfinite(aicc[k]):
            remark = "too many parameters for the points there are"
        elif behind > 0:
            remark = f"explains the data less well (AICc {behind:.1f} higher)"
        else:
            remark = f"its gain (AICc {-behind:.1f} lower) does not pay for what it adds"
        residual = 100.0 * float(np.sqrt(cost[k] / (2.0 * points)))
        trials.append(
            Trial(
                model.model_id,
                len(model.parameters),
                residual if np.isfinite(residual) else None,
                float(aicc[k]) if np.isfinite(aicc[k]) else None,
                remark,
            )
        )
    return tuple(trials)
