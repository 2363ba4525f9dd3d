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
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from coatgui.assessment.amounts import NORMAL_95, log_deviation, per_area_factor
from coatgui.assessment.modulus import relative_scatter, used_points
from coatgui.assessment.rules import rule
from coatgui.assessment.words import hertz
from coatgui.quality import leads_admittance
from coatgui.records import (
    BoolArray,
    Bound,
    Finding,
    Fit,
    FloatArray,
    Quantity,
    Severity,
    Spectrum,
)

# Symbols of Q, n and the resistance in parallel, for every layer that can belong to a film.
_FILM_LAYERS = (("Q_c", "n_c", "R_po"), ("Q_1", "n_1", "R_1"), ("Q_2", "n_2", "R_2"))
_LEAST_WEIGHT = 1e-3  # of a parameter in a logarithm, below which its error does not matter

# ---------------------------------------------------------------------------------------------
# The laws as plain functions


def hsu_mansfeld(q: FloatArray, n: FloatArray, r: FloatArray) -> FloatArray:
    """C in F from Q in S·sⁿ and the parallel R in Ω."""
    return np.asarray(q ** (1 / n) * r ** ((1 - n) / n))


def brug(q: FloatArray, n: FloatArray, conductance: FloatArray) -> FloatArray:
    """C in F from Q in S·sⁿ and `conductance` = 1/R_e + 1/R_ct in S."""
    return np.asarray(q ** (1 / n) * conductance ** ((n - 1) / n))


def at_frequency(q: FloatArray, n: FloatArray, frequency_hz: float) -> FloatArray:
    """C in F that a constant-phase element shows at one frequency."""
    omega = 2 * math.pi * frequency_hz
    return np.asarray(q * np.sin(n * math.pi / 2) * omega ** (n - 1))


# ---------------------------------------------------------------------------------------------
# From fits


@dataclass(frozen=True, slots=True)
class _Layer:
    """Columns of Q, n and, where there is one, the resistance in parallel."""

    q: int
    n: int
    r: int | None


class _Alike:
    """Fits whose parameters are the same and held by the data in the same way: their values (m, p)
    and the covariance of their logarithms (m, p, p), or None."""

    def __init__(self, places: Sequence[int], fits: Sequence[Fit]) -> None:
        self.places = places
        self.fits = fits
        self.like = fits[0].parameters
        self.column = {p.symbol: i for i, p in enumerate(self.like)}
        self.values = np.array([[p.quantity.value or 0.0 for p in f.parameters] for f in fits])
        known = [f.log_covariance for f in fits if f.log_covariance is not None]
        self.covariance = np.array(known) if known else None
        self.layers = [
            _Layer(self.column[q], self.column[n], self.column.get(r))
            for q, n, r in _FILM_LAYERS
            if self.has(q) and self.has(n)
        ]

    def has(self, symbol: str) -> bool:
        column = self.column.get(symbol)
        return column is not None and bool(self.like[column].quantity.value)

    def smallest_exponent(self) -> FloatArray:
        """The least n of the film's layers (m,), 1 where there is no film."""
        columns = [layer.n for layer in self.layers]
        return np.asarray(self.values[:, columns].min(axis=1, initial=1.0), dtype=np.float64)

    def turning_hz(self) -> FloatArray | None:
        """(RQ)^(-1/n)/2π of the film in Hz (m,); None where it is not a single layer with a
        resistance that the data hold from both sides."""
        if len(self.layers) != 1 or self.layers[0].r is None:
            return None
        layer = self.layers[0]
        r = self.like[self.layers[0].r].quantity
        if r.bound is not Bound.TWO_SIDED or not r.value:
            return None
        q, n, resistance = (self.values[:, column] for column in (layer.q, layer.n, layer.r))
        return np.asarray((resistance * q) ** (-1 / n) / (2 * math.pi), dtype=np.float64)

    def deviation(self, gradient: dict[int, FloatArray]) -> FloatArray:
        """Standard error of a logarithm (m,) from its gradient on the parameters' logarithms, by
        their columns; NaN where it is not known."""
        columns = list(gradient)
        slopes = np.stack(list(gradient.values()), axis=-1)
        if self.covariance is not None:
            part = self.covariance[:, columns][:, :, columns]
            variance = np.einsum("mi,mij,mj->m", slopes, part, slopes)
            return np.sqrt(np.where(variance >= 0, variance, np.nan))
        own = [[log_deviation(f.parameters[c].quantity) for c in columns] for f in self.fits]
        return np.asarray(
            (np.abs(slopes) * np.array(own, dtype=np.float64)).sum(axis=1), dtype=np.float64
        )


def _kind_of(fit: Fit) -> tuple[object, ...]:
    """The same for fits that can be treated as one array."""
    kinds: list[object] = [fit.log_covariance is None]
    for parameter in fit.parameters:
        q = parameter.quantity
        fixed = q.value if q.bound is Bound.FIXED else bool(q.value)
        kinds.append((parameter.symbol, q.bound, fixed, bool(q.low), bool(q.high)))
    return tuple(kinds)


