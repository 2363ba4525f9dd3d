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
    theta = model.whole(theta)
    for place, spec in enumerate(model.all_parameters):
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
    theta, status = fits.theta[row], int(fits.status[row])
    low, high = limits.low[row], limits.high[row].copy()
    whole = model.whole(theta[None, :])[0]
    parameters = []
    for place, (spec, source) in enumerate(zip(model.all_parameters, model.source, strict=True)):
        if source < 0:
            value = _physical(spec, float(whole[place]))
            held = Quantity(value, None, None, Bound.FIXED, spec.kind.unit, "held by a person")
            parameters.append(Parameter(spec.symbol, spec.meaning, spec.layer, held))
            continue
        method = "95 % limits of the fit"
        leaky = leads_ohm is not None and spec.kind is Kind.RESISTANCE and spec.layer > 0
        if leaky and leads_ohm is not None:
            share = float(np.exp(theta[source])) / leads_ohm
            if share * rule("leads_factor") > 1.0:
                high[source] = np.inf
                method = "the open lead's own resistance is near: the leads, not the film, set this"
            elif np.isfinite(high[source]):
                # The leads lie in parallel: without them the film's resistance would be this much
                # higher at the most.
                high[source] -= np.log1p(-share)
        parameters.append(
            Parameter(
                spec.symbol,
                spec.meaning,
                spec.layer,
                _quantity(spec, float(theta[source]), low[source], high[source], method),
            )
        )
    used = batch.used[row]
    # ∂ln p/∂θ is 1 where θ = ln p and 1/p where θ = p.
    slope = np.array(
        [
            1.0 / whole[i] if spec.kind is Kind.EXPONENT else 1.0
            for i, spec in enumerate(model.all_parameters)
        ]
    )
    selection = model.selection * slope[:, None]
    covariance = selection @ limits.covariance[row] @ selection.T
    modelled = model.impedance(theta[None, :], batch.frequency_hz)[0].copy()
    relative = (modelled / batch.impedance[row] - 1.0)[used]
    ends = [
        spec.symbol for spec, end in zip(model.parameters, fits.at_bound[row], strict=True) if end
    ]
    message = MESSAGES[Status(status)]
    if ends:
        message += f"; {', '.join(ends)} ran to the end of the search"
    return Fit(
        model=model.model_id,
        model_name=model.name,
        parameters=tuple(parameters),
        modelled_ohm=modelled,
        used=used.copy(),
        residual_rms_percent=100.0 * float(np.sqrt(np.mean(np.abs(relative) ** 2) / 2.0)),
        converged=status != Status.ITERATIONS,
        message=message,
        trials=trials,
        log_covariance=covariance,
        optimum=np.array(
            [
                _physical(spec, float(value))
                for spec, value in zip(model.all_parameters, whole, strict=True)
            ]
        ),
    )
