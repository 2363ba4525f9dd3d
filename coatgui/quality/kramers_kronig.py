"""Kramers–Kronig by a linear measurement model (Boukamp, J. Electrochem. Soc. 142 (1995) 1885).

Mathematics. What obeys the Kramers–Kronig relations can be written as R_∞ + Σ R_k/(1 + jωτ_k) with
fixed, log-spaced τ_k; a film that blocks needs 1/(jωC) beside it, leads need jωL. The model is
linear in R_k, so one small least-squares problem, weighted by 1/|Z|, tests a spectrum without
knowing its circuit. A blocking film is better said in admittances: 1/R + jωC + Σ jωC_k/(1 + jωτ_k).
Both forms are fitted and the better one kept. A small ridge, by generalised cross-validation,
replaces the choice of a number of terms: with many τ_k and none too free, the model follows any
causal spectrum down to its scatter but not a wild point. Points that stand far off are given less
weight (Tukey's biweight) and the fit repeated, so that one does not smear over its neighbours.

Spectra on one grid share the basis and its decomposition; all are solved together.
"""

from __future__ import annotations

import numpy as np

from coatgui.records import BoolArray, ComplexArray, FloatArray

_TERMS_PER_DECADE = 4.0
_RIDGES = np.logspace(-18, -2, 9)
_ROUNDS = 4
_BIWEIGHT = 6.0


def _basis(omega: FloatArray, admittance: bool) -> ComplexArray:
    """Columns (N, K) of the measurement model."""
    low, high = np.log10(1.0 / omega.max()) - 1.0, np.log10(1.0 / omega.min()) + 1.0
    count = max(int(np.ceil((high - low) * _TERMS_PER_DECADE)), 4)
    tau = np.logspace(low, high, count)
    relaxation = 1.0 / (1.0 + 1j * omega[:, None] * tau)
    one = np.ones((omega.size, 1), dtype=np.complex128)
    s = 1j * omega[:, None]
    if admittance:
        return np.hstack([one, s, s * tau * relaxation])
    return np.hstack([one, s, 1.0 / s, relaxation])


def _stacked(values: ComplexArray) -> FloatArray:
    return np.concatenate([values.real, values.imag], axis=0)


def _solve(basis: ComplexArray, target: ComplexArray, weight: FloatArray) -> ComplexArray:
    """Modelled values (N,) of one spectrum, with the ridge of the best cross-validation score."""
    matrix = _stacked(basis * weight[:, None])
    size = np.sqrt((matrix**2).sum(axis=0))
    size[size == 0] = 1.0
    right = _stacked(target * weight)
    u, singular, vt = np.linalg.svd(matrix / size, full_matrices=False)
    along = u.T @ right
    outside = max(float(right @ right - along @ along), 0.0)
    counted = 2.0 * np.count_nonzero(weight)
    best: tuple[float, FloatArray] | None = None
    for ridge in _RIDGES:
        damp = singular**2 / (singular**2 + ridge * singular[0] ** 2)
        residual = float((((1.0 - damp) * along) ** 2).sum()) + outside
        score = residual / max(counted - 1.4 * damp.sum(), 1.0) ** 2
        if best is None or score < best[0]:
            best = (score, vt.T @ (damp / singular * along))
    assert best is not None
    return np.asarray(basis @ (best[1] / size), dtype=np.complex128)


def residuals(
    frequency_hz: FloatArray, impedance: ComplexArray, used: BoolArray
) -> tuple[ComplexArray, FloatArray]:
    """Residuals (B, N) of the measurement model relative to |Z|, and the usual scatter (B,) of one
    part of them (robust standard deviation). `impedance` and `used` are (B, N); points not used do
    not shape the model but have their residual."""
    omega = 2.0 * np.pi * frequency_hz
    result = np.empty(impedance.shape, dtype=np.complex128)
    scatter = np.empty(impedance.shape[0])
    forms = [(form, _basis(omega, form)) for form in (False, True)]
    for row, z in enumerate(impedance):
        best: tuple[float, ComplexArray] | None = None
        for admittance, basis in forms:
            target = 1.0 / z if admittance else z
            weight = used[row] / np.abs(target)
            trust = np.ones(z.size)
            for _ in range(_ROUNDS):
                modelled = _solve(basis, target, weight * trust)
                model_z = 1.0 / modelled if admittance else modelled
                off = (model_z - z) / np.abs(z)
                spread = max(_spread(off[used[row]]), 1e-6)
                distance = np.abs(off) / (np.sqrt(2.0) * spread * _BIWEIGHT)
                trust = np.where(distance < 1.0, (1.0 - np.minimum(distance, 1.0) ** 2) ** 2, 0.0)
                if np.count_nonzero(trust * used[row]) < 6:
                    trust = np.ones(z.size)
            if best is None or spread < best[0]:
                best = (spread, off)
        assert best is not None
        scatter[row], result[row] = best
    return result, scatter


def _spread(values: ComplexArray) -> float:
    parts = np.concatenate([values.real, values.imag])
    return float(1.4826 * np.median(np.abs(parts)))
