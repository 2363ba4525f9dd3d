"""The bracket of mixing laws against the worked example, and each law against its own equation."""

from __future__ import annotations

import math

import numpy as np
import pytest

from coatgui.assessment.mixing import bracket, mass_percent, permittivity
from coatgui.assessment.rules import table

WORKED = {  # C/C₀ = 1.20, x = 5, w = 78.3: worked by hand for the project, in percent
    "Brasher–Kingsbury": 4.18,
    "linear (layers in parallel)": 1.36,
    "Lichtenecker, two phases": 6.63,
    "Looyenga": 4.17,
    "Bruggeman, symmetric": 6.84,
    "Maxwell-Garnett (water in film)": 7.53,
}


def _by_name(ratio: float, dry: float | None, swelling: float = 1.0) -> dict[str, float]:
    laws = bracket(np.array([ratio]), np.array([78.3]), dry, swelling)
    return dict(zip(laws.names, laws.volume_percent[:, 0].tolist(), strict=True))


def test_worked_example() -> None:
    found = _by_name(1.20, 5.0)
    for name, percent in WORKED.items():
        assert found[name] == pytest.approx(percent, abs=0.005)
    laws = bracket(np.array([1.20]), np.array([78.3]), 5.0)
    assert laws.low[0] == pytest.approx(1.36, abs=0.005)
    assert laws.high[0] == pytest.approx(7.53, abs=0.005)


@pytest.mark.parametrize("ratio", [1.02, 1.2, 1.9])
@pytest.mark.parametrize("dry", [3.1, 5.0, 8.0])
def test_each_law_solves_its_own_equation(ratio: float, dry: float) -> None:
    """φ put back into the forward law, as written in the data file, gives ε again."""
    x, w, e = dry, 78.3, ratio * dry
    found = _by_name(ratio, dry)
    phi = {law["id"]: found[law["name"]] / 100 for law in table("water")["law"]}
    assert (1 - phi["linear"]) * x + phi["linear"] * w == pytest.approx(e)
    p = phi["lichtenecker"]
    assert x ** (1 - p) * w**p == pytest.approx(e)
    p = phi["looyenga"]
    assert ((1 - p) * x ** (1 / 3) + p * w ** (1 / 3)) ** 3 == pytest.approx(e)
    p = phi["bruggeman"]
    balance = p * (w - e) / (w + 2 * e) + (1 - p) * (x - e) / (x + 2 * e)
    assert balance == pytest.approx(0, abs=1e-12)
    p = phi["bruggeman_hanai"]
    assert (w - e) / (w - x) * (x / e) ** (1 / 3) == pytest.approx(1 - p)
    p = phi["maxwell_garnett"]
    assert (e - x) / (e + 2 * x) == pytest.approx(p * (w - x) / (w + 2 * x))
    p = phi["series"]
    assert (1 - p) / x + p / w == pytest.approx(1 / e)


def test_no_rise_is_no_water_and_order_is_kept() -> None:
    for value in _by_name(1.0, 5.0).values():
        assert value == pytest.approx(0, abs=1e-9)
    for a, b in zip(_by_name(1.1, 5.0).values(), _by_name(1.2, 5.0).values(), strict=True):
        assert 0 < a < b


def test_unknown_permittivity_widens_the_bracket() -> None:
    water = np.array([78.3])
    ratio = np.array([1.2])
    wide = bracket(ratio, water, None)
    for dry in (4.0, 5.0, 8.0):
        known = bracket(ratio, water, dry)
        assert wide.low[0] <= known.low[0] <= known.high[0] <= wide.high[0]


def test_swelling_in_thickness_multiplies_the_ratio() -> None:
    assert _by_name(1.2, 5.0, 1.05)["Brasher–Kingsbury"] == pytest.approx(
        100 * math.log(1.2 * 1.05) / math.log(78.3)
    )


def test_more_than_all_water_is_not_given() -> None:
    laws = bracket(np.array([130.0]), np.array([80.0]), None)
    assert np.isnan(laws.volume_percent[0, 0])
    assert np.isnan(_by_name(30.0, 5.0)["linear (layers in parallel)"])


@pytest.mark.parametrize(("um", "nf"), [(25, 0.177), (50, 0.0885), (100, 0.0443)])
def test_permittivity_of_five(um: float, nf: float) -> None:
    assert permittivity(nf * 1e-9, um) == pytest.approx(5.0, rel=1e-3)


def test_mass_from_volume() -> None:
    assert mass_percent(3.0, 1.5) == pytest.approx(2.0)
