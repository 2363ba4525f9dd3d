"""A coating model as a section through the panel: solution, then layers from outside to metal.

Each layer has a *dielectric* side in parallel with an *ionic* side. The next layer sits behind the
ionic side (a pore that leads inwards) or behind the whole layer (a film under a film). The table
below turns that description into a network and gives every parameter its symbol.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from typing import Any

import numpy as np

from coatgui.circuits import elements as el
from coatgui.circuits.elements import ComplexArray, FloatArray, Grid, Kind, Scale
from coatgui.circuits.network import (
    Evaluation,
    Leaf,
    Node,
    Parallel,
    RestrictedEvaluation,
    Series,
    impedance,
)


class ModelError(ValueError):
    """A model description that cannot be built; the message says where and what to do."""


@dataclass(frozen=True, slots=True)
class ParameterSpec:
    """One parameter of a model. `low` and `high` are the physical ends of its search, per
    specimen; `layer` is 0 for solution and leads, 1 for the outermost layer."""

    symbol: str
    meaning: str
    kind: Kind
    layer: int
    low: float
    high: float


@dataclass(frozen=True, slots=True)
class Layer:
    """`role` is film, film_1, film_2, porous_layer (thin, on bare metal) or interface; `dielectric`
    is capacitor, constant_phase or graded_film; `ionic` is none or resistor; `diffusion` is none,
    semi_infinite, open or closed; `next_layer` is behind_ionic or behind_layer."""

    role: str
    dielectric: str = "constant_phase"
    ionic: str = "none"
    diffusion: str = "none"
    next_layer: str = "behind_ionic"


# role -> (subscript of the dielectric side, subscript of the ionic side, words)
_ROLES = {
    "film": ("c", "po", "film"),
    "film_1": ("1", "1", "outer film"),
    "film_2": ("2", "2", "inner film"),
    "interface": ("dl", "ct", "interface"),
    "porous_layer": ("L", "L", "porous layer"),
}

_DIELECTRICS: dict[str, tuple[el.Element, tuple[tuple[str, str], ...]]] = {
    "capacitor": (el.Capacitor(), (("C", "capacitance of the {0}"),)),
    "constant_phase": (
        el.ConstantPhase(),
        (("Q", "constant-phase coefficient of the {0}"), ("n", "exponent of the {0}")),
    ),
    "graded_film": (
        el.GradedFilm(),
        (
            ("C", "capacitance of the {0}"),
            ("τ", "time constant of the innermost part of the {0}"),
            ("p", "depth of penetration over thickness of the {0}"),
        ),
    ),
}

_RESISTANCE_WORDS = {
    "film": "pore resistance of the film",
    "film_1": "resistance of the outer film",
    "film_2": "resistance of the inner film",
    "interface": "charge-transfer resistance",
    "porous_layer": "resistance of the porous layer",
}

_DIFFUSIONS: dict[str, tuple[el.Element, tuple[tuple[str, str], ...]]] = {
    "semi_infinite": (el.SemiInfiniteDiffusion(), (("σ", "diffusion coefficient (Warburg)"),)),
    "open": (
        el.OpenDiffusion(),
        (("R_D", "diffusion resistance"), ("τ_D", "diffusion time")),
    ),
    "closed": (
        el.ClosedDiffusion(),
        (("R_D", "diffusion resistance"), ("τ_D", "diffusion time")),
    ),
}

# Ends of the search, per specimen: wider than anything a panel of 0.1 to 1000 cm² can show, so
# that a parameter that reaches one is a parameter the data do not hold. Exponents: below the
# lower end the element no longer describes a capacitance (common practice, no source).
_RANGES = {
    Kind.RESISTANCE: (1e-3, 1e15),
    Kind.CAPACITANCE: (1e-14, 1e1),
    Kind.CONSTANT_PHASE: (1e-14, 1e1),
    Kind.INDUCTANCE: (1e-10, 1e-2),
    Kind.WARBURG: (1e-3, 1e14),
    Kind.TIME: (1e-8, 1e8),
    Kind.DEPTH: (1e-3, 1e1),
}
_EXPONENT_RANGES = {"interface": (0.5, 1.0), "porous_layer": (0.5, 1.0)}
_FILM_EXPONENT_RANGE = (0.6, 1.0)


@dataclass(frozen=True, eq=False)
class CoatingModel:
    """A coating model ready to be evaluated. Build it with `build_model` or `model_from_data`.

    `automatic` models take part in the choice of model; the others are a person's to pick.
    `parameters` are the P free ones, which are fitted; `all_parameters` are the F of the network,
    among them those that are fixed or tied to another: `source` (F,) says which free parameter
    gives each, −1 for none, and `constant` (F,) holds natural coordinates of the fixed ones.
    """

    model_id: str
    name: str
    meaning: str
    layers: tuple[Layer, ...]
    inductance: bool
    automatic: bool
    twin: str
    parameters: tuple[ParameterSpec, ...]
    all_parameters: tuple[ParameterSpec, ...]
    source: tuple[int, ...]
    constant: tuple[float, ...]
    network: Node = field(repr=False)

    @property
    def symbols(self) -> tuple[str, ...]:
        return tuple(p.symbol for p in self.parameters)

    def index(self, symbol: str) -> int:
        """Place of a parameter. Raises KeyError where the model has none of that symbol."""
        try:
            return self.symbols.index(symbol)
        except ValueError:
            raise KeyError(symbol) from None

    @property
    def _is_plain(self) -> list[bool]:
        return [p.kind.scale is Scale.PLAIN for p in self.parameters]

    def natural(self, physical: FloatArray) -> FloatArray:
        """Natural coordinates (…, P) of physical values (…, P)."""
        values = np.asarray(physical, dtype=np.float64)
        plain = self._is_plain
        return np.where(plain, values, np.log(np.where(plain, 1.0, values)))

    def physical(self, theta: FloatArray) -> FloatArray:
        """Physical values (…, P) of natural coordinates (…, P)."""
        plain = self._is_plain
        return np.where(plain, theta, np.exp(np.where(plain, 0.0, theta)))

    @property
    def bounds(self) -> tuple[FloatArray, FloatArray]:
        """Ends of the search in natural coordinates, two arrays (P,)."""
        low = self.natural(np.array([p.low for p in self.parameters]))
        high = self.natural(np.array([p.high for p in self.parameters]))
        return low, high

    @property
    def restricted(self) -> bool:
        """Whether some parameter is fixed or tied to another."""
        return len(self.parameters) < len(self.all_parameters)

    def whole(self, theta: FloatArray) -> FloatArray:
        """Natural coordinates (B, F) of all parameters, from those of the free ones (B, P)."""
        if not self.restricted:
            return theta
        source = np.array(self.source)
        return np.where(source < 0, np.array(self.constant), theta[:, np.maximum(source, 0)])

    @property
    def selection(self) -> FloatArray:
        """∂(all parameters)/∂(free parameters), (F, P): ones and zeros."""
        source = np.array(self.source)
        chosen: FloatArray = (source[:, None] == np.arange(len(self.parameters))).astype(np.float64)
        return chosen

    def impedance(self, theta: FloatArray, frequency_hz: FloatArray | Grid) -> ComplexArray:
        """Impedance (B, N) in Ω at natural coordinates `theta` (B, P)."""
        grid = frequency_hz if isinstance(frequency_hz, Grid) else Grid.of_hertz(frequency_hz)
        return impedance(self.network, grid, self.whole(theta))

    def evaluate(self, theta: FloatArray, grid: Grid) -> Evaluation:
        """Impedance and, on demand, derivatives, at natural coordinates `theta` (B, P)."""
        if self.restricted:
            return RestrictedEvaluation(self.network, grid, self.whole(theta), self.selection)
        return Evaluation(self.network, grid, theta)


class _Builder:
    """Collects parameters while the network is put together from the metal outwards."""

    def __init__(self) -> None:
        self.specs: list[ParameterSpec] = []

    def leaf(
        self, element: el.Element, names: list[tuple[str, str]], layer: int, role: str
    ) -> Leaf:
        first = len(self.specs)
        for kind, (symbol, meaning) in zip(element.kinds, names, strict=True):
            if kind is Kind.EXPONENT:
                low, high = _EXPONENT_RANGES.get(role, _FILM_EXPONENT_RANGE)
            else:
                low, high = _RANGES[kind]
            self.specs.append(ParameterSpec(symbol, meaning, kind, layer, low, high))
        return Leaf(element, first)

    def layer(self, layers: tuple[Layer, ...], place: int) -> Node:
        """The network of layer `place` (from 1) and all that lies behind it."""
        layer = layers[place - 1]
        inner_subscript, ionic_subscript, words = _ROLES[layer.role]
        element, names = _DIELECTRICS[layer.dielectric]
        dielectric = self.leaf(
            element,
            [(f"{s}_{inner_subscript}", m.format(words)) for s, m in names],
            place,
            layer.role,
        )
        ionic: list[Node] = []
        if layer.ionic == "resistor":
            names_r = [(f"R_{ionic_subscript}", _RESISTANCE_WORDS[layer.role])]
            ionic.append(self.leaf(el.Resistor(), names_r, place, layer.role))
        if layer.diffusion != "none":
            element, names = _DIFFUSIONS[layer.diffusion]
            ionic.append(self.leaf(element, list(names), place, layer.role))
        last = place == len(layers)
        if not last and layer.next_layer == "behind_ionic":
            ionic.append(self.layer(layers, place + 1))
        node: Node = dielectric
        if ionic:
            node = Parallel((dielectric, ionic[0] if len(ionic) == 1 else Series(tuple(ionic))))
        if not last and layer.next_layer == "behind_layer":
            node = Series((node, self.layer(layers, place + 1)))
        return node


def _check(model_id: str, layers: tuple[Layer, ...]) -> None:
    where = f"Coating model '{model_id}'"
    if not layers:
        raise ModelError(f"{where} has no layer: give it at least one.")
    roles = [layer.role for layer in layers]
    if len(set(roles)) != len(roles):
        raise ModelError(f"{where} has two layers of the same role: give each its own.")
    choices: dict[str, tuple[str, ...]] = {
        "role": tuple(_ROLES),
        "dielectric": tuple(_DIELECTRICS),
        "ionic": ("none", "resistor"),
        "diffusion": ("none", *_DIFFUSIONS),
        "next_layer": ("behind_ionic", "behind_layer"),
    }
    for place, layer in enumerate(layers, start=1):
        for name, allowed in choices.items():
            value = getattr(layer, name)
            if value not in allowed:
                raise ModelError(
                    f"{where}, layer {place}: {name} is '{value}'; use one of {', '.join(allowed)}."
                )
        if place < len(layers) and layer.next_layer == "behind_ionic" and layer.ionic == "none":
            raise ModelError(
                f"{where}, layer {place}: nothing leads inwards; give it a resistor on the ionic "
                "side, or set the next layer behind the whole layer."
            )
    if sum(layer.diffusion != "none" for layer in layers) > 1:
        raise ModelError(f"{where} has diffusion in two layers: one spectrum cannot hold both.")


def _restrict(
    model_id: str,
    specs: tuple[ParameterSpec, ...],
    fixed: Mapping[str, float],
    tied: Sequence[Sequence[str]],
) -> tuple[tuple[int, ...], tuple[float, ...], tuple[ParameterSpec, ...]]:
    """Source, constant and free parameters of a model with fixed and tied parameters."""
    where = f"Coating model '{model_id}'"
    place = {spec.symbol: i for i, spec in enumerate(specs)}
    for symbol in (*fixed, *(symbol for group in tied for symbol in group)):
        if symbol not in place:
            raise ModelError(f"{where} has no parameter {symbol}; it has {', '.join(place)}.")
    leader = {symbol: group[0] for group in tied for symbol in group[1:]}
    named = [*fixed, *leader, *{group[0] for group in tied if group}]
    if len(set(named)) != len(named):
        raise ModelError(f"{where}: a parameter is fixed or tied twice; say it once.")
    for symbol, first in leader.items():
        if specs[place[symbol]].kind is not specs[place[first]].kind:
            raise ModelError(f"{where}: {symbol} and {first} differ in kind and cannot be tied.")
    constant = [0.0] * len(specs)
    for symbol, value in fixed.items():
        spec = specs[place[symbol]]
        if not spec.low <= value <= spec.high:
            raise ModelError(
                f"{where}: {symbol} is fixed at {value:g}; it must lie between {spec.low:g} and "
                f"{spec.high:g}."
            )
        plain = spec.kind.scale is Scale.PLAIN
        constant[place[symbol]] = float(value if plain else np.log(value))
    free = [spec.symbol for spec in specs if spec.symbol not in fixed and spec.symbol not in leader]
    source = tuple(
        -1 if spec.symbol in fixed else free.index(leader.get(spec.symbol, spec.symbol))
        for spec in specs
    )
    return source, tuple(constant), tuple(spec for spec in specs if spec.symbol in free)


def build_model(
    model_id: str,
    name: str,
    layers: tuple[Layer, ...],
    *,
    meaning: str = "",
    inductance: bool = False,
    automatic: bool = False,
    twin: str = "",
    fixed: Mapping[str, float] | None = None,
    tied: Sequence[Sequence[str]] = (),
) -> CoatingModel:
    """A model from its layers. `fixed` holds parameters at physical values by symbol; the symbols
    of each group of `tied` share one value. Raises ModelError where the description makes no
    circuit."""
    _check(model_id, layers)
    builder = _Builder()
    parts: list[Node] = []
    if inductance:
        parts.append(builder.leaf(el.Inductor(), [("L", "inductance of the leads")], 0, "solution"))
    parts.append(builder.leaf(el.Resistor(), [("R_s", "solution resistance")], 0, "solution"))
    parts.append(builder.layer(layers, 1))
    network = Series(tuple(parts))
    specs = tuple(builder.specs)
    source, constant, free = _restrict(model_id, specs, fixed or {}, tied)
    return CoatingModel(
        model_id=model_id,
        name=name,
        meaning=meaning,
        layers=layers,
        inductance=inductance,
        automatic=automatic,
        twin=twin,
        parameters=free,
        all_parameters=specs,
        source=source,
        constant=constant,
        network=network,
    )


def model_from_data(data: Mapping[str, Any]) -> CoatingModel:
    """A model from structured data (a table of `resources/models.toml`, or a campaign's own).
    Raises ModelError for a missing or unknown entry."""
    try:
        layers = tuple(Layer(**layer) for layer in data["layer"])
        return build_model(
            data["id"],
            data["name"],
            layers,
            meaning=data.get("meaning", ""),
            inductance=data.get("inductance", False),
            automatic=data.get("automatic", False),
            twin=data.get("twin", ""),
            fixed=data.get("fixed"),
            tied=data.get("tied", ()),
        )
    except (KeyError, TypeError) as error:
        raise ModelError(
            f"Coating model '{data.get('id', '?')}' is not described in full: {error}."
        ) from error
