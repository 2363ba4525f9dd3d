"""Series and parallel composition, with the derivative of the whole for each part.

Mathematics. Going up the tree, impedances of a series node add, and admittances of a parallel node
add. Going down, the sensitivity f = ∂Z_whole/∂Z_node starts at the root with what the caller gives
(1, or the weights of a fit, so that a weighted Jacobian costs nothing more), passes unchanged
through a series node, and is multiplied by (Z_parallel/Z_child)² on the way into a child of a
parallel node. A leaf then writes f·∂Z_leaf/∂θ. One complex product per parameter is all a nested
model costs, however deep it is.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np

from coatgui.circuits.elements import ComplexArray, Element, FloatArray, Grid


@dataclass(frozen=True)
class Leaf:
    """An element, and the place of its first parameter among the model's."""

    element: Element
    first: int

    @property
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


def _upward(node: Node, grid: Grid, theta: FloatArray, found: dict[int, ComplexArray]) -> None:
    """Impedance of every node, kept by the node's identity."""
    if isinstance(node, Leaf):
        found[id(node)] = node.element.impedance(grid, theta[:, node.places])
        return
    for child in node.children:
        _upward(child, grid, theta, found)
    parts = [found[id(child)] for child in node.children]
    if isinstance(node, Series):
        total = parts[0]
        for part in parts[1:]:
            total = total + part
        found[id(node)] = total
    else:
        admittance = 1.0 / parts[0]
        for part in parts[1:]:
            admittance = admittance + 1.0 / part
        found[id(node)] = 1.0 / admittance


def _downward(
    node: Node,
    grid: Grid,
    theta: FloatArray,
    found: dict[int, ComplexArray],
    factor: ComplexArray,
    out: ComplexArray,
) -> None:
    if isinstance(node, Leaf):
        part = theta[:, node.places]
        node.element.derivatives(grid, part, found[id(node)], factor, out[:, node.places])
        return
    for child in node.children:
        if isinstance(node, Series):
            passed = factor
        else:
            ratio = found[id(node)] / found[id(child)]
            passed = ratio * ratio
            passed *= factor
        _downward(child, grid, theta, found, passed, out)


def impedance(node: Node, grid: Grid, theta: FloatArray) -> ComplexArray:
    """Impedance (B, N) in Ω of the network at natural coordinates `theta` (B, P)."""
    found: dict[int, ComplexArray] = {}
    _upward(node, grid, theta, found)
    return np.broadcast_to(found[id(node)], (theta.shape[0], grid.omega.size))


class Evaluation:
    """A network evaluated at one `theta` (B, P): its impedance now, its derivatives on demand."""

    def __init__(self, node: Node, grid: Grid, theta: FloatArray) -> None:
        self._node, self._grid, self._theta = node, grid, theta
        self._found: dict[int, ComplexArray] = {}
        _upward(node, grid, theta, self._found)
        self.impedance: ComplexArray = np.broadcast_to(
            self._found[id(node)], (theta.shape[0], grid.omega.size)
        )

    def derivatives(self, factor: ComplexArray) -> ComplexArray:
        """factor·∂Z/∂θ, (B, P, N) and contiguous; `factor` is (B, N)."""
        rows, count = self._theta.shape
        out = np.empty((rows, count, self._grid.omega.size), dtype=np.complex128)
        _downward(self._node, self._grid, self._theta, self._found, factor, out)
        return out
