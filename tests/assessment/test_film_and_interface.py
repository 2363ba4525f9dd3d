"""Film facts, effective permittivity and resistivity, breakpoint, active area."""

from __future__ import annotations

import math

import numpy as np
import pytest

from coatgui.assessment.amounts import from_logarithm
from coatgui.assessment.film import (
    film_facts,
    film_resistivity,
    permittivity_finding,
    relative_permittivity,
    thickness_deviation,
    widened,
)
from coatgui.assessment.interface import (
    active_area,
    breakpoint_figures,
    phase_crossings,
    pore_resistivity,
)
from coatgui.assessment.modulus import Grid
from coatgui.assessment.water import apparent_uptake, brasher_kingsbury, uptake_finding
from coatgui.records import Bound, Breakpoint, Panel, Quantity, Spectrum

R_PO, C_C = 1e6, 1e-9


def _two_sided(value: float, unit: str = "") -> Quantity:
    return from_logarithm(value, 0.01, unit, "")


def _nested(ratio: float, solution: float = 0.0) -> Spectrum:
    """R_po, C_c and C_dl = C_c/ratio with R_ct → ∞; frequencies dense around everything."""
    frequency = np.geomspace(1e6, 1e-5, 3000)
    s = 2j * np.pi * frequency
    inner = R_PO + 1 / (s * C_C / ratio)
    return Spectrum(frequency, solution + 1 / (s * C_C + 1 / inner))


def _crossing(spectrum: Spectrum) -> float | None:
    (found,) = phase_crossings([Grid([0], [spectrum], np.ones(len(spectrum), bool), [None])], 1)
    return found


def _figures(ratio: float) -> tuple[Spectrum, Breakpoint]:
    spectrum = _nested(ratio)
    found = breakpoint_figures(
        _crossing(spectrum),
        _two_sided(R_PO, "Ω"),
        _two_sided(C_C, "F"),
        _two_sided(C_C / ratio, "F"),
    )
    assert found is not None
    return spectrum, found


@pytest.mark.parametrize("ratio", [1e-5, 1e-3, 0.01, 0.1])
def test_minimum_phase_is_where_and_what_the_spectrum_shows(ratio: float) -> None:
    spectrum, found = _figures(ratio)
    phase = np.degrees(np.angle(spectrum.impedance_ohm))
    at = int(np.argmax(phase))
    assert found.valid is True
    assert found.minimum_phase_hz == pytest.approx(float(spectrum.frequency_hz[at]), rel=0.02)
    assert found.minimum_phase_deg == pytest.approx(float(phase[at]), abs=0.01)


@pytest.mark.parametrize(("ratio", "percent"), [(0.01, 3.0), (0.1, 31.0)])
def test_breakpoint_is_off_by_the_known_amounts(ratio: float, percent: float) -> None:
    """An area from the measured ratio, (f_b/f_min)² for C_dl/C_c, is low by 3 % and 31 %."""
    _, found = _figures(ratio)
    assert found.from_fit_hz == pytest.approx(1 / (2 * math.pi * R_PO * C_C))
    assert found.measured_hz is not None
    assert found.from_fit_hz is not None
    assert found.minimum_phase_hz is not None
    off = 100 * (1 - ratio * (found.measured_hz / found.minimum_phase_hz) ** 2)
    assert off == pytest.approx(percent, abs=0.6)


def test_no_breakpoint_beyond_the_limit() -> None:
    spectrum, found = _figures(0.25)
    assert found.valid is False
    assert found.from_fit_hz is None
    assert found.measured_hz is None
    assert np.degrees(np.angle(spectrum.impedance_ohm)).max() < -45
    assert _figures(0.2069)[1].valid is True
    assert "never passes −45°" in found.text


def test_closed_film_has_no_breakpoint() -> None:
    crossing = _crossing(_nested(0.01))
    bound = Quantity(1e9, 1e9, None, Bound.AT_LEAST, "Ω")
    assert breakpoint_figures(crossing, bound, _two_sided(C_C), None) is None


