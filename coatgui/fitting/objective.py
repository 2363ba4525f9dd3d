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

# Rows evaluated at once: what they need fits the processor's own cache.
CHUNK = 128


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
        # Complex, because numpy multiplies complex by complex faster than by real.
        self.weight: ComplexArray = np.where(used, 1.0 / np.where(scale > 0, scale, 1.0), 0j)
        self.used = used
        # For sums of squares each residual is turned by the measured phase, which alters none of
        # them: (Z_model − Z) w → Z_model w Z*/|Z| − w |Z|. The last term is 1 for modulus weights.
        modulus = np.abs(impedance)
        self._turned = self.weight * impedance.conj() / np.where(modulus > 0, modulus, 1.0)
        self._target: FloatArray | None = self.weight.real * modulus
        if deviation is None and used.all():
            self._target = None
        self.logarithmic = logarithmic
        self._inverse: ComplexArray = np.reciprocal(impedance) if logarithmic else impedance
        self._kept = np.empty(0, dtype=np.complex128)

    def residuals(self, theta: FloatArray, rows: IndexArray) -> ComplexArray:
        """Weighted residuals (B, N), complex; zero where a point is left out."""
        evaluation = self.model.evaluate(theta, self.grid)
        return self._residual(evaluation.impedance, rows)

    def cost(self, theta: FloatArray, rows: IndexArray) -> FloatArray:
        """S (B,); not finite where the model cannot be evaluated."""
        with np.errstate(over="ignore", invalid="ignore", divide="ignore"):
            flat = np.ascontiguousarray(self.residuals(theta, rows)).view(np.float64)
            total: FloatArray = np.vecdot(flat, flat)
        return total

    def _residual(self, modelled: ComplexArray, rows: IndexArray) -> ComplexArray:
        if not self.logarithmic:
            difference: ComplexArray = (modelled - self.measured[rows]) * self.weight[rows]
            return difference
        # ln|q| and the angle apart: numpy's complex logarithm takes ten times as long.
        quotient = modelled * self._inverse[rows]
        logarithm = np.empty_like(quotient)
        logarithm.real = np.log(np.abs(quotient))
        logarithm.imag = np.arctan2(quotient.imag, quotient.real)
        logarithm *= self.used[rows]
        return logarithm

    def _room(self, size: int, height: int) -> ComplexArray:
        """Room (size, height, N) that is used again: asking the system for it anew at every
        iteration takes longer than the arithmetic."""
        wanted = size * height * self.measured.shape[1]
        if self._kept.size < wanted:
            self._kept = np.empty(wanted, dtype=np.complex128)
        return self._kept[:wanted].reshape(size, height, -1)

    def misfit(self, theta: FloatArray, rows: IndexArray) -> FloatArray:
        """Σ |Z_model − Z|²/(|Z_model| |Z|) (B,): how far apart, alike whichever of the two is the
        larger, and quick; it is 4 sinh² of half the logarithmic residual where phases agree."""
        total = np.empty(len(theta))
        with np.errstate(over="ignore", invalid="ignore", divide="ignore"):
            for begun in range(0, len(theta), 4 * CHUNK):
                some = slice(begun, begun + 4 * CHUNK)
                own = rows[some]
                modelled = self.model.impedance(theta[some], self.grid)
                measured = self.measured[own]
                apart = np.abs(modelled - measured)
                apart *= apart
                apart /= np.abs(modelled) * np.abs(measured)
                total[some] = (apart * self.used[own]).sum(axis=1)
        return total

    def normal(
        self, theta: FloatArray, rows: IndexArray
    ) -> tuple[FloatArray, FloatArray, FloatArray]:
        """S, Jᵀr and JᵀJ as `solver.Objective` asks."""
        count, size = theta.shape
        total = np.empty(size)
        product = np.empty((count + 1, count, size))
        with np.errstate(over="ignore", invalid="ignore", divide="ignore"):
            for begun in range(0, size, CHUNK):
                some = slice(begun, begun + CHUNK)
                flat = self._stacked(theta.T[some], rows[some]).view(np.float64)
                own = flat @ flat[:, :count].transpose(0, 2, 1)
                product[:, :, some] = own.transpose(1, 2, 0)
                np.vecdot(flat[:, count], flat[:, count], out=total[some])
        return total, product[count], product[:count]

    def _stacked(self, theta: FloatArray, rows: IndexArray) -> ComplexArray:
        """The weighted Jacobian with the residual as one more row below it, (C, P + 1, N): a
        single product then gives JᵀJ and Jᵀr."""
        size, count = theta.shape
        stacked = self._room(size, count + 1)
        residual = stacked[:, count]
        evaluation = self.model.evaluate(theta, self.grid)
        if self.logarithmic:
            residual[...] = self._residual(evaluation.impedance, rows)
            factor: ComplexArray = np.reciprocal(evaluation.impedance)
            factor *= self.used[rows]
        else:
            factor = self._turned[rows]
            np.multiply(evaluation.impedance, factor, out=residual)
            residual.real -= 1.0 if self._target is None else self._target[rows]
        evaluation.derivatives(factor, stacked[:, :count])
        return stacked


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
        for point in theta.T:
            residual, jacobian = self._function(point)
            cost.append(residual @ residual)
            gradient.append(jacobian.T @ residual)
            normal.append(jacobian.T @ jacobian)
        return np.array(cost), np.stack(gradient, axis=-1), np.stack(normal, axis=-1)
