"""The capacitance laws: their limit n → 1, their check values, their limits, their choice."""

from __future__ import annotations

import math
from collections.abc import Callable

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from coatgui.assessment.amounts import log_deviation
from coatgui.assessment.capacitance import Capacitances, at_frequency, brug, hsu_mansfeld
from coatgui.assessment.measured_capacitance import measured_capacitances
from coatgui.assessment.modulus import grids
from coatgui.records import Bound, Finding, Fit, Quantity, Spectrum

Made = Callable[..., tuple[Spectrum, Fit]]
PORES = {"R_s": 50.0, "Q_c": 2e-10, "n_c": 0.95, "R_po": 1e6, "Q_dl": 1e-7, "n_dl": 0.85}


def film_capacitance(
    fit: Fit,
    spectrum: Spectrum,
    frequency_hz: float,
    area_cm2: float | None,
    open_lead: Spectrum | None = None,
) -> Quantity | None:
    (found,) = Capacitances([fit], [spectrum], [area_cm2], open_lead).film(frequency_hz)
    return found


def hsu_mansfeld_capacitance(
    fit: Fit, spectrum: Spectrum, area_cm2: float | None
) -> Quantity | None:
    (found,) = Capacitances([fit], [spectrum], [area_cm2]).hsu_mansfeld()
    return found


def interface_capacitance(fit: Fit, spectrum: Spectrum, area_cm2: float) -> Quantity | None:
    (found,) = Capacitances([fit], [spectrum], [area_cm2]).interface()
    return found


def measured_capacitance(
    spectrum: Spectrum,
    used: np.ndarray,
    fit: Fit,
    frequency_hz: float,
    area_cm2: float | None,
    open_lead: Spectrum | None = None,
) -> tuple[Quantity | None, Finding | None]:
    on = grids([spectrum], [used], [fit])
    (found,) = measured_capacitances(on, frequency_hz, [area_cm2], open_lead)
    return found


@given(q=st.floats(1e-12, 1e-4), r=st.floats(1e2, 1e12), f=st.floats(1e-2, 1e6))
def test_every_law_returns_q_for_n_of_one(q: float, r: float, f: float) -> None:
    for n, near in ((1.0, 1e-12), (1 - 1e-7, 1e-5)):
        assert hsu_mansfeld(q, n, r) == pytest.approx(q, rel=near)
        assert brug(q, n, 1 / r) == pytest.approx(q, rel=near)
        assert at_frequency(q, n, f) == pytest.approx(q, rel=near)


@given(q=st.floats(1e-11, 1e-6), n=st.floats(0.75, 1.0), r=st.floats(1e4, 1e9))
def test_laws_agree_with_the_impedance_they_stand_for(q: float, n: float, r: float) -> None:
    """Hsu and Mansfeld's C turns over with R where the parallel Q does; the capacitance at one
    frequency has the same imaginary admittance there as the element."""
    turning = (r * q) ** (-1 / n)
    assert 1 / (r * hsu_mansfeld(q, n, r)) == pytest.approx(turning, rel=1e-9)
    omega = 2 * math.pi * 1e4
    admittance = q * (1j * omega) ** n
    assert at_frequency(q, n, 1e4) == pytest.approx(admittance.imag / omega, rel=1e-9)


def test_brug_gives_the_double_layer_of_a_distributed_electrode() -> None:
    """Brug's C is the one that turns over with R_e ∥ R_ct where the element does."""
    q, n, ahead, transfer = 2e-5, 0.85, 40.0, 3e4
    conductance = 1 / ahead + 1 / transfer
    omega = (conductance / q) ** (1 / n)
    assert brug(q, n, conductance) == pytest.approx(conductance / omega, rel=1e-9)


