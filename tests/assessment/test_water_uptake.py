"""Permittivity of water against three outside columns, and the law of Brasher and Kingsbury."""

from __future__ import annotations

import csv
import math
from pathlib import Path

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from coatgui.assessment.amounts import from_logarithm
from coatgui.assessment.sorption import dry_capacitance
from coatgui.assessment.water import (
    apparent_uptake,
    brasher_kingsbury,
    uptake_finding,
    water_permittivity,
)
from coatgui.records import Bound, Quantity, Severity

REFERENCES = Path(__file__).parents[1] / "references" / "water_permittivity"


def _column(name: str) -> list[tuple[float, float]]:
    with (REFERENCES / "water_permittivity.csv").open(encoding="utf-8", newline="") as file:
        rows = list(csv.DictReader(file))
    return [(float(r["t_C"]), float(r[name])) for r in rows if r[name] and float(r["t_C"]) >= 0]


@pytest.mark.parametrize(
    ("column", "apart"),
    [
        # The same formula worked out elsewhere: equal to the four decimals written.
        ("malmberg_maryott_1956_formula_computed", 5.1e-5),
        # Other measurements of water: the formula is known to differ by up to 0.22.
        ("archer_wang_1990_table_0.1MPa", 0.22),
        ("iapws_r8_97_0.101325MPa_computed", 0.185),
    ],
)
def test_permittivity_agrees_with_outside_values(column: str, apart: float) -> None:
    values = _column(column)
    assert len(values) >= 20
    temperature, expected = np.array(values).T
    assert np.abs(water_permittivity(temperature) - expected).max() <= apart


def test_permittivity_says_nothing_outside_the_range_of_its_formula() -> None:
    assert np.isnan(water_permittivity([-1.0, 101.0])).all()


def test_published_unphysical_set_is_called_so_and_kept() -> None:
    """C₀ = 3e-9, C_∞ = 4e-7 F/cm², ε_w = 80 (zinc-rich primer with a topcoat, Journal of Corrosion
    Science and Engineering vol. 2 paper 19): φ = 1.117, more water than film."""
    fraction = brasher_kingsbury(4e-7, 3e-9, 80.0)
    assert fraction == pytest.approx(1.117, abs=5e-4)
    uptake = Quantity(100 * fraction, 110.0, 113.0, Bound.TWO_SIDED, "vol-%")
    finding = uptake_finding(uptake)
    assert finding is not None
    assert finding.severity is Severity.DOUBT
    assert "111.7" in finding.text
    assert dict(finding.evidence)["volume_percent"] == uptake.value


def test_check_value_of_a_fifth_more_capacitance() -> None:
    """C/C₀ = 1.20 at ε_w = 78.3 is 4.18 %."""
    assert 100 * brasher_kingsbury(1.2, 1.0, 78.3) == pytest.approx(4.18, abs=0.005)


def test_limits_add_in_squares() -> None:
    wet = from_logarithm(1.2e-10, 0.004, "F/cm²", "")
    dry = from_logarithm(1.0e-10, 0.003, "F/cm²", "by extrapolation")
    uptake = apparent_uptake(wet, dry, 25.0)
    assert uptake is not None
    assert uptake.bound is Bound.TWO_SIDED
    assert uptake.value is not None
    assert uptake.low is not None
    assert uptake.high is not None
    expected = 100 * 1.959964 * 0.005 / math.log(78.3033)
    assert uptake.high - uptake.value == pytest.approx(expected, rel=1e-5)
    assert uptake.value - uptake.low == pytest.approx(expected, rel=1e-5)
    assert "Brasher–Kingsbury" in uptake.method
    assert "by extrapolation" in uptake.method


def test_wet_reference_gives_a_lower_bound() -> None:
    wet = from_logarithm(1.2e-10, 0.004, "F/cm²", "")
    reference = Quantity(1.1e-10, None, 1.1e-10, Bound.AT_MOST, "F/cm²")
    uptake = apparent_uptake(wet, reference, 25.0)
    assert uptake is not None
    assert uptake.bound is Bound.AT_LEAST
    assert uptake.high is None
    assert uptake.low is not None
    assert 0 < uptake.low < 100 * brasher_kingsbury(1.2, 1.1, 78.3033)


@given(
    start=st.floats(1e-11, 1e-8),
    deviation=st.floats(1e-4, 0.05),
    dried=st.floats(0.5, 1.0),
)
def test_no_bound_of_the_uptake_lies_below_nothing(
    start: float, deviation: float, dried: float
) -> None:
    """Where the first reading has to serve as the dry reference, its own uptake is at least 0; a
    later reading below it says no less."""
    first = from_logarithm(start, deviation, "F/cm²", "fitted")
    later = from_logarithm(dried * start, deviation, "F/cm²", "fitted")
    sorption = dry_capacitance([1.0], [first], "fitted")
    assert sorption is not None
    assert sorption.dry_capacitance.bound is Bound.AT_MOST
    for wet in (first, later):
        uptake = apparent_uptake(wet, sorption.dry_capacitance, 25.0)
        assert uptake is not None
        assert (uptake.value, uptake.low, uptake.high) == (0.0, 0.0, None)
        assert uptake.bound is Bound.AT_LEAST


def test_negative_uptake_is_doubted_only_beyond_its_limits() -> None:
    assert uptake_finding(Quantity(-0.2, -0.5, 0.1, Bound.TWO_SIDED, "vol-%")) is None
    clear = uptake_finding(Quantity(-2.0, -2.3, -1.7, Bound.TWO_SIDED, "vol-%"))
    assert clear is not None
    assert "negative" in clear.text


@given(
    ratio=st.floats(0.5, 5.0),
    scale=st.floats(1e-3, 1e3),
    temperature=st.floats(0.0, 100.0),
)
def test_uptake_does_not_depend_on_the_area(ratio: float, scale: float, temperature: float) -> None:
    def uptake(factor: float) -> Quantity:
        wet = from_logarithm(ratio * 1e-10 * factor, 0.004, "F/cm²", "")
        dry = from_logarithm(1e-10 * factor, 0.003, "F/cm²", "")
        found = apparent_uptake(wet, dry, temperature)
        assert found is not None
        return found

    assert uptake(scale).value == pytest.approx(uptake(1.0).value, abs=1e-9)
