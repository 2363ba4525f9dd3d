"""Capacitances of film and interface from a fit.

A constant-phase element Q (jω)^n is not a capacitor; which capacitance it stands for depends on the
case, so the law is always named (formulas from memory of the papers, checked by their limit C = Q
for n → 1):

* film, at the settings' high frequency ω (10 kHz), where its capacitance carries the current
  whether it blocks or has pores:  C = Im(Q (jω)^n)/ω = Q sin(nπ/2) ω^{n−1}
* film whose parallel resistance R turns over inside the window (Hsu and Mansfeld, Corrosion 57
  (2001) 747):                     C = Q^{1/n} R^{(1−n)/n}
* interface with the ohmic resistance R_e in front of it (Brug et al., J. Electroanal. Chem. 176
  (1984) 275):                     C = Q^{1/n} (1/R_e + 1/R_ct)^{(n−1)/n}

Below n = 0.7 nothing is converted.

The two film laws read the element at different frequencies: 10 kHz, and the turning frequency
1/(2πRC), which wanders as the pores open. At n = 0.975 and a turning at 0.2 Hz they differ by a
third, and on a film that keeps its water Hsu and Mansfeld's falls week by week with R. So *the*
coating capacitance, its course, drying and water uptake all rest on the first law, in every reading
alike; where the second one's case is given, its value stands beside it among the parameters (C_c).

The open leads lie in parallel with the film; their capacitance is taken away from the film's.

Limits: the gradient of ln C on the logarithms of the parameters, with the fit's covariance. Without
one, the absolute contributions are added, as if all errors conspired; but where the high frequency
lies inside the used points, the curve runs through them and cannot miss by more than their scatter.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from functools import lru_cache

import numpy as np

from coatgui.assessment.amounts import from_logarithm, log_deviation, per_area
from coatgui.assessment.modulus import relative_scatter, used_points
from coatgui.assessment.rules import rule
from coatgui.quality import leads_admittance
from coatgui.records import (
    Bound,
    Finding,
    Fit,
    Parameter,
    Quantity,
    Severity,
    Spectrum,
)

# Symbols of Q, n and the resistance in parallel, for every layer that can belong to a film.
_FILM_LAYERS = (("Q_c", "n_c", "R_po"), ("Q_1", "n_1", "R_1"), ("Q_2", "n_2", "R_2"))
_INTERFACE = ("Q_dl", "n_dl")


@dataclass(frozen=True, slots=True)
class _Layer:
    q: Parameter
    n: Parameter
    r: Parameter | None


# A panel's fits are asked for many things one after the other, so the last ones are kept.
@lru_cache(maxsize=256)
def _by_symbol(fit: Fit) -> dict[str, Parameter]:
    return {p.symbol: p for p in fit.parameters}


def _named(fit: Fit, symbol: str) -> Parameter | None:
    return _by_symbol(fit).get(symbol)


@lru_cache(maxsize=256)
def _film_layers(fit: Fit) -> list[_Layer]:
    layers = []
    for q_symbol, n_symbol, r_symbol in _FILM_LAYERS:
        q, n = _named(fit, q_symbol), _named(fit, n_symbol)
        if q is not None and n is not None and q.quantity.value and n.quantity.value:
            layers.append(_Layer(q, n, _named(fit, r_symbol)))
    return layers


def has_film(fit: Fit) -> bool:
    """Whether the model has a film whose capacitance can be asked for at all."""
    return bool(_film_layers(fit))


def small_exponent_finding(fit: Fit) -> Finding | None:
    """A doubt where a film layer's n is too small for its Q to be turned into a capacitance."""
    smallest = min((layer.n.quantity.value or 0.0 for layer in _film_layers(fit)), default=1.0)
    if smallest >= rule("capacitance.smallest_exponent"):
        return None
    return Finding(
        "exponent_too_small",
        Severity.DOUBT,
        f"The film's constant-phase exponent is {smallest:.2f}; below "
        f"{rule('capacitance.smallest_exponent'):g} it is not turned into a capacitance.",
        evidence=(("n", smallest),),
    )


def turning_frequency(fit: Fit, spectrum: Spectrum) -> float | None:
    """(RQ)^(-1/n)/2π in Hz, where the film's resistance takes over from its capacitance; None where
    it does not lie among the used points, the data do not hold R from both sides, or the film is
    not a single layer."""
    turning = _turning(fit)
    if turning is None:
        return None
    used, _ = used_points(spectrum, fit.used)
    inside = bool(used) and used[0] < turning < used[-1]
    return turning if inside else None


