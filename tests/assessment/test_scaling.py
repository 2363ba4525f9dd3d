"""The whole way from spectra to results under changes of which physics says what they do."""

from __future__ import annotations

import random
from collections.abc import Callable
from dataclasses import replace
from functools import cache

import numpy as np
import pytest

from coatgui.assessment import assess
from coatgui.records import Assessment, Bound, Campaign, Quantity, ReadingAssessment, Spectrum
from tests.benchmarks.assessment_of_many import large_campaign

_FITTED = 2e-3  # to which two fits of the same points, started from other values, agree
Take = Callable[[ReadingAssessment], Quantity | None]


@cache
def _campaign() -> Campaign:
    """Two formulations of two panels, three readings each, with metal behind open pores."""
    campaign, _ = large_campaign(panels=4, formulations=2, times=3)
    return campaign


@cache
def _as_it_is() -> Assessment:
    return assess(_campaign())


def _changed(
    campaign: Campaign, impedance: float = 1.0, frequency: float = 1.0, area: float = 1.0
) -> Campaign:
    readings = tuple(
        replace(
            r,
            spectrum=Spectrum(
                r.spectrum.frequency_hz * frequency, r.spectrum.impedance_ohm * impedance
            ),
        )
        for r in campaign.readings
    )
    panels = tuple(replace(p, area_cm2=(p.area_cm2 or 0.0) * area) for p in campaign.panels)
    settings = campaign.settings
    settings = replace(
        settings,
        modulus_frequencies_hz=tuple(f * frequency for f in settings.modulus_frequencies_hz),
        capacitance_frequency_hz=settings.capacitance_frequency_hz * frequency,
    )
    return replace(campaign, readings=readings, panels=panels, settings=settings)


def _lowest_modulus(reading: ReadingAssessment) -> Quantity | None:
    return min(reading.modulus, key=lambda m: m.frequency_hz).quantity


def _film(reading: ReadingAssessment) -> Quantity | None:
    return reading.coating_capacitance


def _pores(reading: ReadingAssessment) -> Quantity | None:
    return reading.pore_resistance


def _water(reading: ReadingAssessment) -> Quantity | None:
    return None if reading.water_uptake is None else reading.water_uptake.quantity


def _expect(after: Assessment, take: Take, factor: float, near: float, at_most: float = 0.0) -> int:
    """Every quantity is `factor` times what it was; the number of them."""
    count = 0
    for was, now in zip(_as_it_is().readings, after.readings, strict=True):
        before, found = take(was), take(now)
        assert (before is None) == (found is None)
        if before is not None and found is not None and before.value is not None:
            assert found.bound is before.bound
            assert found.value == pytest.approx(factor * before.value, rel=near, abs=at_most)
            count += 1
    return count


@pytest.mark.parametrize("factor", [0.3, 4.0])
def test_a_larger_panel_of_the_same_spectra(factor: float) -> None:
    """Per area, resistances rise with the area and capacitances fall; water does not know it."""
    after = assess(_changed(_campaign(), area=factor))
    assert _expect(after, _lowest_modulus, factor, 1e-9) == 12
    assert _expect(after, _film, 1 / factor, _FITTED) == 12
    assert _expect(after, _pores, factor, 0.01) == 12
    assert _expect(after, _water, 1.0, 0.0, at_most=0.05) == 12
    assert [r.formulation for r in after.ranking] == [r.formulation for r in _as_it_is().ranking]


@pytest.mark.parametrize("factor", [0.3, 4.0])
def test_a_larger_specimen_of_the_same_film(factor: float) -> None:
    """A specimen `factor` times as large has 1/`factor` of the impedance: per area all is as it
    was."""
    after = assess(_changed(_campaign(), impedance=1 / factor, area=factor))
    assert _expect(after, _lowest_modulus, 1.0, 1e-9) == 12
    assert _expect(after, _film, 1.0, _FITTED) == 12
    assert _expect(after, _pores, 1.0, 0.01) == 12
    assert _expect(after, _water, 1.0, 0.0, at_most=0.05) == 12


@pytest.mark.parametrize("factor", [0.5, 2.0])
def test_the_same_impedance_at_higher_frequencies(factor: float) -> None:
    """Resistances stay, capacitances fall with the frequency at which they do the same."""
    after = assess(_changed(_campaign(), frequency=factor))
    assert _expect(after, _lowest_modulus, 1.0, 1e-9) == 12
    assert _expect(after, _film, 1 / factor, _FITTED) == 12
    assert _expect(after, _pores, 1.0, 0.01) == 12
    assert _expect(after, _water, 1.0, 0.0, at_most=0.05) == 12


def test_the_order_in_which_readings_and_files_come_does_not_matter() -> None:
    readings = list(_campaign().readings)
    random.Random(5).shuffle(readings)
    after = assess(replace(_campaign(), readings=tuple(readings)))
    was = _as_it_is()
    assert [r.reading_id for r in after.readings] == [r.reading_id for r in was.readings]
    for take in (_lowest_modulus, _film, _pores, _water):
        assert _expect(after, take, 1.0, 1e-12) == 12
    assert after.ranking == was.ranking
    assert after.comparison == was.comparison
    assert after.headline == was.headline


def test_limits_widen_with_noise() -> None:
    """Ten times the scatter: the limits of what is drawn from it are several times as wide."""
    generator = np.random.default_rng(3)
    noisy = []
    for reading in _campaign().readings:
        z = reading.spectrum.impedance_ohm
        parts = generator.standard_normal((2, z.size))
        shaken = z * (1 + 0.05 * (parts[0] + 1j * parts[1]))
        noisy.append(replace(reading, spectrum=Spectrum(reading.spectrum.frequency_hz, shaken)))
    after = assess(replace(_campaign(), readings=tuple(noisy)))
    for take in (_lowest_modulus, _film, _pores):
        ratios = []
        for was, now in zip(_as_it_is().readings, after.readings, strict=True):
            widths = [_width(take(r)) for r in (was, now)]
            if widths[0] and widths[1]:
                ratios.append(widths[1] / widths[0])
        assert len(ratios) >= 4
        assert np.median(ratios) > 3


def _width(quantity: Quantity | None) -> float | None:
    """Logarithm of the ratio of the limits."""
    if quantity is None or quantity.bound is not Bound.TWO_SIDED:
        return None
    assert quantity.low
    assert quantity.high
    return float(np.log(quantity.high / quantity.low))
