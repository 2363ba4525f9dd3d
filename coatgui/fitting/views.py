"""What a plot of a fit shows beside the curve: its 95 % band, and what each part contributes.

Mathematics of the band. With C the covariance of the parameters' logarithms, ln Z = ln|Z| + jφ and
J = ∂ln Z/∂ln p, the variance of ln|Z| at a frequency is Re J C Re Jᵀ, that of φ is Im J C Im Jᵀ;
the same with ∂Z/∂ln p gives Z′ and Z″ (delta method). The band is ± Student's t times the root of
that: for each frequency by itself, not for the whole curve at once.

The delta method takes the model for a straight line within the limits. Whether it is one is tried:
the model is evaluated at both ends of every principal axis of the covariance, but within the limits
that are reported; where its change differs from the straight line's by more than half of the band's
half-width, the band is said not to hold. A parameter at an end of its search has no covariance and
counts as known; the text names it.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import dataclass

import numpy as np

from coatgui.circuits import CoatingModel, Grid, Kind
from coatgui.circuits.elements import ComplexArray
from coatgui.circuits.network import Evaluation, Leaf, Node, Parallel, impedance, leaves
from coatgui.fitting.limits import student_t
from coatgui.fitting.solver import BoolArray, FloatArray
from coatgui.records import Bound, Fit

_BENT = 0.5  # of the half-width
_NO_WIDTH = 1e-6  # relative: nothing that could be drawn


@dataclass(frozen=True, eq=False)
class FitBand:
    """The curve of a fit with its 95 % band, per specimen, all (N,): `impedance_ohm` the curve;
    the ends of |Z| and of Z′ and Z″ in Ω and of the phase in degrees (Z″ and the phase of a
    capacitor are negative); `holds` False where the band is not to be relied on; `text` one
    sentence that says so, or what the band takes as known; empty where nothing is to be said."""

    frequency_hz: FloatArray
    impedance_ohm: ComplexArray
    modulus_low_ohm: FloatArray
    modulus_high_ohm: FloatArray
    phase_low_deg: FloatArray
    phase_high_deg: FloatArray
    real_low_ohm: FloatArray
    real_high_ohm: FloatArray
    imaginary_low_ohm: FloatArray
    imaginary_high_ohm: FloatArray
    holds: BoolArray
    text: str


@dataclass(frozen=True, eq=False)
class Part:
    """What one part of the coating contributes: `impedance_ohm` (N,) per specimen, at the values
    that are shown for its parameters. `layer` is 0 for solution and leads, 1 for the outermost
    layer; `symbols` are its parameters, and `bounds` those of them of which the data hold only a
    bound: the curve is then drawn at that bound. `impedance_ohm` is None where a value cannot be
    determined at all."""

    name: str
    layer: int
    symbols: tuple[str, ...]
    bounds: tuple[str, ...]
    impedance_ohm: ComplexArray | None


def _must_belong(fit: Fit, model: CoatingModel) -> None:
    if [p.symbol for p in fit.parameters] != [p.symbol for p in model.all_parameters]:
        raise ValueError(f"The fit by '{fit.model}' does not belong to model '{model.model_id}'.")


def _natural(model: CoatingModel, physical: FloatArray) -> FloatArray:
    plain = np.array([spec.kind is Kind.EXPONENT for spec in model.all_parameters])
    whole: FloatArray = np.where(plain, physical, np.log(np.where(plain, 1.0, physical)))
    return whole


def _in_parallel(alone: ComplexArray, admittance_s: ComplexArray | None) -> ComplexArray:
    return alone if admittance_s is None else alone / (1.0 + alone * admittance_s)


def fit_band(
    fit: Fit,
    model: CoatingModel,
    frequency_hz: FloatArray,
    *,
    parallel_s: ComplexArray | None = None,
) -> FitBand | None:
    """The 95 % band of `fit` by `model` at `frequency_hz` (N,), which should lie within those that
    were measured. `parallel_s` (N,) is an admittance in S that lies beside the specimen in what is
    drawn (leads that were taken away before the fit). None where the fit keeps no covariance.
    Raises ValueError where the model is not the fit's."""
    _must_belong(fit, model)
    if fit.log_covariance is None or fit.optimum is None:
        return None
    grid = Grid.of_hertz(frequency_hz)
    theta = _natural(model, fit.optimum)
    exponents = np.array([spec.kind is Kind.EXPONENT for spec in model.all_parameters])
    # Limits stand on logarithms of all parameters; the network takes exponents as they are.
    stretch = np.where(exponents, fit.optimum, 1.0)
    covariance = fit.log_covariance * np.outer(stretch, stretch)
    evaluation = Evaluation(model.network, grid, theta[None, :])
    alone = evaluation.impedance[0]
    whole = _in_parallel(alone, parallel_s)
    # ∂Z/∂Z_alone of Z = Z_alone/(1 + Z_alone Y) is (Z/Z_alone)².
    passed = (whole / alone) ** 2
    slopes = evaluation.derivatives(passed[None, :])[0]
    relative = slopes / whole
    freedom = max(2.0 * float(fit.used.sum()) - len(model.parameters), 1.0)
    reach = float(student_t(np.array([freedom]))[0])

    def half(jacobian: FloatArray) -> FloatArray:
        variance = np.einsum("in,ij,jn->n", jacobian, covariance, jacobian)
        wide: FloatArray = reach * np.sqrt(np.maximum(variance, 0.0))
        return wide

    modulus, phase = np.abs(whole), np.degrees(np.angle(whole))
    of_modulus, of_phase = half(relative.real), half(relative.imag)
    of_real, of_imaginary = half(slopes.real), half(slopes.imag)

    def moved(steps: FloatArray) -> ComplexArray:
        there = _in_parallel(impedance(model.network, grid, theta + steps), parallel_s)
        quotient: ComplexArray = there / whole
        return quotient

    holds = _straight(
        moved, relative, _axes(fit, model, theta, reach, covariance), of_modulus, of_phase
    )
    return FitBand(
        frequency_hz=frequency_hz,
        impedance_ohm=whole,
        modulus_low_ohm=modulus * np.exp(-of_modulus),
        modulus_high_ohm=modulus * np.exp(of_modulus),
        phase_low_deg=phase - np.degrees(of_phase),
        phase_high_deg=phase + np.degrees(of_phase),
        real_low_ohm=whole.real - of_real,
        real_high_ohm=whole.real + of_real,
        imaginary_low_ohm=whole.imag - of_imaginary,
        imaginary_high_ohm=whole.imag + of_imaginary,
        holds=holds,
        text=_said(fit, covariance, holds),
    )