def test_routes_agree_where_their_assumptions_do() -> None:
    """A film of ε_r = 5, 50 µm, of which a thousandth lies open to 19 Ω cm and metal of 40 µF/cm²:
    three routes, all of them a thousandth within their limits."""
    share, length = 1e-3, 50e-4
    pores = 19.0 * length / share
    capacitance = 5 * 8.8541878e-14 / length
    interface = 40e-6 * share
    frequency = np.geomspace(1e8, 1e-3, 2000)
    s = 2j * np.pi * frequency
    spectrum = Spectrum(frequency, 1 / (s * capacitance + 1 / (pores + 1 / (s * interface))))
    r, c, dl = (
        _two_sided(v, u)
        for v, u in ((pores, "Ω cm²"), (capacitance, "F/cm²"), (interface, "F/cm²"))
    )
    found = breakpoint_figures(_crossing(spectrum), r, c, dl)
    area = active_area(r, dl, found, 50.0, 5.0, "3.5 % NaCl")
    assert area is not None
    routes = dict(area.routes)
    assert set(routes) == {"breakpoint", "double layer", "pores"}
    assert routes["breakpoint"].value == pytest.approx(share, rel=0.01)
    assert routes["pores"].value == pytest.approx(share, rel=1e-6)
    low, high = routes["double layer"].low, routes["double layer"].high
    assert low is not None
    assert high is not None
    assert low < share < high
    assert area.low <= share <= area.high


def test_route_that_gives_more_than_all_is_said() -> None:
    area = active_area(_two_sided(0.01), _two_sided(1e-9), None, 50.0, None, "")
    assert area is not None
    assert area.high == 1.0
    assert "that route fails" in area.text
    assert "decades" in area.text
    assert active_area(None, None, None, 50.0, 5.0, "") is None


@pytest.mark.parametrize(
    ("text", "ohm_cm"),
    [
        ("3.5 % NaCl", 19.0),
        ("3,5% sodium chloride", 19.0),
        ("3 % sodium chloride", 22.0),
        ("5% NaCl", 14.0),
        ("0.35 % (NH₄)₂SO₄ + 0.05 % NaCl", None),
        ("deionised water", None),
        ("", 19.0),
    ],
)
def test_electrolyte_is_recognised(text: str, ohm_cm: float | None) -> None:
    assert pore_resistivity(text)[0] == ohm_cm


def test_effective_permittivity_and_resistivity() -> None:
    film = relative_permittivity(_two_sided(0.0885e-9, "F/cm²"), 50.0)
    assert film is not None
    assert film.value == pytest.approx(5.0, rel=1e-3)
    assert relative_permittivity(_two_sided(1e-9, "F"), 50.0) is None
    resistivity = film_resistivity(_two_sided(1e8, "Ω cm²"), 50.0)
    assert resistivity is not None
    assert resistivity.value == pytest.approx(2e10)
    assert resistivity.unit == "Ω cm"
    assert film_resistivity(_two_sided(1e8, "Ω"), 50.0) is None


def test_facts_of_the_panel_list() -> None:
    notes = (
        ("Film_Density_g_cm3", "1,4"),
        ("dry_capacitance_f_per_cm2", "1.0e-10"),
        ("wet_thickness_um", "no"),
        ("thickness_sd_um", "4"),
    )
    facts = film_facts(Panel("p", "p", "f", notes=notes))
    assert (facts.density_g_cm3, facts.dry_capacitance_f_cm2) == (1.4, 1e-10)
    assert facts.wet_thickness_um is None
    assert thickness_deviation(facts, 80.0) == pytest.approx(0.05)
    assert thickness_deviation(facts, None) == 0.0


def test_thickness_error_widens() -> None:
    quantity = widened(from_logarithm(1e-9, 0.03, "cm²/s", ""), 0.04)
    assert quantity.high is not None
    assert math.log(quantity.high / 1e-9) == pytest.approx(1.96 * 0.05, rel=1e-3)
    assert widened(quantity, 0.0) is quantity


def test_published_zinc_primer_set_is_called_unphysical() -> None:
    """C₀ = 3e-9, C_∞ = 4e-7 F/cm², ε_w = 80 (zinc-rich primer with a 30 µm topcoat, Journal of
    Corrosion Science and Engineering vol. 2 paper 19): more water than film, ε_r of 102 dry."""
    assert brasher_kingsbury(4e-7, 3e-9, 80.0) == pytest.approx(1.117, abs=5e-4)
    uptake = apparent_uptake(_two_sided(4e-7, "F/cm²"), _two_sided(3e-9, "F/cm²"), 20.2)
    assert uptake is not None
    assert uptake.value == pytest.approx(111.7, abs=0.1)
    water = uptake_finding(uptake)
    assert water is not None
    assert water.code == "uptake_unphysical"
    dry = relative_permittivity(_two_sided(3e-9, "F/cm²"), 30.0)
    assert dry is not None
    assert dry.value == pytest.approx(102, abs=0.5)
    film = permittivity_finding(dry)
    assert film is not None
    assert film.code == "permittivity_unphysical"
    assert "unphysical" in film.text
    usual = relative_permittivity(_two_sided(0.0885e-9, "F/cm²"), 50.0)
    assert usual is not None
    assert permittivity_finding(usual) is None
