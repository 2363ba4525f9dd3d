"""The pore resistance: from the fit, bounded by the leads, or hidden behind a closed film."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
import pytest

from coatgui.assessment.pores import leads_resistance, pore_resistance
from coatgui.records import Bound, Fit, Spectrum

Made = Callable[..., tuple[Spectrum, Fit]]
PORES = {"R_s": 50.0, "Q_c": 1e-9, "n_c": 0.97, "R_po": 1e8}


def _leads(ohm: float) -> Spectrum:
    grid = np.geomspace(1e5, 1e-2, 71)
    return Spectrum(grid, 1 / (1 / ohm + 2j * np.pi * grid * 5e-12))


def test_fitted_value_is_given_per_area(made: Made) -> None:
    spectrum, fit = made(PORES)
    quantity = pore_resistance(fit, spectrum, 10.0)
    assert quantity is not None
    assert quantity.bound is Bound.TWO_SIDED
    assert quantity.value == pytest.approx(1e9)
    assert quantity.unit == "Ω cm²"
    bare = pore_resistance(fit, spectrum, None)
    assert bare is not None
    assert bare.value == pytest.approx(1e8)
    assert bare.unit == "Ω"


def test_leads_within_a_factor_of_ten_make_it_a_lower_bound(made: Made) -> None:
    """Leads of 6e11 Ω in parallel make a perfect film look like one of 6e11 Ω."""
    spectrum, fit = made(PORES | {"R_po": 6e11})
    leads = _leads(6e11)
    assert leads_resistance(leads, 0.01) == pytest.approx(6e11, rel=1e-6)
    quantity = pore_resistance(fit, spectrum, None, leads)
    assert quantity is not None
    assert quantity.bound is Bound.AT_LEAST
    assert quantity.high is None
    assert quantity.low is not None
    assert quantity.low < 3.0001e11
    assert "leads" in quantity.method
    free = pore_resistance(*_swapped(made(PORES)), None, leads)
    assert free is not None
    assert free.bound is Bound.TWO_SIDED


def _swapped(pair: tuple[Spectrum, Fit]) -> tuple[Fit, Spectrum]:
    return pair[1], pair[0]


def test_closed_film_bounds_the_resistance_it_hides(made: Made) -> None:
    closed = {"R_s": 50.0, "Q_c": 1e-9, "n_c": 0.97}
    spectrum, fit = made(closed, model="closed_film")
    quantity = pore_resistance(fit, spectrum, 10.0)
    assert quantity is not None
    assert quantity.bound is Bound.AT_LEAST
    lowest = 10 * abs(spectrum.impedance_ohm[-1])
    assert quantity.value == pytest.approx(lowest, rel=0.02)
    assert quantity.value is not None
    assert quantity.value < lowest
    assert "0.01 Hz" in quantity.method
    # The bound is honest: a film that really has such a resistance shows a smaller |Z|.
    real, _ = made(closed | {"R_po": quantity.value / 10})
    assert abs(real.impedance_ohm[-1]) < abs(spectrum.impedance_ohm[-1])


def test_one_sided_fit_stays_one_sided(made: Made) -> None:
    spectrum, fit = made(PORES, bounds={"R_po": Bound.AT_LEAST})
    quantity = pore_resistance(fit, spectrum, 10.0)
    assert quantity is not None
    assert quantity.bound is Bound.AT_LEAST


def test_bare_metal_has_no_pore_resistance(made: Made) -> None:
    spectrum, fit = made({"R_s": 50.0, "Q_dl": 1e-5, "n_dl": 0.9, "R_ct": 1e4}, model="bare_metal")
    assert pore_resistance(fit, spectrum, 10.0) is None
