"""Starting values from the spectrum itself.

A two-layer panel seen from the fast end: the film's capacitance is what the highest frequencies
show and its exponent the slope there, the pore resistance is near |Z| where one arc gives way to
the next, the interface's capacitance is what the slow end shows, and the resistances add up to
about |Z| at the slowest point or are far above it. The arcs meet where the phase comes nearest to
zero between two extrema; but it may show none, or more than two, so several other places are tried
as well. Every combination becomes a candidate, a symmetric misfit ranks them, and the best few are
fitted. It is symmetric because the ordinary residual saturates at 1 where a model is far too small,
and so cannot tell bad from worse.
"""

from __future__ import annotations

from itertools import product

import numpy as np

from coatgui.circuits import CoatingModel, Kind
from coatgui.circuits.elements import ComplexArray
from coatgui.fitting.objective import ImpedanceObjective
from coatgui.fitting.relaxation import relaxation_outline
from coatgui.fitting.solver import BoolArray, FloatArray, IndexArray

_SPLITS = (0.15, 0.3, 0.45, 0.6, 0.75)
_SLOW_FACTORS = (1.0, 8.0)
_FAST_CAPACITANCES = ("parallel", "series")
_FILM_EXPONENTS = (0.96, 0.82)
_LEAST_EXPONENT = 0.7
_LEAST_VISIBLE = 1e-4  # of |Z|; no instrument of the trade resolves as little


class _Spectra:
    """Outlines of B spectra on one grid: smoothed over points left out by nearest used point."""

    def __init__(self, frequency_hz: FloatArray, impedance: ComplexArray, used: BoolArray) -> None:
        self.omega = 2.0 * np.pi * frequency_hz
        self.used = used
        self.impedance = impedance
        self.count = used.sum(axis=1)
        # Places of the used points, in order, padded at the end by the last of them.
        self.order = np.argsort(~used, axis=1, kind="stable")
        self._rows = np.arange(impedance.shape[0])
        self._kept: dict[float | bytes, tuple[ComplexArray, FloatArray]] = {}

    def meeting(self) -> FloatArray:
        """Share (B,) of the used points at which two arcs meet: where |phase| lies deepest between
        a higher one on either side; one half where it lies so nowhere."""
        in_order = np.take_along_axis(self.impedance, self.order, axis=1)
        phase = np.abs(np.angle(in_order))
        padded = np.pad(phase, ((0, 0), (1, 1)), mode="edge")
        count = phase.shape[1]
        smooth = (padded[:, :count] + phase + padded[:, 2:]) / 3.0
        faster = np.maximum.accumulate(smooth, axis=1)
        slower = np.maximum.accumulate(smooth[:, ::-1], axis=1)[:, ::-1]
        depth = np.minimum(faster, slower) - smooth
        deepest = np.argmax(depth, axis=1)
        place = np.where(
            depth[np.arange(deepest.size), deepest] > 0, deepest, 0.5 * (self.count - 1)
        )
        share: FloatArray = place / np.maximum(self.count - 1, 1)
        return share

    def at(self, share: float | FloatArray) -> tuple[ComplexArray, FloatArray]:
        """Impedance and angular frequency at a share of the used points, 0 the fastest. Many
        candidates ask for the same places, so answers are kept."""
        key = share if isinstance(share, float) else share.tobytes()
        if key not in self._kept:
            place = np.rint(share * (self.count - 1)).astype(np.intp)
            index = self.order[self._rows, place]
            self._kept[key] = self.impedance[self._rows, index], self.omega[index]
        return self._kept[key]

    def fast_slope(self) -> FloatArray:
        """−d ln|Z|/d ln ω (B,) over the fast fifth of the used points: the exponent of a film that
        is all that shows there."""
        (fast, omega_fast), (slow, omega_slow) = self.at(0.05), self.at(0.2)
        with np.errstate(divide="ignore", invalid="ignore"):
            slope = np.log(np.abs(slow) / np.abs(fast)) / np.log(omega_fast / omega_slow)
        likely: FloatArray = np.clip(np.nan_to_num(slope, nan=1.0), _LEAST_EXPONENT, 1.0)
        return likely

    def capacitance(self, share: float | FloatArray, form: str) -> tuple[FloatArray, FloatArray]:
        """Capacitance in F as the series or parallel form reads it there, and ω."""
        z, omega = self.at(share)
        modulus = np.abs(z)
        reactance = np.maximum(np.abs(z.imag), 1e-3 * modulus)
        if form == "series":
            return 1.0 / (omega * reactance), omega
        return reactance / (omega * modulus**2), omega


def _values(
    model: CoatingModel,
    outline: _Spectra,
    split: FloatArray,
    slow: float,
    fast: str,
    film_n: FloatArray,
) -> FloatArray:
    """One candidate (B, P) of physical values."""
    fastest, _ = outline.at(0.0)
    slowest, omega_slow = outline.at(1.0)
    middle, _ = outline.at(split)
    layers = len(model.layers)
    columns = []
    for spec in model.parameters:
        inner = spec.layer == layers and (layers > 1 or model.layers[0].role == "interface")
        exponent = 0.85 if inner else film_n
        if inner:
            # Where the slow arc closes within the sweep, its capacitance shows soon after the arcs
            # meet; where it does not close, at the slow end.
            place = split if layers == 1 else 0.9 if slow > 1.0 else np.minimum(split + 0.15, 0.9)
            capacitance, omega = outline.capacitance(place, "series")
        else:
            capacitance, omega = outline.capacitance(0.05, fast)
        if spec.kind is Kind.RESISTANCE:
            if spec.layer == 0:
                value = np.abs(fastest.real) * (0.9 if fast == "series" else 0.3)
            elif spec.layer == layers:
                value = np.abs(slowest) * slow
            else:
                value = np.abs(middle)
        elif spec.kind is Kind.CAPACITANCE:
            value = capacitance
        elif spec.kind is Kind.CONSTANT_PHASE:
            value = capacitance * omega ** (1.0 - exponent)
        elif spec.kind is Kind.EXPONENT:
            value = np.broadcast_to(exponent, capacitance.shape)
        elif spec.kind is Kind.WARBURG:
            value = np.abs(slowest) * np.sqrt(omega_slow / 2.0) / slow
        elif spec.kind is Kind.TIME:
            value = 1.0 / omega_slow
        elif spec.kind is Kind.DEPTH:
            value = np.full(capacitance.shape, 0.1)
        else:
            value = np.full(capacitance.shape, 1e-6)
        columns.append(value)
    low = np.array([spec.low for spec in model.parameters])
    high = np.array([spec.high for spec in model.parameters])
    return np.clip(np.column_stack(columns), low, high)