@lru_cache(maxsize=256)
def _turning(fit: Fit) -> float | None:
    layers = _film_layers(fit)
    if len(layers) != 1 or layers[0].r is None:
        return None
    q, n, r = layers[0].q.quantity, layers[0].n.quantity, layers[0].r.quantity
    if r.bound is not Bound.TWO_SIDED or not (q.value and n.value and r.value):
        return None
    return float((r.value * q.value) ** (-1 / n.value) / (2 * math.pi))


# ---------------------------------------------------------------------------------------------
# The laws as plain functions


def hsu_mansfeld(q: float, n: float, r: float) -> float:
    """C in F from Q in S·sⁿ and the parallel R in Ω."""
    return float(q ** (1 / n) * r ** ((1 - n) / n))


def brug(q: float, n: float, conductance: float) -> float:
    """C in F from Q in S·sⁿ and `conductance` = 1/R_e + 1/R_ct in S."""
    return float(q ** (1 / n) * conductance ** ((n - 1) / n))


def at_frequency(q: float, n: float, frequency_hz: float) -> float:
    """C in F that a constant-phase element shows at one frequency."""
    return float(q * math.sin(n * math.pi / 2) * (2 * math.pi * frequency_hz) ** (n - 1))


# ---------------------------------------------------------------------------------------------
# From a fit


def film_capacitance(
    fit: Fit,
    spectrum: Spectrum,
    frequency_hz: float,
    area_cm2: float | None,
    open_lead: Spectrum | None = None,
) -> Quantity | None:
    """The film's capacitance at one frequency, F/cm² (F without area); stacked layers in series.

    None where the model has no film, an n is below 0.7, or no limits can be given.
    """
    layers = _film_layers(fit)
    if not layers or small_exponent_finding(fit) is not None:
        return None
    value, gradient, method = _at_high_frequency(layers, frequency_hz)
    deviation = _deviation(fit, gradient)
    if fit.log_covariance is None:
        used = spectrum.frequency_hz[fit.used]
        if used.size and used[-1] <= frequency_hz <= used[0]:
            scatter = relative_scatter(spectrum, fit.used, fit, frequency_hz)
            deviation = scatter if deviation is None else min(scatter, deviation)
    return _without_leads(value, deviation, method, frequency_hz, area_cm2, open_lead)


def hsu_mansfeld_capacitance(
    fit: Fit, spectrum: Spectrum, area_cm2: float | None, open_lead: Spectrum | None = None
) -> Quantity | None:
    """The film's capacitance by Hsu and Mansfeld, F/cm² (F without area); None where the film's
    resistance does not turn over inside the window or its n is below 0.7."""
    turning = turning_frequency(fit, spectrum)
    if turning is None or small_exponent_finding(fit) is not None:
        return None
    value, gradient, method = _by_hsu_mansfeld(_film_layers(fit)[0])
    return _without_leads(value, _deviation(fit, gradient), method, turning, area_cm2, open_lead)


def _without_leads(
    value: float,
    deviation: float | None,
    method: str,
    frequency_hz: float,
    area_cm2: float | None,
    open_lead: Spectrum | None,
) -> Quantity | None:
    """The capacitance less that of the leads at a frequency, keeping its absolute error."""
    if deviation is None or not math.isfinite(deviation):
        return None
    if open_lead is not None:
        admittance = complex(leads_admittance(open_lead, np.array([frequency_hz]))[0])
        film = value - admittance.imag / (2 * math.pi * frequency_hz)
        if film <= 0:
            return None
        deviation, value = deviation * value / film, film
        method += ", without the open leads"
    return per_area(from_logarithm(value, deviation, "F", method), area_cm2)


def _by_hsu_mansfeld(layer: _Layer) -> tuple[float, dict[str, float], str]:
    assert layer.r is not None
    q, n, r = (p.quantity.value or 0.0 for p in (layer.q, layer.n, layer.r))
    gradient = {
        layer.q.symbol: 1 / n,
        layer.n.symbol: -math.log(q * r) / n,
        layer.r.symbol: (1 - n) / n,
    }
    method = "Hsu–Mansfeld, at the film's own turning frequency"
    return hsu_mansfeld(q, n, r), gradient, method