class Capacitances:
    """The capacitances of many fits; every list is in their order.

    Those of a film are without the open leads' own. F/cm², or F for a panel without an area."""

    def __init__(
        self,
        fits: Sequence[Fit],
        spectra: Sequence[Spectrum],
        area_cm2: Sequence[float | None],
        open_lead: Spectrum | None = None,
    ) -> None:
        self._fits, self._spectra = fits, spectra
        self._area_cm2, self._open_lead = area_cm2, open_lead
        groups: dict[tuple[object, ...], list[int]] = {}
        for place, fit in enumerate(fits):
            groups.setdefault(_kind_of(fit), []).append(place)
        self._groups = [_Alike(own, [fits[i] for i in own]) for own in groups.values()]
        self._turning_hz = self._turnings()

    def small_exponents(self) -> list[Finding | None]:
        """A doubt where a film layer's n is too small for its Q to be turned into a capacitance."""
        found: list[Finding | None] = [None] * len(self._fits)
        least = rule("capacitance.smallest_exponent")
        for group in self._groups:
            for place, n in zip(group.places, group.smallest_exponent().tolist(), strict=True):
                if n < least:
                    found[place] = Finding(
                        "exponent_too_small",
                        Severity.DOUBT,
                        f"The film's constant-phase exponent is {n:.2f}; below {least:g} it is not "
                        "turned into a capacitance.",
                        evidence=(("n", n),),
                    )
        return found

    def turning_hz(self) -> list[float | None]:
        """(RQ)^(-1/n)/2π in Hz, where the film's resistance takes over from its capacitance; None
        where it does not lie among the used points, the data do not hold R from both sides, or the
        film is not a single layer."""
        return self._turning_hz

    def _turnings(self) -> list[float | None]:
        found: list[float | None] = [None] * len(self._fits)
        for group in self._groups:
            turning = group.turning_hz()
            if turning is None:
                continue
            for place, frequency_hz in zip(group.places, turning.tolist(), strict=True):
                used, _ = used_points(self._spectra[place], self._fits[place].used)
                if used and used[0] < frequency_hz < used[-1]:
                    found[place] = frequency_hz
        return found

    def film(self, frequency_hz: float) -> list[Quantity | None]:
        """The film's capacitance at one frequency; stacked layers in series. None where the model
        has no film, an n is below 0.7, or no limits can be given."""
        found: list[Quantity | None] = [None] * len(self._fits)
        for group in self._groups:
            if not group.layers:
                continue
            value, gradient, method = _at_high_frequency(group, frequency_hz)
            deviation = group.deviation(gradient)
            if group.covariance is None:
                # The curve runs through the points and cannot miss by more than their scatter.
                scatter = [self._scatter(place, frequency_hz) for place in group.places]
                deviation = np.fmin(deviation, scatter)
            deviation[_too_small(group.smallest_exponent())] = np.nan
            self._without_leads(found, group, value, deviation, method, np.array(frequency_hz))
        return found

    def _scatter(self, place: int, frequency_hz: float) -> float:
        spectrum, fit = self._spectra[place], self._fits[place]
        used = spectrum.frequency_hz[fit.used]
        if not (used.size and used[-1] <= frequency_hz <= used[0]):
            return math.nan
        return relative_scatter(spectrum, fit.used, fit, frequency_hz)

    def hsu_mansfeld(self) -> list[Quantity | None]:
        """The film's capacitance by Hsu and Mansfeld; None where its resistance does not turn over
        inside the window or its n is below 0.7."""
        found: list[Quantity | None] = [None] * len(self._fits)
        inside = np.array([turning is not None for turning in self._turning_hz])
        for group in self._groups:
            turning = group.turning_hz()
            if turning is None:
                continue
            layer = group.layers[0]
            assert layer.r is not None
            q, n, r = (group.values[:, column] for column in (layer.q, layer.n, layer.r))
            gradient = {layer.q: 1 / n, layer.n: -np.log(q * r) / n, layer.r: (1 - n) / n}
            deviation = group.deviation(gradient)
            deviation[_too_small(n) | ~inside[group.places]] = np.nan
            method = "Hsu–Mansfeld, at the film's own turning frequency"
            value = hsu_mansfeld(q, n, r)
            self._without_leads(found, group, value, deviation, method, turning)
        return found

    def interface(self) -> list[Quantity | None]:
        """The interface's capacitance by Brug's law, per area of panel.

        R_e is what lies in front: solution and, under a film, the pores. None where the model has
        no interface, its n is below 0.7, or one of the parameters is not held by the data.
        """
        found: list[Quantity | None] = [None] * len(self._fits)
        for group in self._groups:
            column = group.column
            in_front = [column[s] for s in ("R_s", "R_po") if s in column]
            if not (group.has("Q_dl") and group.has("n_dl") and in_front):
                continue
            q, n = (group.values[:, column[s]] for s in ("Q_dl", "n_dl"))
            ahead = group.values[:, in_front].sum(axis=1)
            with np.errstate(divide="ignore", invalid="ignore"):
                conductance = 1 / ahead
                transfer = column["R_ct"] if group.has("R_ct") else None
                if transfer is not None:
                    conductance = conductance + 1 / group.values[:, transfer]
                power = (n - 1) / n
                gradient = {column["Q_dl"]: 1 / n, column["n_dl"]: -np.log(q / conductance) / n}
                for c in in_front:
                    gradient[c] = -power * group.values[:, c] / ahead**2 / conductance
                if transfer is not None and group.like[transfer].quantity.bound is Bound.TWO_SIDED:
                    gradient[transfer] = -power / group.values[:, transfer] / conductance
            unknown = _too_small(n) | (ahead <= 0)
            for c, slope in gradient.items():
                # A resistance that the data leave open matters only as far as it carries weight.
                weighty = np.abs(slope) > _LEAST_WEIGHT
                gradient[c] = np.where(weighty, slope, 0.0)
                if log_deviation(group.like[c].quantity) is None:
                    unknown = unknown | weighty
            held = {c: g for c, g in gradient.items() if g.any()}
            deviation = group.deviation(held)
            deviation[unknown] = np.nan
            method = "Brug, with the solution"
            if len(in_front) > 1:
                method += " and the pores in front"
            with np.errstate(divide="ignore", invalid="ignore"):
                value = brug(q, n, conductance)
            self._put(found, group, value, deviation, method)
        return found

    def _without_leads(
        self,
        found: list[Quantity | None],
        group: _Alike,
        value: FloatArray,
        deviation: FloatArray,
        method: str,
        frequency_hz: FloatArray,
    ) -> None:
        """The capacitance less that of the leads at a frequency, keeping its absolute error."""
        if self._open_lead is not None:
            admittance = leads_admittance(self._open_lead, frequency_hz)
            film = value - admittance.imag / (2 * math.pi * frequency_hz)
            film = np.where(film > 0, film, np.nan)
            deviation, value = deviation * value / film, film
            method += ", without the open leads"
        self._put(found, group, value, deviation, method)

    def _put(
        self,
        found: list[Quantity | None],
        group: _Alike,
        value: FloatArray,
        deviation: FloatArray,
        method: str,
    ) -> None:
        """Quantities with their limits, where both value and deviation are numbers."""
        spread = np.exp(np.minimum(NORMAL_95 * deviation, 300.0))
        ends = np.stack([value, value / spread, value * spread], axis=-1)
        told = np.isfinite(ends).all(axis=1) & np.isfinite(deviation)
        for place, (middle, low, high), known in zip(
            group.places, ends.tolist(), told.tolist(), strict=True
        ):
            if known:
                factor, unit = per_area_factor("F", self._area_cm2[place])
                found[place] = Quantity(
                    middle * factor, low * factor, high * factor, Bound.TWO_SIDED, unit, method
                )


