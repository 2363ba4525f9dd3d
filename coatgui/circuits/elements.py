"""The elements that coating models are made of: impedance and analytic derivatives, for a batch.

Mathematics. With s = jω and exp(+jωt), each element has a complex impedance Z(ω; p). Fitting works
in *natural coordinates* θ: θ = ln p for every parameter that must be positive and may span decades
(R, C, Q, L, σ, τ, p), and θ = n itself for the exponent of a constant-phase element. Natural
coordinates make a capacitance of 1e-10 F and a resistance of 1e9 Ω equally easy to move, and the
derivatives become short (an element in parallel is asked for its admittance, whose derivative is as
short):

    resistor               Z = R                              ∂Z/∂lnR = Z
    capacitor              Z = 1/(jωC)                        ∂Z/∂lnC = −Z
    constant phase         Z = 1/(Q (jω)ⁿ)                    ∂Z/∂lnQ = −Z,  ∂Z/∂n = −Z ln(jω)
    inductor               Z = jωL                            ∂Z/∂lnL = Z
    semi-infinite diffusion  Z = σ(1−j)/√ω                    ∂Z/∂lnσ = Z
    finite diffusion, open far side    Z = R_D tanh z / z,    z = √(jωτ)
                                       ∂Z/∂lnτ = ½ R_D (1 − tanh²z − tanh z / z)
    finite diffusion, closed far side  Z = R_D coth z / z
                                       ∂Z/∂lnτ = −½ R_D (1/sinh²z + coth z / z)
    graded film            Z = (p/(jωC)) ln[(1 + jωτ e^{1/p})/(1 + jωτ)]   (Young 1955: conductivity
                           falling exponentially from the outside, p = penetration depth/thickness)

Sources: Warburg and the finite forms as in any text on impedance; the graded film as the integral
of dx/(σ₀ e^{−x/δ} + jωε), re-derived by quadrature in the tests. Every expression is written so
that no frequency overflows.

Shapes. B spectra share N angular frequencies. `theta` is (B, k) natural coordinates, results are
(B, N) complex (a resistor returns (B, 1), which broadcasts).
"""

from __future__ import annotations

from dataclasses import dataclass
from enum import StrEnum
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

FloatArray = NDArray[np.float64]
ComplexArray = NDArray[np.complex128]

# Beyond this exponent exp() overflows; the functions below are flat long before it.
_LARGEST_EXPONENT = 700.0


class Scale(StrEnum):
    """How a parameter is fitted: as its logarithm, or as it is."""

    LOGARITHM = "logarithm"
    PLAIN = "plain"


class Kind(StrEnum):
    """What a parameter is; it decides unit, scale, and how area enters."""

    RESISTANCE = "resistance"
    CAPACITANCE = "capacitance"
    CONSTANT_PHASE = "constant_phase"
    EXPONENT = "exponent"
    INDUCTANCE = "inductance"
    WARBURG = "warburg"
    TIME = "time"
    DEPTH = "depth"

    @property
    def scale(self) -> Scale:
        return Scale.PLAIN if self is Kind.EXPONENT else Scale.LOGARITHM

    @property
    def unit(self) -> str:
        return _UNITS[self]

    @property
    def area_power(self) -> int:
        """The power of the area that makes the parameter per cm²: R·A, C/A, n as it is."""
        return _AREA_POWERS[self]


_UNITS = {
    Kind.RESISTANCE: "Ω",
    Kind.CAPACITANCE: "F",
    Kind.CONSTANT_PHASE: "S·sⁿ",
    Kind.EXPONENT: "",
    Kind.INDUCTANCE: "H",
    Kind.WARBURG: "Ω·s^-½",
    Kind.TIME: "s",
    Kind.DEPTH: "",
}
_AREA_POWERS = {
    Kind.RESISTANCE: 1,
    Kind.CAPACITANCE: -1,
    Kind.CONSTANT_PHASE: -1,
    Kind.EXPONENT: 0,
    Kind.INDUCTANCE: 0,
    Kind.WARBURG: 1,
    Kind.TIME: 0,
    Kind.DEPTH: 0,
}


@dataclass(frozen=True, eq=False)
class Grid:
    """N angular frequencies (rad/s) shared by a batch, with what every element needs of them."""

    omega: FloatArray

    @classmethod
    def of_hertz(cls, frequency_hz: FloatArray) -> Grid:
        return cls(2.0 * np.pi * np.asarray(frequency_hz, dtype=np.float64))

    @cached_property
    def ln_omega(self) -> FloatArray:
        return np.log(self.omega)

    @cached_property
    def ln_j_omega(self) -> ComplexArray:
        return np.asarray(self.ln_omega + 0.5j * np.pi, dtype=np.complex128)

    @cached_property
    def inverse_j_omega(self) -> ComplexArray:
        return np.asarray(-1j / self.omega, dtype=np.complex128)

    @cached_property
    def warburg(self) -> ComplexArray:
        return np.asarray((1.0 - 1.0j) / np.sqrt(self.omega), dtype=np.complex128)


