"""Series and parallel composition, with the derivative of the whole for each part.

Mathematics. A child of a series node is known by its impedance, a child of a parallel node by its
admittance, so that either node only adds. Going up the tree, a node whose parent asks for the other
form is inverted once. Going down, the sensitivity f = ∂Z_whole/∂(value of the node in its form)
starts at the root with what the caller gives (1, or the weights of a fit, so that a weighted
Jacobian costs nothing more), passes unchanged to the children of a node that only adds, and is
multiplied by −v² where the node was inverted to v. A leaf then writes f·∂Z_leaf/∂θ or f·∂Y_leaf/∂θ.
Two divisions a layer and one product per parameter are all a nested model costs.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from functools import cached_property

import numpy as np

from coatgui.circuits.elements import ComplexArray, Element, FloatArray, Grid


@dataclass(frozen=True)
class Leaf:
    """An element, and the place of its first parameter among the model's."""

    element: Element
    first: int

    @cached_property
    def places(self) -> slice:
        return slice(self.first, self.first + len(self.element.kinds))


@dataclass(frozen=True)
class Series:
    children: tuple[Node, ...]


@dataclass(frozen=True)
class Parallel:
    children: tuple[Node, ...]


Node = Leaf | Series | Parallel


def leaves(node: Node) -> Iterator[Leaf]:
    """All leaves, from left to right."""
    if isinstance(node, Leaf):
        yield node
    else:
        for child in node.children:
            yield from leaves(child)


def _upward(
    node: Node, grid: Grid, theta: FloatArray, admittance: bool, found: dict[int, ComplexArray]
) -> ComplexArray:
    """The value of a node in the form its parent asks for; of all nodes kept by identity."""
    if isinstance(node, Leaf):
        part = theta[:, node.places]
        element = node.element
        value = element.admittance(grid, part) if admittance else element.impedance(grid, part)
    else:
        inner = isinstance(node, Parallel)
        first, *others = node.children
        value = _upward(first, grid, theta, inner, found)
        for child in others:
            value = value + _upward(child, grid, theta, inner, found)
        if inner != admittance:
            value = np.reciprocal(value)
    found[id(node)] = value
    return value


def _downward(
    node: Node,
    grid: Grid,
    theta: FloatArray,
    admittance: bool,
    found: dict[int, ComplexArray],
    factor: ComplexArray,
    out: ComplexArray,
) -> None:
    value = found[id(node)]
    if isinstance(node, Leaf):
        element = node.element
        write = element.admittance_derivatives if admittance else element.derivatives
        write(grid, theta[:, node.places], value, factor, out[:, node.places])
        return
    inner = isinstance(node, Parallel)
    if inner != admittance:
        factor = factor * value
        factor *= value
        np.negative(factor, out=factor)
    for child in node.children:
        _downward(child, grid, theta, inner, found, factor, out)


def impedance(node: Node, grid: Grid, theta: FloatArray) -> ComplexArray:
    """Impedance (B, N) in Ω of the network at natural coordinates `theta` (B, P)."""
    return _full(_upward(node, grid, theta, False, {}), theta, grid)


def _full(value: ComplexArray, theta: FloatArray, grid: Grid) -> ComplexArray:
    """(B, N), also where everything is resistors."""
    shape = (theta.shape[0], grid.omega.size)
    return value if value.shape == shape else np.broadcast_to(value, shape)


class Evaluation:
    """A network evaluated at one `theta` (B, P): its impedance now, its derivatives on demand."""

    def __init__(self, node: Node, grid: Grid, theta: FloatArray) -> None:
        self._node, self._grid, self._theta = node, grid, theta
        self._found: dict[int, ComplexArray] = {}
        value = _upward(node, grid, theta, False, self._found)
        self.impedance: ComplexArray = _full(value, theta, grid)

    def derivatives(self, factor: ComplexArray, out: ComplexArray | None = None) -> ComplexArray:
        """factor·∂Z/∂θ, (B, P, N), written into `out` where given; `factor` is (B, N)."""
        rows, count = self._theta.shape
        if out is None:
            out = np.empty((rows, count, self._grid.omega.size), dtype=np.complex128)
        _downward(self._node, self._grid, self._theta, False, self._found, factor, out)
        return out


class RestrictedEvaluation(Evaluation):
    """A network whose parameters are not all free: derivatives are for the free ones only."""

    def __init__(self, node: Node, grid: Grid, theta: FloatArray, selection: FloatArray) -> None:
        super().__init__(node, grid, theta)
        self._selection = selection

    def derivatives(self, factor: ComplexArray, out: ComplexArray | None = None) -> ComplexArray:
        """factor·∂Z/∂θ, (B, P, N), for the free parameters; otherwise as above."""
        of_free: ComplexArray = self._selection.T @ super().derivatives(factor)
        if out is None:
            return of_free
        out[...] = of_free
        return out