def _too_small(exponent: FloatArray) -> BoolArray:
    return np.asarray(exponent < rule("capacitance.smallest_exponent"))


def has_film(fit: Fit) -> bool:
    """Whether the model has a film whose capacitance can be asked for at all."""
    valued = {p.symbol for p in fit.parameters if p.quantity.value}
    return any(q in valued and n in valued for q, n, _ in _FILM_LAYERS)


def _at_high_frequency(
    group: _Alike, frequency_hz: float
) -> tuple[FloatArray, dict[int, FloatArray], str]:
    """Value (m,), its logarithm's gradient and the method's name."""
    omega = 2 * math.pi * frequency_hz
    each = [
        at_frequency(group.values[:, layer.q], group.values[:, layer.n], frequency_hz)
        for layer in group.layers
    ]
    value = 1 / np.sum([1 / capacitance for capacitance in each], axis=0)
    gradient: dict[int, FloatArray] = {}
    for layer, capacitance in zip(group.layers, each, strict=True):
        n = group.values[:, layer.n]
        share = value / capacitance
        slope = n * (math.pi / 2 / np.tan(n * math.pi / 2) + math.log(omega))
        gradient[layer.q] = share
        gradient[layer.n] = share * slope
    exponents = [group.like[layer.n].quantity for layer in group.layers]
    if all(n.bound is Bound.FIXED and n.value == 1 for n in exponents):
        method = "fitted capacitor"
    else:
        method = f"fitted film at {hertz(frequency_hz)}, C = Q sin(nπ/2) ω^(n−1)"
    if len(group.layers) > 1:
        method += "; layers in series"
    return value, gradient, method