def _at_high_frequency(
    layers: list[_Layer], frequency_hz: float
) -> tuple[float, dict[str, float], str]:
    omega = 2 * math.pi * frequency_hz
    elastance = 0.0
    each: list[tuple[_Layer, float]] = []
    for layer in layers:
        q, n = (p.quantity.value or 0.0 for p in (layer.q, layer.n))
        capacitance = at_frequency(q, n, frequency_hz)
        each.append((layer, capacitance))
        elastance += 1 / capacitance
    value = 1 / elastance
    gradient: dict[str, float] = {}
    for layer, capacitance in each:
        n = layer.n.quantity.value or 0.0
        share = value / capacitance
        slope = n * (math.pi / 2 / math.tan(n * math.pi / 2) + math.log(omega))
        gradient[layer.q.symbol] = share
        gradient[layer.n.symbol] = share * slope
    exponents = [layer.n.quantity for layer in layers]
    if all(n.bound is Bound.FIXED and n.value == 1 for n in exponents):
        method = "fitted capacitor"
    else:
        method = f"fitted film at {frequency_hz:g} Hz, C = Q sin(nπ/2) ω^(n−1)"
    if len(layers) > 1:
        method += "; layers in series"
    return value, gradient, method


def _deviation(fit: Fit, gradient: dict[str, float]) -> float | None:
    """Standard error of a logarithm from its gradient on the parameters' logarithms."""
    if fit.log_covariance is not None:
        # A handful of parameters: plain sums are quicker than arrays.
        slopes = [
            (place, gradient[p.symbol])
            for place, p in enumerate(fit.parameters)
            if p.symbol in gradient
        ]
        variance = 0.0
        for i, a in slopes:
            row = fit.log_covariance[i].tolist()
            for j, b in slopes:
                variance += a * b * row[j]
        return math.sqrt(variance) if variance >= 0 else None
    total = 0.0
    for symbol, slope_ in gradient.items():
        parameter = _named(fit, symbol)
        deviation = None if parameter is None else log_deviation(parameter.quantity)
        if deviation is None:
            return None
        total += abs(slope_) * deviation
    return total


def interface_capacitance(fit: Fit, area_cm2: float | None) -> Quantity | None:
    """The interface's capacitance by Brug's law, F/cm² of panel (F without area).

    R_e is what lies in front: solution and, under a film, the pores. None where the model has no
    interface, its n is below 0.7, or one of the parameters is not held by the data.
    """
    q, n = (_named(fit, symbol) for symbol in _INTERFACE)
    if q is None or n is None or not q.quantity.value or not n.quantity.value:
        return None
    exponent = n.quantity.value
    if exponent < rule("capacitance.smallest_exponent"):
        return None
    in_front = [p for s in ("R_s", "R_po") if (p := _named(fit, s)) is not None]
    transfer = _named(fit, "R_ct")
    ahead = sum(p.quantity.value or 0.0 for p in in_front)
    if ahead <= 0:
        return None
    conductance = 1 / ahead
    charge = transfer.quantity.value if transfer is not None else None
    if charge:
        conductance += 1 / charge
    power = (exponent - 1) / exponent
    gradient = {
        q.symbol: 1 / exponent,
        n.symbol: -math.log(q.quantity.value / conductance) / exponent,
    }
    for p in in_front:
        gradient[p.symbol] = -power * (p.quantity.value or 0.0) / ahead**2 / conductance
    if transfer is not None and charge and transfer.quantity.bound is Bound.TWO_SIDED:
        gradient[transfer.symbol] = -power / charge / conductance
    # A resistance that the data leave open matters only as far as it carries weight.
    gradient = {symbol: slope for symbol, slope in gradient.items() if abs(slope) > 1e-3}
    if any(
        (p := _named(fit, symbol)) is None or log_deviation(p.quantity) is None
        for symbol in gradient
    ):
        return None
    deviation = _deviation(fit, gradient)
    if deviation is None or not math.isfinite(deviation):
        return None
    value = brug(q.quantity.value, exponent, conductance)
    method = "Brug, with the solution" + (" and the pores in front" if len(in_front) > 1 else "")
    return per_area(from_logarithm(value, deviation, "F", method), area_cm2)
