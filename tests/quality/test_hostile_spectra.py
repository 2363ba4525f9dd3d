"""Whatever finite numbers a spectrum holds, the checks answer, and say nothing impossible."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import Phase, given, settings
from hypothesis import strategies as st

from coatgui.quality import check_spectra, kramers_kronig_residuals
from coatgui.records import Check, Settings, Spectrum

_SIZES = st.floats(1e-12, 1e15)
_PARTS = st.one_of(_SIZES, _SIZES.map(lambda x: -x), st.just(0.0))


@st.composite
def spectra(draw: st.DrawFn) -> Spectrum:
    number = draw(st.integers(1, 30))
    frequency = draw(st.lists(st.floats(1e-5, 1e8), min_size=number, max_size=number))
    real = draw(st.lists(_PARTS, min_size=number, max_size=number))
    imaginary = draw(st.lists(_PARTS, min_size=number, max_size=number))
    return Spectrum(np.array(frequency), np.array(real) + 1j * np.array(imaginary))


def sound(check: Check, spectrum: Spectrum) -> None:
    places = range(len(spectrum))
    assert all(place in places for place, _ in check.suggested)
    assert all(point in places for finding in check.findings for point in finding.points)
    assert all(finding.text.endswith(".") for finding in check.findings)
    assert all(np.isfinite(value) for finding in check.findings for _, value in finding.evidence)


# Shrinking takes minutes here, and the failing numbers are shown without it.
@settings(max_examples=100, deadline=None, phases=[Phase.generate])
@given(st.lists(spectra(), min_size=1, max_size=3))
def test_any_numbers_are_answered(those: list[Spectrum]) -> None:
    checks = check_spectra(those, settings=Settings(), area_cm2=[None] * len(those))
    assert len(checks) == len(those)
    for check, spectrum in zip(checks, those, strict=True):
        sound(check, spectrum)
        assert kramers_kronig_residuals(spectrum, Settings()).shape == (len(spectrum),)


def test_a_step_of_hundreds_of_decades_is_answered() -> None:
    """Found by generated numbers: the step in ln |Z| was past what a double can hold."""
    rows = """1.00000000e+08 3.2|7.59119566e+07 0|7.50570733e+07 0|6.53741171e+07 0
        6.28234879e+07 -4.94365656e+14|5.88086186e+07 0|5.19177602e+07 1.9|4.97802757e+07 0
        4.34578101e+07 0|3.76083980e+07 -0.85|2.85462470e+07 2.64246387e+14
        2.77980356e+07 8.17556954e+14|2.63706299e+07 9.69490229e+14|5.02401568e+06 0
        1.00000000e+03 0|2.00001000e+00 0|6.74500000e-01 -7.56860550e+14|3.50000000e-01 1e-5"""
    table = np.array([row.split() for row in rows.replace("\n", "|").split("|")], dtype=float)
    frequency = np.append(table[:, 0], [1e-5, 1e-5])
    z = np.append(table[:, 1] * (1 + 1j), [1e-12 + 2.13982787e14j, 1e-12])
    (check,) = check_spectra([Spectrum(frequency, z)], settings=Settings(), area_cm2=[None])
    sound(check, Spectrum(frequency, z))


def test_many_points_at_few_frequencies_are_answered() -> None:
    """The model then follows everything, and nothing is left to judge by."""
    rng = np.random.default_rng(266)
    for _ in range(40):
        number = int(rng.integers(8, 30))
        frequency = rng.choice([1.0, 2.0, 10.0, 1e3], number)
        z = 10 ** rng.uniform(-12, 15, number) * np.exp(1j * rng.uniform(-np.pi, np.pi, number))
        z[rng.random(number) < 0.3] = 0.0
        spectrum = Spectrum(frequency, z)
        (check,) = check_spectra([spectrum], settings=Settings(), area_cm2=[None])
        sound(check, spectrum)


@pytest.mark.parametrize("scale", [1e-150, 1.0, 1e150])
@pytest.mark.parametrize(
    "kind", ["resistor", "noise", "steps", "two values", "one dead half", "three alive"]
)
def test_odd_but_regular_spectra_are_answered(kind: str, scale: float) -> None:
    rng = np.random.default_rng(31)
    frequency = np.logspace(5, -2, 40)
    z = {
        "resistor": np.full(40, 1e6 + 0j),
        "noise": rng.standard_normal(40) + 1j * rng.standard_normal(40),
        "steps": np.repeat([1.0, 10.0, 100.0, 1000.0], 10) * (1 - 0.1j),
        "two values": np.where(np.arange(40) % 2, 1.0, 2.0) * (1 - 1j),
        "three alive": np.where(np.arange(40) % 13, 0.0, 1e5 - 1e5j),
        "one dead half": np.where(np.arange(40) < 20, 0.0, 1e5 - 1e5j),
    }[kind]
    spectrum = Spectrum(frequency, scale * z)
    (check,) = check_spectra([spectrum], settings=Settings(), area_cm2=[None])
    sound(check, spectrum)
    if kind == "noise":
        assert check.rejected