def test_hsu_and_mansfeld_has_its_case(made: Made) -> None:
    """Only where the film's resistance is held and turns over inside the window."""
    spectrum, fit = made(PORES)
    (turning,) = Capacitances([fit], [spectrum], [None]).turning_hz()
    assert turning == pytest.approx((1e6 * 2e-10) ** (-1 / 0.95) / (2 * math.pi))
    assert hsu_mansfeld_capacitance(fit, spectrum, None) is not None
    for values, bounds in (
        (PORES, {"R_po": Bound.AT_LEAST}),
        (PORES | {"R_po": 1e13}, {}),
        ({"R_s": 50.0, "Q_c": 2e-10, "n_c": 0.97}, {}),
        (PORES | {"n_c": 0.6}, {}),
    ):
        spectrum, fit = made(values, bounds=bounds)
        assert hsu_mansfeld_capacitance(fit, spectrum, None) is None


Law = Callable[[Fit, Spectrum, float | None], Quantity | None]


def _at_ten_kilohertz(fit: Fit, spectrum: Spectrum, area_cm2: float | None) -> Quantity | None:
    return film_capacitance(fit, spectrum, 1e4, area_cm2)


def _value(law: Law, q: float, n: float, r: float) -> float:
    if law is hsu_mansfeld_capacitance:
        return float(hsu_mansfeld(q, n, r))
    return float(at_frequency(q, n, 1e4))


@pytest.mark.parametrize(
    ("law", "name"),
    [(_at_ten_kilohertz, "10 kHz"), (hsu_mansfeld_capacitance, "Hsu–Mansfeld")],
)
def test_film_capacitance_is_named_and_scales_with_area(made: Made, law: Law, name: str) -> None:
    spectrum, fit = made(PORES)
    whole, per_cm2 = law(fit, spectrum, None), law(fit, spectrum, 10.0)
    assert whole is not None
    assert per_cm2 is not None
    assert (whole.unit, per_cm2.unit) == ("F", "F/cm²")
    assert whole.value == pytest.approx(_value(law, 2e-10, 0.95, 1e6))
    for part in ("value", "low", "high"):
        assert getattr(per_cm2, part) == pytest.approx(getattr(whole, part) / 10)
    assert name in whole.method


@pytest.mark.parametrize("law", [_at_ten_kilohertz, hsu_mansfeld_capacitance])
def test_limits_follow_the_covariance(made: Made, law: Law) -> None:
    """Against draws from the covariance, with Q and n as strongly correlated as they are."""
    deviations = np.array([0.0, 0.02, 0.002, 0.05, 0.0, 0.0])
    correlation = np.eye(6)
    correlation[1, 2] = correlation[2, 1] = -0.97
    correlation[2, 3] = correlation[3, 2] = 0.3
    correlation[1, 3] = correlation[3, 1] = -0.3
    covariance = correlation * np.outer(deviations, deviations)
    spectrum, fit = made(PORES, covariance=covariance)
    quantity = law(fit, spectrum, None)
    assert quantity is not None
    centre = np.log(list(PORES.values()))
    draws = np.exp(np.random.default_rng(3).multivariate_normal(centre, covariance, 4000))
    values = [_value(law, q, n, r) for _, q, n, r, _, _ in draws]
    assert log_deviation(quantity) == pytest.approx(float(np.std(np.log(values))), rel=0.06)


def test_without_covariance_the_limits_are_wider_but_not_than_the_scatter(made: Made) -> None:
    spectrum, fit = made(PORES, percent=2.0, scatter=0.5)
    quantity = film_capacitance(fit, spectrum, 1e4, None)
    assert quantity is not None
    assert log_deviation(quantity) == pytest.approx(0.005)
    by_resistance = hsu_mansfeld_capacitance(fit, spectrum, None)
    assert by_resistance is not None
    deviation = log_deviation(by_resistance)
    assert deviation is not None
    assert deviation > 0.02 / 0.95  # more than Q alone would bring


def test_capacitance_of_the_film_does_not_move_with_its_pores(made: Made) -> None:
    """A film that keeps its water keeps its capacitance, whatever its pores do."""
    values = []
    for ohm in (1e9, 1e6, 1e4):
        spectrum, fit = made(PORES | {"R_po": ohm})
        quantity = film_capacitance(fit, spectrum, 1e4, 10.0)
        assert quantity is not None
        values.append(quantity.value)
    assert values[0] == values[1] == values[2]


