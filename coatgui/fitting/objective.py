"""The objective of an impedance fit: it alone owns weights, masks and residuals.

The residual of a point is (Z_model − Z)/σ, complex, its real and imaginary parts counted apart;
σ = |Z| (modulus weights) unless given. A point left out has weight zero. For the approach from far
away the logarithmic residual ln(Z_model/Z) is used instead: it is the same to first order near the
solution, but does not flatten where the model is far too small.
"""

from __future__ import annotations

from collections.abc import Callable

import numpy as np

from coatgui.circuits import CoatingModel, Grid
from coatgui.circuits.elements import ComplexArray
from coatgui.fitting.solver import BoolArray, FloatArray, IndexArray


class ImpedanceObjective:
    """B spectra on one grid under one model.

    `frequency_hz` (N,); `impedance` (B, N) in Ω; `used` (B, N) False where a point is left out;
    `deviation` (B, N) the standard deviation of a point in Ω up to a common factor, |Z| by default;
    `logarithmic` chooses the residual for the approach.
    """

    def __init__(
        self,
        model: CoatingModel,
        frequency_hz: FloatArray,
        impedance: ComplexArray,
        used: BoolArray,
        *,
        deviation: FloatArray | None = None,
        logarithmic: bool = False,
    ) -> None:
        self.model = model
        self.grid = Grid.of_hertz(frequency_hz)
        self.measured = impedance
        scale = np.abs(impedance) if deviation is None else deviation
        self.weight = np.where(used, 1.0 / np.where(scale > 0, scale, 1.0), 0.0)
        self.used = used
        self.logarithmic = logarithmic

    def residuals(self, theta: FloatArray, rows: IndexArray) -> ComplexArray:
        """Weighted residuals (B, N), complex; zero where a point is left out."""
        evaluation = self.model.evaluate(theta, self.grid)
        return self._residual(evaluation.impedance, rows)

    def _residual(self, modelled: ComplexArray, rows: IndexArray) -> ComplexArray:
        measured = self.measured[rows]
        if self.logarithmic:
            logarithm: ComplexArray = np.log(modelled / measured) * self.used[rows]
            return logarithm
        difference: ComplexArray = (modelled - measured) * self.weight[rows]
        return difference

    def cost(self, theta: FloatArray, rows: IndexArray) -> FloatArray:
        """Sum of squared residuals (B,)."""
        with np.errstate(over="ignore", invalid="ignore", divide="ignore"):
            residual = self.residuals(theta, rows)
            total: FloatArray = (residual.real**2 + residual.imag**2).sum(axis=1)
        return total

    def normal(
        self, theta: FloatArray, rows: IndexArray
    ) -> tuple[FloatArray, FloatArray, FloatArray]:
        """S, Jᵀr and JᵀJ as `solver.Objective` asks."""
        with np.errstate(over="ignore", invalid="ignore", divide="ignore"):
            evaluation = self.model.evaluate(theta, self.grid)
            residual = self._residual(evaluation.impedance, rows)
            if self.logarithmic:
                factor = self.used[rows] / evaluation.impedance
            else:
                factor = self.weight[rows].astype(np.complex128)
            jacobian = evaluation.derivatives(factor).view(np.float64)
            flat = np.ascontiguousarray(residual).view(np.float64)
            normal = jacobian @ jacobian.transpose(0, 2, 1)
            gradient = (jacobian @ flat[:, :, None])[:, :, 0]
            cost = (flat * flat).sum(axis=1)
        return cost, gradient, normal


class FunctionObjective:
    """One problem of any kind, for the solver's general entry: `function(theta)` (P,) gives
    residuals (M,) and their Jacobian (M, P). A point where either is not finite is refused."""

    def __init__(self, function: Callable[[FloatArray], tuple[FloatArray, FloatArray]]) -> None:
        self._function = function

    def normal(
        self, theta: FloatArray, rows: IndexArray
    ) -> tuple[FloatArray, FloatArray, FloatArray]:
        """S, Jᵀr and JᵀJ as `solver.Objective` asks, row after row."""
        cost, gradient, normal = [], [], []
        for point in theta:
            residual, jacobian = self._function(point)
            cost.append(residual @ residual)
            gradient.append(jacobian.T @ residual)
            normal.append(jacobian.T @ jacobian)
        return np.array(cost), np.array(gradient), np.array(normal)