def _axes(
    fit: Fit, model: CoatingModel, theta: FloatArray, reach: float, covariance: FloatArray
) -> FloatArray:
    """Steps (K, F) to both ends of the principal axes of the covariance, none of them beyond the
    limits that the data hold for a parameter, or beyond the ends of its search."""
    ends = [
        [
            spec.low if parameter.quantity.low is None else parameter.quantity.low,
            spec.high if parameter.quantity.high is None else parameter.quantity.high,
        ]
        for spec, parameter in zip(model.all_parameters, fit.parameters, strict=True)
    ]
    low, high = (_natural(model, end) for end in np.array(ends).T)
    deviation = np.sqrt(np.diagonal(covariance))
    known = np.where(deviation > 0, deviation, 1.0)
    values, vectors = np.linalg.eigh(covariance / np.outer(known, known))
    axes = (vectors * np.sqrt(np.maximum(values, 0.0))).T * known
    steps = reach * np.concatenate([axes, -axes])
    room = np.where(steps > 0, high - theta, low - theta)
    with np.errstate(divide="ignore", invalid="ignore"):
        share = np.where(steps != 0, room / steps, np.inf).min(axis=1)
    shortened: FloatArray = steps * np.clip(share, 0.0, 1.0)[:, None]
    return shortened


def _straight(
    moved: Callable[[FloatArray], ComplexArray],
    relative: ComplexArray,
    steps: FloatArray,
    of_modulus: FloatArray,
    of_phase: FloatArray,
) -> BoolArray:
    """Where (N,) the model changes as its derivatives say over `steps` (K, F): `moved` gives
    Z(θ + step)/Z(θ) (K, N)."""
    quotient = moved(steps)
    straight = steps @ relative
    with np.errstate(divide="ignore"):
        bent_modulus = np.abs(np.log(np.abs(quotient)) - straight.real).max(axis=0)
    # The angle between the two, so that a full turn does not count as a change.
    bent_phase = np.abs(np.angle(quotient * np.exp(-1j * straight.imag))).max(axis=0)
    holds: BoolArray = (bent_modulus <= _BENT * of_modulus + _NO_WIDTH) & (
        bent_phase <= _BENT * of_phase + _NO_WIDTH
    )
    return holds


