"""How much the points of a spectrum scatter, from sweeps repeated on the same panel.

Mathematics. Between two sweeps of one panel the ratio ln(Z₂/Z₁) holds what changed meanwhile, which
is smooth along the sweep, and twice the scatter's variance. The smooth part is taken as a
polynomial of degree 5 in ln f and removed from real and imaginary part alike; what remains, pooled
over all pairs and over five neighbouring points, gives the relative standard deviation of a point
at each frequency. Weights are 1/σ² then: the best weight is the measured variance (Agarwal, Orazem
& García-Rubio, J. Electrochem. Soc. 139 (1992) 1917).

Only ratios of weights matter to a fit, so the deviations are scaled to a root mean square of one.
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from coatgui.circuits.elements import ComplexArray
from coatgui.fitting.solver import BoolArray, FloatArray

_DEGREE = 5
_NEIGHBOURS = 2
_FEWEST_POINTS = 16
_ROUNDING = 1e-9
# A frequency that happened to repeat well does not earn more than this.
_SMALLEST_SHARE = 0.2


def scatter_of_repeats(
    frequency_hz: FloatArray, sweeps: Sequence[ComplexArray], used: Sequence[BoolArray]
) -> FloatArray | None:
    """Relative standard deviations (N,), scaled to a root mean square of one, from repeated sweeps
    (N,) of one panel in the order they were taken; None where two sweeps or 16 common points are
    lacking, or where the sweeps are the same numbers."""
    squares = np.zeros(frequency_hz.size)
    freedom = np.zeros(frequency_hz.size)
    basis = np.polynomial.chebyshev.chebvander(_to_unit(np.log(frequency_hz)), _DEGREE)
    for first, second, one, other in zip(sweeps, sweeps[1:], used, used[1:], strict=False):
        both = one & other
        if both.sum() < _FEWEST_POINTS:
            continue
        ratio = np.log(second[both] / first[both])
        own = basis[both]
        orthogonal, _ = np.linalg.qr(own)
        rest = ratio - orthogonal @ (orthogonal.T @ ratio)
        squares[both] += 0.5 * (rest.real**2 + rest.imag**2)
        # Each point keeps the share of itself that the polynomial did not take.
        freedom[both] += 2.0 * (1.0 - (orthogonal**2).sum(axis=1))
    if not freedom.any() or squares.sum() <= _ROUNDING**2 * freedom.sum():
        return None
    window = np.ones(2 * _NEIGHBOURS + 1)
    pooled = np.convolve(squares, window, "same") / np.maximum(
        np.convolve(freedom, window, "same"), 1e-12
    )
    pooled = np.maximum(pooled, _SMALLEST_SHARE**2 * np.median(pooled[freedom > 0]))
    if not (pooled > 0).all():
        return None
    deviation: FloatArray = np.sqrt(pooled / np.mean(pooled))
    return deviation


def _to_unit(values: FloatArray) -> FloatArray:
    low, high = float(values.min()), float(values.max())
    unit: FloatArray = 2.0 * (values - low) / (high - low) - 1.0
    return unit
