"""What a fitted circuit leaves over: faults too small for the measurement model."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
from types import ModuleType

import numpy as np
import pytest

from coatgui.circuits import catalogue
from coatgui.fitting import fit_spectra
from coatgui.quality import check_spectra, circuit_residuals
from coatgui.records import Bound, Finding, Fit, Settings, Severity, Spectrum

FREQUENCY = np.logspace(5, -2, 71)


def pores(**other: float) -> np.ndarray:
    model = catalogue()["pores_reacting_interface"]
    usual = {"R_s": 50.0, "Q_c": 1e-9, "n_c": 0.95, "R_po": 1e5, "Q_dl": 1e-6, "n_dl": 0.85}
    values = {**usual, "R_ct": 1e6, **other}
    theta = model.natural(np.array([[values[symbol] for symbol in model.symbols]]))
    return model.impedance(theta, FREQUENCY)[0].copy()


def noisy(z: np.ndarray, seed: int, share: float = 0.003) -> np.ndarray:
    rng = np.random.default_rng(seed)
    return z * (1 + share * (rng.standard_normal(z.size) + 1j * rng.standard_normal(z.size)))


def fitted(spectra: Sequence[Spectrum], used: np.ndarray | None = None) -> list[Fit]:
    number = len(spectra)
    fits = fit_spectra(
        spectra,
        [np.ones(len(s), dtype=bool) if used is None else used for s in spectra],
        area_cm2=[10.0] * number,
        series=[str(i) for i in range(number)],
        exposure_h=[0.0] * number,
        pinned=[""] * number,
    )
    return [fit for fit in fits if fit is not None]


def left_over(spectra: Sequence[Spectrum], **thresholds: float) -> list[Finding | None]:
    settings = Settings(thresholds=tuple(thresholds.items()))
    return circuit_residuals(spectra, fitted(spectra), settings=settings)


def test_a_step_too_small_for_the_checks_is_found_by_the_circuit() -> None:
    """2 % dying away, at 0.5 % of scatter."""
    z = pores()
    z[40:] *= np.exp(0.02 * np.exp(-0.1 * np.arange(z.size - 40)))
    spectra = [Spectrum(FREQUENCY, noisy(z, seed, 0.005)) for seed in range(40)]
    checks = check_spectra(spectra, settings=Settings(), area_cm2=[10.0] * 40)
    found = left_over(spectra)
    by_checks = sum("step" in {f.code for f in check.findings} for check in checks)
    steps = [f for f in found if f is not None and "a step up by" in f.text]
    assert by_checks < 20
    assert len(steps) >= 32
    for finding in steps:
        assert finding.code == "fit_leaves_pattern"
        assert finding.severity is Severity.DOUBT
        assert len(finding.points) == 2
        assert abs(finding.points[1] - 40) <= 2
        assert dict(finding.evidence)["percent"] == pytest.approx(2, abs=1)


def test_a_drift_is_named_with_its_side() -> None:
    elapsed = np.cumsum(1 / FREQUENCY) / np.sum(1 / FREQUENCY)
    spectra = [Spectrum(FREQUENCY, noisy(pores() * (1 - 0.06 * elapsed), i)) for i in range(20)]
    drifts = [f for f in left_over(spectra) if f is not None and "had run down" in f.text]
    assert len(drifts) >= 16
    assert all(f.points[-1] == 70 for f in drifts)


def test_the_leads_inductance_is_named() -> None:
    z = pores(Q_c=1e-8) + 1e-5j * 2 * np.pi * FREQUENCY
    named = [f for f in left_over([Spectrum(FREQUENCY, noisy(z, i)) for i in range(10)]) if f]
    assert len(named) >= 9
    assert all("inductance" in f.text for f in named)
    sizes = [dict(f.evidence)["inductance_h"] for f in named]
    assert np.median(sizes) == pytest.approx(1e-5, rel=0.2)
    assert all(f.points[0] == 0 for f in named)


@pytest.mark.parametrize("points", [20, 36, 71, 141])
def test_clean_spectra_are_left_in_peace(faults: ModuleType, points: int) -> None:
    rng = np.random.default_rng(31)
    grid = np.logspace(5, -2, points)
    spectra = [
        Spectrum(grid, faults.scattered(rng, s.impedance(grid), 10 ** rng.uniform(-2.7, -1.7)))
        for s in faults.specimens(rng, 50)
    ]
    found = circuit_residuals(spectra, fitted(spectra), settings=Settings())
    assert np.mean([f is not None for f in found]) <= 0.015


def test_a_circuit_that_lacks_something_else_is_not_called_a_step() -> None:
    """Residuals that follow one another all along: two arcs seen as one."""
    two = noisy(pores(), 1)
    (fit,) = fit_spectra(
        [Spectrum(FREQUENCY, two)],
        [np.ones(71, dtype=bool)],
        area_cm2=[10.0],
        series=["A"],
        exposure_h=[0.0],
        pinned=["film_with_pores"],
    )
    assert fit is not None
    assert fit.residual_rms_percent > 3
    assert circuit_residuals([Spectrum(FREQUENCY, two)], [fit], settings=Settings()) == [None]


def test_points_left_out_do_not_count() -> None:
    z = noisy(pores(), 2)
    used = np.ones(71, dtype=bool)
    used[60:] = False
    z[60:] *= 1.3
    spectra = [Spectrum(FREQUENCY, z)]
    assert circuit_residuals(spectra, fitted(spectra, used), settings=Settings()) == [None]


def test_a_fit_that_cannot_be_drawn_from_its_numbers_is_not_tested() -> None:
    z = pores()
    z[40:] *= 1.03
    spectra = [Spectrum(FREQUENCY, noisy(z, 1))]
    (fit,) = fitted(spectra)
    assert circuit_residuals(spectra, [fit], settings=Settings()) != [None]
    open_ones = tuple(
        replace(p, quantity=replace(p.quantity, value=None, bound=Bound.UNDETERMINED))
        for p in fit.parameters
    )
    lost = replace(fit, parameters=open_ones)
    assert circuit_residuals(spectra, [lost], settings=Settings()) == [None]


def test_many_are_answered_as_one_by_one_and_thresholds_can_be_set() -> None:
    z = pores()
    z[40:] *= 1.03
    spectra = [Spectrum(FREQUENCY, noisy(z if i % 2 else pores(), i)) for i in range(8)]
    many = left_over(spectra)
    assert [left_over([s])[0] is None for s in spectra] == [f is None for f in many]
    assert any(f is not None for f in many)
    assert left_over(
        spectra, fit_step_sigma=1e3, fit_drift_sigma=1e3, fit_inductance_sigma=1e3
    ) == ([None] * 8)
