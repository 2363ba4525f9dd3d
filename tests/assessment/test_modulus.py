"""|Z|·A at wanted frequencies: measured, interpolated, never beyond; leads make it a bound."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from coatgui.assessment.modulus import Grid, grids, moduli, relative_scatter
from coatgui.records import Bound, Fit, Modulus, ModulusStatus, Spectrum

Made = Callable[..., tuple[Spectrum, Fit]]
CLOSED = {"R_s": 50.0, "Q_c": 1e-9, "n_c": 0.97}


def _all(spectrum: Spectrum) -> np.ndarray:
    return np.ones(len(spectrum), dtype=np.bool_)


def _one(
    spectrum: Spectrum,
    frequency_hz: float,
    *,
    area_cm2: float | None = 10.0,
    fit: Fit | None = None,
    open_lead: Spectrum | None = None,
) -> Modulus:
    on = grids([spectrum], [_all(spectrum)], [fit])
    ((modulus,),) = moduli(on, [area_cm2], [frequency_hz], open_lead)
    return modulus


def test_point_on_the_frequency_is_measured() -> None:
    spectrum = Spectrum(np.array([10.0, 1.0, 0.1004]), np.array([1e5, 1e6, 1e7 - 3e6j]))
    modulus = _one(spectrum, 0.1)
    assert modulus.status is ModulusStatus.MEASURED
    assert modulus.quantity is not None
    assert modulus.quantity.value == pytest.approx(10 * abs(1e7 - 3e6j))
    assert modulus.quantity.unit == "Ω cm²"


@given(
    slope=st.floats(-1.0, 0.0),
    frequency=st.floats(0.011, 9e4),
    gap=st.integers(2, 12),
)
def test_interpolation_is_exact_on_a_power_law(slope: float, frequency: float, gap: int) -> None:
    grid = np.geomspace(1e5, 1e-2, 7 * gap)
    spectrum = Spectrum(grid, 1e8 * grid**slope * np.exp(0.3j))
    status, ohm = Grid([0], [spectrum], _all(spectrum), [None]).modulus(frequency)
    near = 0.006 if status is ModulusStatus.MEASURED else 1e-9
    assert ohm[0] == pytest.approx(1e8 * frequency**slope, rel=near)


@pytest.mark.parametrize("frequency", [0.05, 2e5])
def test_outside_the_measured_range_nothing_is_said(frequency: float) -> None:
    spectrum = Spectrum(np.geomspace(1e5, 0.1, 31), np.full(31, 1e6 + 0j))
    modulus = _one(spectrum, frequency)
    assert modulus.status is ModulusStatus.NOT_REACHED
    assert modulus.quantity is None


def test_points_left_out_do_not_count_as_measured() -> None:
    spectrum = Spectrum(np.array([1.0, 0.1, 0.01]), np.array([1e6, 9e9, 1e8 + 0j]))
    used = np.array([True, False, True])
    status, ohm = Grid([0], [spectrum], used, [None]).modulus(0.1)
    assert status is ModulusStatus.INTERPOLATED
    assert ohm == pytest.approx([1e7])
    for mask, wanted in ([True, True, False], 0.01), ([False] * 3, 0.1):
        status, ohm = Grid([0], [spectrum], np.array(mask), [None]).modulus(wanted)
        assert status is ModulusStatus.NOT_REACHED
        assert not ohm.size


def test_limits_are_the_scatter_of_the_fit(made: Made) -> None:
    spectrum, fit = made(CLOSED, scatter=1.0)
    quantity = _one(spectrum, 0.1, fit=fit).quantity
    assert quantity is not None
    assert quantity.bound is Bound.TWO_SIDED
    assert quantity.value is not None
    assert quantity.low == pytest.approx(quantity.value * np.exp(-0.0196), rel=1e-4)
    assert quantity.high == pytest.approx(quantity.value * np.exp(0.0196), rel=1e-4)


@pytest.mark.parametrize("noise", [0.002, 0.02])
def test_without_a_fit_the_scatter_comes_from_the_curve_itself(made: Made, noise: float) -> None:
    clean, _ = made(CLOSED)
    random = np.random.default_rng(5)
    shake = 1 + noise * (
        random.standard_normal(len(clean)) + 1j * random.standard_normal(len(clean))
    )
    noisy = Spectrum(clean.frequency_hz, clean.impedance_ohm * shake)
    assert relative_scatter(noisy, _all(noisy), None, 0.1) == pytest.approx(noise, rel=0.35)


def test_area_scales_and_its_absence_is_per_specimen(made: Made) -> None:
    spectrum, fit = made(CLOSED)
    ten = _one(spectrum, 0.1, fit=fit).quantity
    bare = _one(spectrum, 0.1, fit=fit, area_cm2=None).quantity
    assert ten is not None
    assert bare is not None
    assert bare.value is not None
    assert ten.value == pytest.approx(10 * bare.value)
    assert bare.unit == "Ω"


def _with_leads(film_ohm: float, leads_ohm: float) -> tuple[Spectrum, Spectrum]:
    grid = np.geomspace(1e5, 1e-2, 71)
    film = 1 / (1 / film_ohm + 1 / leads_ohm)
    return Spectrum(grid, np.full(71, film + 0j)), Spectrum(grid, np.full(71, leads_ohm + 0j))


def test_leads_close_to_the_value_make_it_a_lower_bound() -> None:
    spectrum, leads = _with_leads(2e11, 6e11)
    quantity = _one(spectrum, 0.1, open_lead=leads).quantity
    assert quantity is not None
    assert quantity.bound is Bound.AT_LEAST
    assert quantity.high is None
    assert quantity.value == quantity.low
    assert quantity.value is not None
    assert quantity.value <= 2e12
    assert "leads" in quantity.method


def test_leads_further_away_are_inside_the_upper_limit() -> None:
    spectrum, leads = _with_leads(4e10, 6e11)
    quantity = _one(spectrum, 0.1, open_lead=leads).quantity
    assert quantity is not None
    assert quantity.bound is Bound.TWO_SIDED
    assert quantity.low is not None
    assert quantity.high is not None
    assert quantity.low <= 4e11 <= quantity.high * (1 + 1e-9)