def _said(fit: Fit, covariance: FloatArray, holds: BoolArray) -> str:
    variance = np.diagonal(covariance)
    known = [
        p.symbol
        for p, own in zip(fit.parameters, variance, strict=True)
        if own == 0.0 and p.quantity.bound is not Bound.FIXED
    ]
    said = []
    if not holds.all():
        share = (
            "the whole curve" if not holds.any() else f"{100 * np.mean(~holds):.0f} % of the curve"
        )
        said.append(
            f"For {share} the band is only a rough guide: within the limits of the parameters the "
            "circuit is far from a straight line there."
        )
    if known:
        said.append(
            f"The band takes {', '.join(known)} as known, because the fit ran to the end of the "
            "search there."
        )
    return " ".join(said)


# role -> (dielectric side, resistor on the ionic side, both together)
_NAMES = {
    "film": ("film as a capacitor", "pores of the film", "film as a whole"),
    "film_1": ("outer film as a capacitor", "leakage of the outer film", "outer film as a whole"),
    "film_2": ("inner film as a capacitor", "leakage of the inner film", "inner film as a whole"),
    "interface": ("interface as a capacitor", "reaction of the metal", "interface as a whole"),
    "porous_layer": (
        "porous layer as a capacitor",
        "pores of the porous layer",
        "porous layer as a whole",
    ),
}
_BEHIND = "pores and all that lies behind them"


def fit_parts(fit: Fit, model: CoatingModel, frequency_hz: FloatArray) -> tuple[Part, ...]:
    """The parts of the fitted circuit over `frequency_hz` (N,), from the outside to the metal; a
    layer's whole follows its sides. Raises ValueError where the model is not the fit's."""
    _must_belong(fit, model)
    shown = np.array([np.nan if (v := p.quantity.value) is None else v for p in fit.parameters])
    theta = _natural(model, shown)
    grid = Grid.of_hertz(frequency_hz)

    def part(node: Node, name: str) -> Part:
        places = [i for leaf in leaves(node) for i in range(leaf.places.start, leaf.places.stop)]
        own = [fit.parameters[i] for i in places]
        unknown = bool(np.isnan(theta[places]).any())
        return Part(
            name=name,
            layer=own[0].layer,
            symbols=tuple(p.symbol for p in own),
            bounds=tuple(
                p.symbol for p in own if p.quantity.bound in (Bound.AT_LEAST, Bound.AT_MOST)
            ),
            impedance_ohm=None if unknown else impedance(node, grid, theta[None, :])[0],
        )

    def layers_of(node: Node) -> set[int]:
        return {model.all_parameters[leaf.first].layer for leaf in leaves(node)}

    def walk(node: Node) -> Iterator[Part]:
        if isinstance(node, Leaf):
            yield part(node, _name_of(model, node))
            return
        for child in node.children:
            yield from walk(child)
        if isinstance(node, Parallel):
            path = node.children[-1]
            if len(layers_of(path)) > 1:
                yield part(path, _BEHIND)
            elif len(layers_of(node)) == 1:
                yield part(node, _NAMES[model.layers[layers_of(node).pop() - 1].role][2])

    return tuple(walk(model.network))


def _name_of(model: CoatingModel, leaf: Leaf) -> str:
    spec = model.all_parameters[leaf.first]
    if spec.layer == 0:
        return "leads" if spec.kind is Kind.INDUCTANCE else "solution"
    dielectric, ionic, _ = _NAMES[model.layers[spec.layer - 1].role]
    if spec.kind in (Kind.CAPACITANCE, Kind.CONSTANT_PHASE):
        return dielectric
    if spec.kind is Kind.RESISTANCE and len(leaf.element.kinds) == 1:
        return ionic
    return "diffusion"