class Element:
    """One element. `kinds` lists its parameters in order."""

    kinds: tuple[Kind, ...] = ()

    def impedance(self, grid: Grid, theta: FloatArray) -> ComplexArray:
        """Impedance in Ω, (B, N) or (B, 1), at natural coordinates `theta` (B, k)."""
        raise NotImplementedError

    def derivatives(
        self,
        grid: Grid,
        theta: FloatArray,
        impedance: ComplexArray,
        factor: ComplexArray,
        out: ComplexArray,
    ) -> None:
        """Write factor·∂Z/∂θ into `out` (B, k, N). `impedance` is what `impedance` gave for the
        same `theta`; `factor` (B, N) is how the whole model answers to this element."""
        raise NotImplementedError

    def admittance(self, grid: Grid, theta: FloatArray) -> ComplexArray:
        """Admittance 1/Z in S, for an element in parallel with others. Elements that can give it
        without a division do: division costs ten times a multiplication."""
        result: ComplexArray = np.reciprocal(self.impedance(grid, theta))
        return result

    def admittance_derivatives(
        self,
        grid: Grid,
        theta: FloatArray,
        admittance: ComplexArray,
        factor: ComplexArray,
        out: ComplexArray,
    ) -> None:
        """Write factor·∂(1/Z)/∂θ into `out` (B, k, N); arguments as for `derivatives`."""
        passed = -factor * admittance * admittance
        self.derivatives(grid, theta, np.reciprocal(admittance), passed, out)


class Resistor(Element):
    kinds = (Kind.RESISTANCE,)

    def impedance(self, grid: Grid, theta: FloatArray) -> ComplexArray:
        return np.exp(theta).astype(np.complex128)

    def derivatives(
        self,
        grid: Grid,
        theta: FloatArray,
        impedance: ComplexArray,
        factor: ComplexArray,
        out: ComplexArray,
    ) -> None:
        # A real factor: twice as fast as multiplying by a complex one.
        np.multiply(factor, np.exp(theta), out=out[:, 0])

    def admittance(self, grid: Grid, theta: FloatArray) -> ComplexArray:
        return np.exp(-theta).astype(np.complex128)

    def admittance_derivatives(
        self,
        grid: Grid,
        theta: FloatArray,
        admittance: ComplexArray,
        factor: ComplexArray,
        out: ComplexArray,
    ) -> None:
        np.multiply(factor, -np.exp(-theta), out=out[:, 0])


class _Proportional(Element):
    """Z = scale(p)·shape(ω): one parameter, whose logarithmic derivative is ±Z."""

    sign = 1.0

    def shape(self, grid: Grid) -> ComplexArray:
        raise NotImplementedError

    def impedance(self, grid: Grid, theta: FloatArray) -> ComplexArray:
        result: ComplexArray = np.exp(self.sign * theta) * self.shape(grid)
        return result

    def derivatives(
        self,
        grid: Grid,
        theta: FloatArray,
        impedance: ComplexArray,
        factor: ComplexArray,
        out: ComplexArray,
    ) -> None:
        np.multiply(factor, impedance if self.sign > 0 else -impedance, out=out[:, 0])

    def admittance(self, grid: Grid, theta: FloatArray) -> ComplexArray:
        result: ComplexArray = np.exp(-self.sign * theta) * np.reciprocal(self.shape(grid))
        return result

    def admittance_derivatives(
        self,
        grid: Grid,
        theta: FloatArray,
        admittance: ComplexArray,
        factor: ComplexArray,
        out: ComplexArray,
    ) -> None:
        np.multiply(factor, admittance if self.sign < 0 else -admittance, out=out[:, 0])


class Capacitor(_Proportional):
    kinds = (Kind.CAPACITANCE,)
    sign = -1.0

    def shape(self, grid: Grid) -> ComplexArray:
        return grid.inverse_j_omega


class Inductor(_Proportional):
    kinds = (Kind.INDUCTANCE,)

    def shape(self, grid: Grid) -> ComplexArray:
        return np.asarray(1j * grid.omega, dtype=np.complex128)


class SemiInfiniteDiffusion(_Proportional):
    """Warburg: σ(1−j)/√ω."""

    kinds = (Kind.WARBURG,)

    def shape(self, grid: Grid) -> ComplexArray:
        return grid.warburg


class ConstantPhase(Element):
    kinds = (Kind.CONSTANT_PHASE, Kind.EXPONENT)

    def impedance(self, grid: Grid, theta: FloatArray) -> ComplexArray:
        n = theta[:, 1:2]
        turned: ComplexArray = np.exp(-theta[:, 0:1] - n * grid.ln_omega) * np.exp(
            -0.5j * np.pi * n
        )
        return turned

    def derivatives(
        self,
        grid: Grid,
        theta: FloatArray,
        impedance: ComplexArray,
        factor: ComplexArray,
        out: ComplexArray,
    ) -> None:
        first = out[:, 0]
        np.multiply(factor, impedance, out=first)
        np.negative(first, out=first)
        np.multiply(first, grid.ln_j_omega, out=out[:, 1])

    def admittance(self, grid: Grid, theta: FloatArray) -> ComplexArray:
        n = theta[:, 1:2]
        turned: ComplexArray = np.exp(theta[:, 0:1] + n * grid.ln_omega) * np.exp(0.5j * np.pi * n)
        return turned

    def admittance_derivatives(
        self,
        grid: Grid,
        theta: FloatArray,
        admittance: ComplexArray,
        factor: ComplexArray,
        out: ComplexArray,
    ) -> None:
        first = out[:, 0]
        np.multiply(factor, admittance, out=first)
        np.multiply(first, grid.ln_j_omega, out=out[:, 1])


