"""From noisy spectra of known films, through the real checks and the real fitting, to water uptake.

Films invented here: dry 100 pF/cm², n = 0.98, 80 µm at 1e-9 cm²/s, 3 vol-% at saturation, noise of
half a percent, first reading after one hour.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import replace

import numpy as np
import pytest

from coatgui.assessment import assess
from coatgui.assessment.capacitance import at_frequency
from coatgui.assessment.sorption import fickian_uptake
from coatgui.records import (
    Assessment,
    Bound,
    Campaign,
    Formulation,
    Panel,
    Reading,
    Source,
    Spectrum,
)

HOURS = (1.0, 2.0, 4.0, 8.0, 24.0, 72.0, 168.0, 336.0, 672.0)
AREA_CM2, EXPONENT, FINAL = 10.0, 0.98, 0.03
DRY_Q = 1e-9
PANELS = 4


def _true_uptake(hours: float) -> float:
    share = float(fickian_uptake(1e-9 * hours * 3600 / 80e-4**2))
    return 100 * FINAL * share


def _true_pores(hours: float) -> float:
    """Ω: closed at first, conducting later."""
    return 3e11 if hours < 100 else 2e7


def _campaign() -> Campaign:
    random = np.random.default_rng(20)
    grid = np.geomspace(1e5, 1e-2, 57)
    s = 2j * np.pi * grid
    readings, panels = [], []
    for number in range(PANELS):
        name = f"K{number}"
        panels.append(Panel(name, name, "K", AREA_CM2, 80.0, temperature_c=25.0))
        for hours in HOURS:
            q = DRY_Q * 78.3033 ** (_true_uptake(hours) / 100)
            inner = _true_pores(hours)
            impedance = 80.0 + 1 / (q * s**EXPONENT + 1 / inner)
            noise = random.standard_normal((2, grid.size)) * 0.005
            impedance = impedance + np.abs(impedance) * (noise[0] + 1j * noise[1])
            source = Source(f"{name}_{hours:g}h.csv", "00")
            reading = Reading(f"{name}@{hours:g}", name, hours, Spectrum(grid, impedance), source)
            readings.append(reading)
    return Campaign(
        "c",
        "Known films",
        formulations=(Formulation("K", "K"),),
        panels=tuple(panels),
        readings=tuple(readings),
    )


@pytest.fixture(scope="module")
def result() -> Assessment:
    return assess(_campaign())


def test_every_reading_counts(result: Assessment) -> None:
    assert all(r.counts and r.fit is not None for r in result.readings)


def test_uptake_is_within_three_tenths_of_a_percent(result: Assessment) -> None:
    for reading in result.readings:
        assert reading.water_uptake is not None
        quantity = reading.water_uptake.quantity
        assert quantity.bound is Bound.TWO_SIDED, reading.reading_id
        assert quantity.value == pytest.approx(_true_uptake(reading.exposure_h), abs=0.3)


def test_dry_capacitance_is_within_its_limits(result: Assessment) -> None:
    truth = at_frequency(DRY_Q, EXPONENT, 1e4) / AREA_CM2
    inside = 0
    for panel in result.panels:
        dry = panel.dry_capacitance
        assert dry is not None
        assert dry.low is not None
        assert dry.high is not None
        assert math.log(dry.high / dry.low) < 0.05
        inside += dry.low <= truth <= dry.high
    assert inside >= PANELS - 1


def _share(result: Assessment, within: Callable[[float, str], bool | None]) -> float:
    answers = [within(r.exposure_h, r.reading_id) for r in result.readings]
    told = [a for a in answers if a is not None]
    assert len(told) >= PANELS
    return sum(told) / len(told)


def test_limits_hold_the_truth(result: Assessment) -> None:
    def uptake(hours: float, reading_id: str) -> bool | None:
        reading = result.reading(reading_id)
        assert reading is not None
        assert reading.water_uptake is not None
        quantity = reading.water_uptake.quantity
        assert quantity.low is not None
        assert quantity.high is not None
        return quantity.low <= _true_uptake(hours) <= quantity.high

    def pores(hours: float, reading_id: str) -> bool | None:
        reading = result.reading(reading_id)
        assert reading is not None
        quantity = reading.pore_resistance
        assert quantity is not None
        truth = _true_pores(hours) * AREA_CM2
        if quantity.bound is not Bound.TWO_SIDED:
            assert quantity.low is not None
            assert quantity.low <= truth
            return None
        assert quantity.low is not None
        assert quantity.high is not None
        return quantity.low <= truth <= quantity.high

    assert _share(result, uptake) >= 0.85
    assert _share(result, pores) >= 0.85


def test_pores_begin_to_conduct_between_72_and_168_hours(result: Assessment) -> None:
    for panel in result.panels:
        event = next(e for e in panel.events if e.code == "pores_conducting")
        assert (event.after_h, event.by_h) == (72.0, 168.0)


def test_uptake_can_rest_on_what_was_measured_at_the_high_frequency() -> None:
    made = _campaign()
    measured = replace(made.settings, uptake_from_high_frequency=True)
    for panel in assess(replace(made, settings=measured)).panels:
        assert panel.dry_capacitance is not None
        assert "measured parallel capacitance at 10 kHz" in panel.dry_capacitance.method
        assert panel.saturation_uptake is not None
        assert panel.saturation_uptake.quantity.value == pytest.approx(100 * FINAL, abs=0.6)


def test_saturation_and_diffusion_coefficient(result: Assessment) -> None:
    """At 0.5 percent noise with readings from 1 h on: within 0.3 vol-%, and D within its limits."""
    inside = 0
    for panel in result.panels:
        assert panel.saturation_uptake is not None
        assert panel.saturation_uptake.quantity.value == pytest.approx(100 * FINAL, abs=0.3)
        diffusion = panel.diffusion_coefficient
        assert diffusion is not None
        assert diffusion.low is not None
        assert diffusion.high is not None
        assert diffusion.high < 2 * diffusion.low
        inside += diffusion.low <= 1e-9 <= diffusion.high
    assert inside >= PANELS - 1
