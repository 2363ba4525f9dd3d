"""Kramers–Kronig by a linear measurement model, in the logarithm of the impedance.

Mathematics. Boukamp's test (J. Electrochem. Soc. 142 (1995) 1885) lays a sum of relaxations with
fixed, log-spaced time constants on the data: linear, so that a causal and stable spectrum is
followed down to its scatter without knowing its circuit, and what cannot be followed breaks the
Kramers–Kronig relations. A passive specimen has neither zeros nor poles in the right half-plane,
so that the logarithm of its impedance obeys the same relations (Bode, Network Analysis and
Feedback Amplifier Design, 1945, from memory: the phase follows from the modulus), and

    ln Z = c - Σ θ_k [ln(1 + jωτ_{k+1}) - ln(1 + jωτ_k)],   τ_k fixed, log-spaced,

is linear as well. -θ_k·90° is about the phase at 1/τ_k, so no |θ_k| is much above 1. With the first
τ at 0 and the last at infinity a blocking film is part of the model (θ = 1 up to infinity is the
series capacitance), leads are (θ = -1 down to 0), and ln Y = -ln Z makes the form in impedances and
the form in admittances one and the same. The error of ln Z is the relative error of Z, so every
point has the same weight and all spectra on one grid share one decomposition: testing many of them
is one product of matrices.

Number of terms. As |θ| is about 1 at most, a singular direction of the basis with singular value s
carries about s of ln Z: directions well below the scatter are not offered, for they could only
follow what is no panel, and those above it are all needed. Where between to stop is left to
generalised cross-validation, for each spectrum by itself.
"""

from __future__ import annotations

from functools import lru_cache

import numpy as np

from coatgui.records import ComplexArray, FloatArray

_INTERVALS_PER_DECADE = 3.0  # a relaxation between two of them is met to 1e-5
_BEYOND = 1.0  # decades of time constants beyond the window, either side
_CONSTANT = 30.0  # the modulus itself is free: ln|Z| goes up to about this
_LEVELS = (3e-2, 1e-2, 2e-3, 1.5e-4)
_USUAL = 1  # the level that shows the scatter
_ALIKE = 1e-4  # of ln f
# Terms count for more than one each, lest those that follow scatter or a fault be taken: about 1.4
# (Kim & Gu, J. R. Statist. Soc. B 66 (2004) 337, from memory).
_COUNTED = 1.4
_SAYING = (0.05, 5.0)  # singular values, in units of the scatter, where the levels may end


def parts(values: ComplexArray) -> FloatArray:
    """Real parts, then imaginary parts, along the last axis: (…, N) to (…, 2N)."""
    return np.concatenate([values.real, values.imag], axis=-1)


def complexes(values: FloatArray) -> ComplexArray:
    """The way back: (…, 2N) to (…, N)."""
    half = values.shape[-1] // 2
    return values[..., :half] + 1j * values[..., half:]


class MeasurementModel:
    """The model on one grid of N frequencies. `directions` (2N, K) are orthonormal, the most
    important first; `levels` are numbers of them to choose from. Where `testable` is False the grid
    is too sparse: the model has nearly as many terms as there are numbers, and tests nothing."""

    def __init__(self, frequency_hz: FloatArray) -> None:
        self.frequency_hz = frequency_hz
        s = 2j * np.pi * frequency_hz[:, None]
        low = -np.log10(np.abs(s).max()) - _BEYOND
        high = -np.log10(np.abs(s).min()) + _BEYOND
        tau = np.logspace(low, high, int(np.ceil((high - low) * _INTERVALS_PER_DECADE)) + 1)
        logs = np.log1p(s * tau)
        basis = np.hstack(
            [
                np.full_like(s, _CONSTANT),
                logs[:, :1],
                np.diff(logs, axis=1),
                np.log(s * tau[-1]) - logs[:, -1:],
            ]
        )
        u, singular, _ = np.linalg.svd(parts(basis.T).T, full_matrices=False)
        # Few points cannot hold many terms: at least half of the numbers stay free.
        needed = [int((singular > level).sum()) for level in _LEVELS]
        self.levels = tuple(min(count, frequency_hz.size) for count in needed)
        self.testable = needed[0] < frequency_hz.size
        self.directions: FloatArray = u[:, : self.levels[-1]]

    def level(self, logarithm: FloatArray) -> list[int]:
        """For each of (B, 2N) stacked logarithms the number of directions to keep."""
        usual = self.residuals(logarithm, self.levels[_USUAL])
        scatter = 1.4826 * np.median(np.abs(usual), axis=1)
        squares = np.cumsum((logarithm @ self.directions) ** 2, axis=1)
        whole = (logarithm**2).sum(axis=1)
        # The finest of all is for spectra that hardly scatter.
        scatter = np.maximum(scatter, 1.01 * _LEVELS[-1] / _SAYING[1])
        scores = [
            np.where(
                (level > _SAYING[0] * scatter) & (level < _SAYING[1] * scatter),
                np.maximum(whole - squares[:, k - 1], 0.0)
                / (1.0 - _COUNTED * k / logarithm.shape[1]) ** 2,
                np.inf,
            )
            for k, level in zip(self.levels, _LEVELS, strict=True)
        ]
        return [self.levels[place] for place in np.argmin(scores, axis=0)]

    def residuals(self, logarithm: FloatArray, kept: int) -> FloatArray:
        """What `kept` directions leave of (B, 2N)."""
        u = self.directions[:, :kept]
        return np.asarray(logarithm - (logarithm @ u) @ u.T, dtype=np.float64)


def grid_key(frequency_hz: FloatArray) -> bytes:
    """What tells grids (N,) apart for the model: ratios of frequencies, for the time constants are
    laid by the window, and to 1e-4, which moves ln Z by as much at most."""
    ratios = np.log(frequency_hz / frequency_hz[0])
    return bytes((np.round(ratios / _ALIKE) * _ALIKE + 0.0).tobytes())


@lru_cache(maxsize=256)
def _model(key: bytes) -> MeasurementModel:
    return MeasurementModel(np.exp(np.frombuffer(key, dtype=np.float64)))


def measurement_model(frequency_hz: FloatArray) -> MeasurementModel:
    """The model on a grid (N,), kept for the next spectrum on a grid of the same ratios; its own
    frequencies are relative to the first."""
    return _model(grid_key(frequency_hz))