class _FiniteDiffusion(Element):
    kinds = (Kind.RESISTANCE, Kind.TIME)

    @staticmethod
    def _root(grid: Grid, theta: FloatArray) -> tuple[ComplexArray, ComplexArray]:
        """z = √(jωτ) and e^{−2z}; the real part of z is positive, so e^{−2z} cannot overflow."""
        root = np.exp(0.5 * (grid.ln_omega + theta[:, 1:2])) * np.sqrt(0.5)
        z = root * (1.0 + 1.0j)
        return z, np.exp(-2.0 * z)

    def _form(self, grid: Grid, theta: FloatArray) -> tuple[ComplexArray, ComplexArray]:
        """F = Z/R_D and ∂F/∂lnτ."""
        raise NotImplementedError

    def impedance(self, grid: Grid, theta: FloatArray) -> ComplexArray:
        result: ComplexArray = np.exp(theta[:, 0:1]) * self._form(grid, theta)[0]
        return result

    def derivatives(
        self,
        grid: Grid,
        theta: FloatArray,
        impedance: ComplexArray,
        factor: ComplexArray,
        out: ComplexArray,
    ) -> None:
        np.multiply(factor, impedance, out=out[:, 0])
        slope = self._form(grid, theta)[1]
        np.multiply(factor, np.exp(theta[:, 0:1]) * slope, out=out[:, 1])


class OpenDiffusion(_FiniteDiffusion):
    """Finite diffusion layer with an open far side: R_D tanh z / z, levelling off at R_D."""

    def _form(self, grid: Grid, theta: FloatArray) -> tuple[ComplexArray, ComplexArray]:
        z, decay = self._root(grid, theta)
        tanh = -np.expm1(-2.0 * z) / (1.0 + decay)
        form = tanh / z
        return form, 0.5 * (1.0 - tanh * tanh - form)


class ClosedDiffusion(_FiniteDiffusion):
    """Finite diffusion layer with a closed far side: R_D coth z / z, a capacitor at the end."""

    def _form(self, grid: Grid, theta: FloatArray) -> tuple[ComplexArray, ComplexArray]:
        z, decay = self._root(grid, theta)
        gap = -np.expm1(-2.0 * z)
        form = (1.0 + decay) / (gap * z)
        return form, -0.5 * (4.0 * decay / (gap * gap) + form)


class GradedFilm(Element):
    """A film whose conductivity falls exponentially from the outside (Young 1955)."""

    kinds = (Kind.CAPACITANCE, Kind.TIME, Kind.DEPTH)

    @staticmethod
    def _logarithm(exponent: FloatArray) -> ComplexArray:
        """ln(1 + j e^a) for real a of any size."""
        real: FloatArray = 0.5 * np.logaddexp(0.0, 2.0 * exponent)
        return real + 1j * np.arctan(np.exp(np.minimum(exponent, _LARGEST_EXPONENT)))

    @staticmethod
    def _fraction(exponent: FloatArray) -> ComplexArray:
        """j e^a / (1 + j e^a) for real a of any size: the slope of the above with a."""
        tail = np.exp(-np.minimum(np.abs(exponent), _LARGEST_EXPONENT))
        square = tail * tail
        rising = np.where(exponent > 0, 1.0, square) / (1.0 + square)
        return rising + 1j * tail / (1.0 + square)

    def _parts(
        self, grid: Grid, theta: FloatArray
    ) -> tuple[ComplexArray, FloatArray, FloatArray, FloatArray]:
        depth = np.exp(theta[:, 2:3])
        inner = grid.ln_omega + theta[:, 1:2]
        scale = depth * np.exp(-theta[:, 0:1]) * grid.inverse_j_omega
        return scale, inner, inner + 1.0 / depth, depth

    def impedance(self, grid: Grid, theta: FloatArray) -> ComplexArray:
        scale, inner, outer, _ = self._parts(grid, theta)
        return scale * (self._logarithm(outer) - self._logarithm(inner))

    def derivatives(
        self,
        grid: Grid,
        theta: FloatArray,
        impedance: ComplexArray,
        factor: ComplexArray,
        out: ComplexArray,
    ) -> None:
        scale, inner, outer, depth = self._parts(grid, theta)
        rise = self._fraction(outer)
        np.multiply(factor, -impedance, out=out[:, 0])
        np.multiply(factor, scale * (rise - self._fraction(inner)), out=out[:, 1])
        np.multiply(factor, impedance - scale * rise / depth, out=out[:, 2])
