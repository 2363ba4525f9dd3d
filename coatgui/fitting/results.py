"""From natural coordinates to the records that everyone reads."""

from __future__ import annotations

import numpy as np

from coatgui.circuits import CoatingModel, Kind
from coatgui.circuits.layers import ParameterSpec
from coatgui.fitting.limits import Limits
from coatgui.fitting.rules import rule
from coatgui.fitting.search import Batch
from coatgui.fitting.solver import MESSAGES, FloatArray, Solution, Status
from coatgui.records import Bound, Fit, Parameter, Quantity, Trial


def film_capacitance(model: CoatingModel, theta: FloatArray) -> FloatArray:
    """Rough capacitance (B,) in F of the outermost layer, to tell a film from bare metal: C, or Q
    read at the frequency where the layer's resistance or 1 kHz sets it."""
    capacitance = np.full(theta.shape[0], np.nan)
    for place, spec in enumerate(model.parameters):
        if spec.layer != 1:
            continue
        if spec.kind is Kind.CAPACITANCE:
            return np.exp(theta[:, place])
        if spec.kind is Kind.CONSTANT_PHASE:
            n = theta[:, place + 1]
            capacitance = np.exp(theta[:, place] + (n - 1.0) * np.log(2.0 * np.pi * 1e3))
    return capacitance


def _physical(spec: ParameterSpec, value: float) -> float:
    return float(value if spec.kind is Kind.EXPONENT else np.exp(value))


def _quantity(spec: ParameterSpec, theta: float, low: float, high: float, method: str) -> Quantity:
    unit = spec.kind.unit
    has_low, has_high = bool(np.isfinite(low)), bool(np.isfinite(high))
    bottom = _physical(spec, low) if has_low else None
    top = _physical(spec, high) if has_high else None
    if has_low and has_high:
        return Quantity(_physical(spec, theta), bottom, top, Bound.TWO_SIDED, unit, method)
    if has_low:
        return Quantity(bottom, bottom, None, Bound.AT_LEAST, unit, method)
    if has_high:
        return Quantity(top, None, top, Bound.AT_MOST, unit, method)
    return Quantity(None, None, None, Bound.UNDETERMINED, unit, method)


def build_fit(
    model: CoatingModel,
    batch: Batch,
    row: int,
    fits: Solution,
    limits: Limits,
    trials: tuple[Trial, ...],
    leads_ohm: float | None,
) -> Fit:
    """The record of one fit: `row` of `batch`, of `fits` and of `limits`."""
    theta, cost, status = fits.theta[row], float(fits.cost[row]), int(fits.status[row])
    low, high = limits.low[row], limits.high[row].copy()
    parameters = []
    for place, spec in enumerate(model.parameters):
        method = "95 % limits of the fit"
        leaky = leads_ohm is not None and spec.kind is Kind.RESISTANCE and spec.layer > 0
        if leaky and leads_ohm is not None:
            share = float(np.exp(theta[place])) / leads_ohm
            if share * rule("leads_factor") > 1.0:
                high[place] = np.inf
                method = "the open lead's own resistance is near: the leads, not the film, set this"
            elif np.isfinite(high[place]):
                # The leads lie in parallel: without them the film's resistance would be this much
                # higher at the most.
                high[place] -= np.log1p(-share)
        parameters.append(
            Parameter(
                spec.symbol,
                spec.meaning,
                spec.layer,
                _quantity(spec, float(theta[place]), low[place], high[place], method),
            )
        )
    used = batch.used[row]
    # ∂ln p/∂θ is 1 where θ = ln p and 1/p where θ = p.
    slope = np.array(
        [
            1.0 / theta[i] if spec.kind is Kind.EXPONENT else 1.0
            for i, spec in enumerate(model.parameters)
        ]
    )
    covariance = limits.covariance[row] * slope[:, None] * slope[None, :]
    return Fit(
        model=model.model_id,
        model_name=model.name,
        parameters=tuple(parameters),
        modelled_ohm=model.impedance(theta[None, :], batch.frequency_hz)[0].copy(),
        used=used.copy(),
        residual_rms_percent=100.0 * float(np.sqrt(cost / (2.0 * used.sum()))),
        converged=status != Status.ITERATIONS,
        message=MESSAGES[Status(status)],
        trials=trials,
        log_covariance=covariance,
    )