def test_fitted_film_is_freed_from_the_open_leads(made: Made) -> None:
    film, leads = 1.5e-10, 6e-12
    spectrum, fit = made({"R_s": 1.0, "Q_c": film + leads, "n_c": 1.0}, percent=1.0, scatter=9.0)
    open_lead, _ = made({"Q_c": leads, "n_c": 1.0})
    bare = film_capacitance(fit, spectrum, 1e4, None)
    freed = film_capacitance(fit, spectrum, 1e4, None, open_lead)
    assert bare is not None
    assert freed is not None
    assert freed.value == pytest.approx(film)
    bare_deviation, freed_deviation = log_deviation(bare), log_deviation(freed)
    assert bare_deviation is not None
    assert freed_deviation == pytest.approx(bare_deviation * (film + leads) / film)
    assert "without the open leads" in freed.method
    too_much, _ = made({"Q_c": 2 * film, "n_c": 1.0})
    assert film_capacitance(fit, spectrum, 1e4, None, too_much) is None


def test_small_exponent_is_not_converted(made: Made) -> None:
    spectrum, fit = made(PORES | {"n_c": 0.66})
    assert film_capacitance(fit, spectrum, 1e4, 10.0) is None
    sound = made(PORES)[1]
    finding, none = Capacitances([fit, sound], [spectrum] * 2, [None] * 2).small_exponents()
    assert finding is not None
    assert "0.66" in finding.text
    assert none is None


def test_interface_capacitance_is_brugs(made: Made) -> None:
    spectrum, fit = made(PORES | {"R_ct": 5e7})
    quantity = interface_capacitance(fit, spectrum, 10.0)
    assert quantity is not None
    expected = brug(1e-7, 0.85, 1 / (50.0 + 1e6) + 1 / 5e7) / 10
    assert quantity.value == pytest.approx(expected)
    assert quantity.unit == "F/cm²"
    assert "Brug" in quantity.method
    _, open_pores = made(PORES, bounds={"R_po": Bound.AT_LEAST})
    assert interface_capacitance(open_pores, spectrum, 10.0) is None


def test_capacitance_straight_from_the_data(made: Made) -> None:
    spectrum, fit = made({"R_s": 50.0, "Q_c": 1.5e-9, "n_c": 1.0}, model="closed_film")
    quantity, note = measured_capacitance(spectrum, fit.used, fit, 1e4, 10.0)
    assert note is None
    assert quantity is not None
    assert quantity.value == pytest.approx(1.5e-10, rel=1e-3)
    assert "series" in quantity.method
    # A lossy film: same capacitance in parallel, but flagged.
    spectrum, fit = made({"R_s": 1.0, "Q_c": 1.5e-9, "n_c": 1.0, "R_po": 2e4})
    quantity, note = measured_capacitance(spectrum, fit.used, fit, 1e4, 10.0)
    assert quantity is not None
    assert quantity.value == pytest.approx(1.5e-10, rel=1e-3)
    assert note is not None
    assert note.code == "capacitance_phase"


def test_capacitance_beyond_the_measured_range_is_not_given(made: Made) -> None:
    spectrum, fit = made(PORES, frequency_hz=np.geomspace(1e3, 1e-2, 40))
    assert measured_capacitance(spectrum, fit.used, fit, 1e4, 10.0) == (None, None)
    everything = np.zeros(len(spectrum), dtype=np.bool_)
    assert measured_capacitance(spectrum, everything, fit, 1e2, 10.0) == (None, None)


def test_open_leads_are_taken_away(made: Made) -> None:
    film, leads = 1.5e-10, 1e-11
    spectrum, fit = made({"Q_c": film + leads, "n_c": 1.0}, model="closed_film")
    open_lead, _ = made({"Q_c": leads, "n_c": 1.0}, model="closed_film")
    quantity, _ = measured_capacitance(spectrum, fit.used, fit, 1e4, None, open_lead)
    assert quantity is not None
    assert quantity.value == pytest.approx(film, rel=2e-3)
