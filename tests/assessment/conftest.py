"""Hand-made fits and readings, so that quantities are tested apart from the fitting."""

from __future__ import annotations

from collections.abc import Callable, Mapping

import numpy as np
import pytest

from coatgui.records import (
    Bound,
    Fit,
    Modulus,
    ModulusStatus,
    Parameter,
    Quantity,
    ReadingAssessment,
    Spectrum,
    WaterUptake,
)

FREQUENCY_HZ = np.geomspace(1e5, 1e-2, 71)
_UNITS = {"Q": "S·sⁿ", "n": "", "R": "Ω", "σ": "Ω·s^-½"}


def _circuit(values: Mapping[str, float], frequency_hz: np.ndarray) -> np.ndarray:
    """R_s + [Q_c ∥ (R_po + [Q_dl ∥ R_ct])]; what is not in `values` is not there."""
    s = 2j * np.pi * frequency_hz
    inner: np.ndarray | None = None
    if "Q_dl" in values:
        admittance = values["Q_dl"] * s ** values["n_dl"]
        if "R_ct" in values:
            admittance = admittance + 1 / values["R_ct"]
        inner = 1 / admittance
    if "R_po" in values:
        inner = values["R_po"] + (0 if inner is None else inner)
    if "Q_c" in values:
        admittance = values["Q_c"] * s ** values["n_c"]
        inner = 1 / (admittance if inner is None else admittance + 1 / inner)
    assert inner is not None
    return np.asarray(values.get("R_s", 0.0) + inner, dtype=np.complex128)


@pytest.fixture
def circuit() -> Callable[..., np.ndarray]:
    return _circuit


@pytest.fixture
def made() -> Callable[..., tuple[Spectrum, Fit]]:
    """`made(values, percent=…, scatter=…, bounds=…)`: an exact spectrum of the circuit and a fit
    that found its values, each with a relative standard error of `percent`."""

    def make(
        values: Mapping[str, float],
        *,
        percent: float = 1.0,
        scatter: float = 0.5,
        bounds: Mapping[str, Bound] | None = None,
        covariance: np.ndarray | None = None,
        model: str = "film_with_pores",
        frequency_hz: np.ndarray = FREQUENCY_HZ,
    ) -> tuple[Spectrum, Fit]:
        impedance = _circuit(values, frequency_hz)
        spread = np.exp(1.96 * percent / 100)
        parameters = []
        for layer, (symbol, value) in enumerate(values.items()):
            bound = (bounds or {}).get(symbol, Bound.TWO_SIDED)
            quantity = Quantity(
                value,
                None if bound in (Bound.AT_MOST, Bound.FIXED) else value / spread,
                None if bound in (Bound.AT_LEAST, Bound.FIXED) else value * spread,
                bound,
                _UNITS[symbol[0]],
            )
            parameters.append(Parameter(symbol, symbol, layer, quantity))
        spectrum = Spectrum(frequency_hz, impedance)
        fit = Fit(
            model=model,
            model_name=model.replace("_", " "),
            parameters=tuple(parameters),
            modelled_ohm=spectrum.impedance_ohm,
            used=np.ones(len(spectrum), dtype=np.bool_),
            residual_rms_percent=scatter,
            converged=True,
            message="",
            log_covariance=covariance,
        )
        return spectrum, fit

    return make


@pytest.fixture
def reading_of() -> Callable[..., ReadingAssessment]:
    """A reading's assessment with a modulus at 0.1 Hz and, perhaps, an uptake; nothing else."""

    def make(
        formulation: str,
        panel: str,
        exposure_h: float,
        ohm_cm2: float | None,
        *,
        bound: Bound = Bound.TWO_SIDED,
        unit: str = "Ω cm²",
        uptake: float | None = None,
        counts: bool = True,
        percent: float = 0.5,
    ) -> ReadingAssessment:
        quantity = None
        if ohm_cm2 is not None:
            spread = 1 + 1.96 * percent / 100
            high = None if bound is Bound.AT_LEAST else ohm_cm2 * spread
            low = ohm_cm2 if bound is Bound.AT_LEAST else ohm_cm2 / spread
            quantity = Quantity(ohm_cm2, low, high, bound, unit)
        status = ModulusStatus.NOT_REACHED if quantity is None else ModulusStatus.MEASURED
        water = None
        if uptake is not None:
            percent = Quantity(uptake, uptake - 0.1, uptake + 0.1, Bound.TWO_SIDED, "vol-%")
            water = WaterUptake(percent, 0.0)
        return ReadingAssessment(
            reading_id=f"{panel}-{exposure_h}",
            panel_id=panel,
            panel=panel,
            formulation=formulation,
            exposure_h=exposure_h,
            file="",
            sha256="",
            points_read=71,
            points_used=71,
            left_out=(),
            findings=(),
            counts=counts,
            modulus=(Modulus(0.1, status, quantity),),
            fit=None,
            parameters=(),
            coating_capacitance=None,
            capacitance_at_high_frequency=None,
            pore_resistance=None,
            water_uptake=water,
        )

    return make