def candidates(
    model: CoatingModel, frequency_hz: FloatArray, impedance: ComplexArray, used: BoolArray
) -> FloatArray:
    """Candidates (S, K, B, P) in natural coordinates: B spectra, S places where arcs may meet."""
    outline = _Spectra(frequency_hz, impedance, used)
    single = len(model.layers) == 1
    places: tuple[float, ...] = (0.25, 0.5, 0.75) if single else _SPLITS
    if single and model.layers[0].role != "interface":
        places = (0.5,)
    splits = np.tile(np.array(places)[:, None], (1, impedance.shape[0]))
    exponents = np.full(splits.shape, _FILM_EXPONENTS[1])
    if not single:
        # Where the spectrum itself says where arcs meet, that takes the place of the nearest guess;
        # and there the slope says the exponent.
        meeting = outline.meeting()
        nearest = np.argmin(np.abs(splits - meeting), axis=0), np.arange(meeting.size)
        splits[nearest] = meeting
        exponents[nearest] = outline.fast_slope()
    others = tuple(product(_SLOW_FACTORS, _FAST_CAPACITANCES, (False, True)))
    return np.array(
        [
            [
                model.natural(
                    _values(
                        model,
                        outline,
                        split,
                        slow,
                        fast,
                        exponent if other else np.full(split.shape, _FILM_EXPONENTS[0]),
                    )
                )
                for slow, fast, other in others
            ]
            for split, exponent in zip(splits, exponents, strict=True)
        ]
    )


def best_starts(
    objective: ImpedanceObjective, offered: FloatArray, count: int
) -> tuple[FloatArray, IndexArray]:
    """Up to `count` starts for each row: of the candidates (S, K, B, P) the best of each place S
    where the arcs may meet, and of those the best. Neighbouring candidates lead to the same
    minimum, so it is the places that must differ.

    Returns starts (B·count, P) and the row of each."""
    places, trials, size, count_p = offered.shape
    rows = np.arange(size)
    every = objective.misfit(offered.reshape(-1, count_p), np.tile(rows, places * trials))
    costs = every.reshape(places, trials, size)
    costs = np.where(np.isfinite(costs), costs, np.inf)
    within = np.argmin(costs, axis=1)
    cheapest = np.min(costs, axis=1)
    count = min(count, places)
    chosen = np.argsort(cheapest, axis=0, kind="stable")[:count]
    starts = offered[chosen, within[chosen, rows], rows]
    return starts.transpose(1, 0, 2).reshape(size * count, -1), np.repeat(rows, count)


def approach_bounds(
    model: CoatingModel, impedance: ComplexArray, used: BoolArray
) -> tuple[FloatArray, FloatArray]:
    """Ends of the search (B, P) while a fit is still far away: the solution resistance stays above
    what the data could show at all, because a first step may throw it to the very end, and from
    there it takes many steps to come back."""
    low, high = model.bounds
    size = impedance.shape[0]
    low, high = np.tile(low, (size, 1)), np.tile(high, (size, 1))
    smallest = np.where(used, np.abs(impedance), np.inf).min(axis=1)
    if "R_s" in model.symbols:
        place = model.index("R_s")
        low[:, place] = np.maximum(low[:, place], np.log(_LEAST_VISIBLE * smallest))
    return low, high


def outline_start(
    model: CoatingModel, frequency_hz: FloatArray, impedance: ComplexArray, used: BoolArray
) -> FloatArray | None:
    """A start (P,) in natural coordinates from the relaxation outline of one spectrum: its fastest
    hump is the film's arc, its slowest the interface's. None where it shows fewer than two."""
    outline = relaxation_outline(frequency_hz, impedance, used)
    if outline is None or len(outline.peaks) < 2:
        return None
    film, interface = outline.peaks[0], outline.peaks[-1]
    values = []
    for spec in model.parameters:
        hump = film if spec.layer < len(model.layers) else interface
        if spec.kind is Kind.RESISTANCE:
            value = outline.series_resistance_ohm if spec.layer == 0 else hump.resistance_ohm
        elif spec.kind in (Kind.CAPACITANCE, Kind.CONSTANT_PHASE):
            value = hump.time_constant_s / hump.resistance_ohm
        elif spec.kind is Kind.EXPONENT:
            value = 0.9
        elif spec.kind is Kind.WARBURG:
            value = 0.1 * hump.resistance_ohm / np.sqrt(hump.time_constant_s)
        elif spec.kind is Kind.TIME:
            value = hump.time_constant_s
        else:
            value = 0.1 if spec.kind is Kind.DEPTH else 1e-6
        values.append(float(np.clip(value, spec.low, spec.high)))
    return model.natural(np.array(values))
