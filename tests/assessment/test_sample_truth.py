"""The sample campaign's quantities against the truth it was made from: limits that hold.

The truth's impedance is worked out here from its circuit values, without the leads and without
scatter, by formulas of this test's own.
"""

from __future__ import annotations

import json
from collections.abc import Iterator
from typing import Any

import numpy as np
import pytest

from coatgui.assessment import assess
from coatgui.campaign import campaign_from_found
from coatgui.intake import read_folder
from coatgui.records import Assessment, Bound, Quantity, ReadingAssessment
from coatgui.shipped import sample_panels

_LARGEST_FAULT_FREE_MISS = 0.1  # of two-sided values may lie outside their 95 % limits


@pytest.fixture(scope="module")
def truth() -> dict[str, Any]:
    content = (sample_panels() / "truth.json").read_text(encoding="utf-8")
    readings: dict[str, Any] = json.loads(content)["readings"]
    return readings


@pytest.fixture(scope="module")
def assessment() -> Assessment:
    return assess(campaign_from_found(read_folder(sample_panels()), "Sample"))


def _sound(
    assessment: Assessment, truth: dict[str, Any]
) -> Iterator[tuple[ReadingAssessment, dict[str, Any], float]]:
    """Readings without a fault put in on purpose, their truth, and their area."""
    areas = {panel.panel: panel.area_cm2 for panel in assessment.panels}
    for reading in assessment.readings:
        known = truth[f"{reading.panel}_{reading.exposure_h:g}h"]
        area = areas[reading.panel]
        if not known["fault"]:
            assert area is not None
            yield reading, known, area


def _impedance(known: dict[str, Any], frequency_hz: float) -> complex:
    s = 2j * np.pi * frequency_hz
    inner = complex(known["R_po"])
    if "Q_dl" in known:
        behind = complex(known["Q_dl"] * s ** known["n_dl"])
        if "R_ct" in known:
            tail = known.get("σ", 0.0) * (1 - 1j) / np.sqrt(2 * np.pi * frequency_hz)
            behind += 1 / (known["R_ct"] + tail)
        inner += 1 / behind
    return complex(known["R_s"] + 1 / (known["Q_c"] * s ** known["n_c"] + 1 / inner))


def _outside(pairs: list[tuple[Quantity, float]], at_least_so_many: int) -> float:
    """Share of two-sided quantities whose limits miss the truth. One-sided bounds must not."""
    two_sided = missed = 0
    for quantity, true in pairs:
        if quantity.bound is Bound.TWO_SIDED:
            assert quantity.low is not None
            assert quantity.high is not None
            two_sided += 1
            missed += not quantity.low <= true <= quantity.high
        elif quantity.bound is Bound.AT_LEAST:
            assert quantity.low is not None
            assert true >= 0.98 * quantity.low  # a 95 % bound may be missed by its scatter
        else:
            pytest.fail(f"A reading says {quantity.bound} of {true}.")
    assert two_sided >= at_least_so_many
    return missed / two_sided


@pytest.mark.parametrize("frequency", [0.1, 0.01])
def test_modulus(assessment: Assessment, truth: dict[str, Any], frequency: float) -> None:
    pairs = []
    for reading, known, area in _sound(assessment, truth):
        modulus = reading.modulus_at(frequency)
        if modulus is not None and modulus.quantity is not None:
            pairs.append((modulus.quantity, abs(_impedance(known, frequency)) * area))
    assert _outside(pairs, 60) <= _LARGEST_FAULT_FREE_MISS


def test_film_capacitance(assessment: Assessment, truth: dict[str, Any]) -> None:
    pairs = [
        (reading.coating_capacitance, known["capacitance_f_per_cm2"])
        for reading, known, _ in _sound(assessment, truth)
        if reading.coating_capacitance is not None
    ]
    assert _outside(pairs, 100) <= _LARGEST_FAULT_FREE_MISS
    for quantity, true in pairs:
        assert quantity.value == pytest.approx(true, rel=0.005)


def test_capacitance_straight_from_the_data(assessment: Assessment, truth: dict[str, Any]) -> None:
    """At 10 kHz, freed from the leads; the film's own wherever the phase says so."""
    pairs = [
        (reading.capacitance_at_high_frequency, known["capacitance_f_per_cm2"])
        for reading, known, _ in _sound(assessment, truth)
        if reading.capacitance_at_high_frequency is not None
        and "capacitance_phase" not in {finding.code for finding in reading.findings}
    ]
    assert _outside(pairs, 90) <= _LARGEST_FAULT_FREE_MISS


def test_water_uptake(assessment: Assessment, truth: dict[str, Any]) -> None:
    pairs = [
        (reading.water_uptake.quantity, known["water_volume_percent"])
        for reading, known, _ in _sound(assessment, truth)
        if reading.water_uptake is not None
    ]
    assert _outside(pairs, 100) <= _LARGEST_FAULT_FREE_MISS
    for quantity, true in pairs:
        assert quantity.value == pytest.approx(true, abs=0.15)


def test_pore_resistance(assessment: Assessment, truth: dict[str, Any]) -> None:
    pairs = [
        (reading.pore_resistance, known["R_po"] * area)
        for reading, known, area in _sound(assessment, truth)
        if reading.pore_resistance is not None
    ]
    assert _outside(pairs, 60) <= _LARGEST_FAULT_FREE_MISS


def test_dry_capacitance_and_diffusion(assessment: Assessment, truth: dict[str, Any]) -> None:
    content = (sample_panels() / "truth.json").read_text(encoding="utf-8")
    formulations = json.loads(content)["formulations"]
    dry, diffusion = [], []
    for panel in assessment.panels:
        known = truth[f"{panel.panel}_1h"]
        if panel.dry_capacitance is not None:
            dry.append((panel.dry_capacitance, known["dry_capacitance_f_per_cm2"]))
        if panel.diffusion_coefficient is not None:
            true = formulations[panel.panel[0]]["diffusion_cm2_s"]
            diffusion.append((panel.diffusion_coefficient, true))
    assert _outside(dry, 12) <= 2 / 12
    assert _outside(diffusion, 12) <= 2 / 12


def test_water_at_saturation_and_dry_permittivity(assessment: Assessment) -> None:
    content = (sample_panels() / "truth.json").read_text(encoding="utf-8")
    formulations = json.loads(content)["formulations"]
    for panel in assessment.panels:
        known = formulations[panel.panel[0]]
        assert panel.saturation_uptake is not None
        quantity = panel.saturation_uptake.quantity
        truth = 100 * known["final_water"]
        assert quantity.value == pytest.approx(truth, rel=0.08)  # panels were made to differ
        low, high = panel.saturation_uptake.law_low, panel.saturation_uptake.law_high
        assert low is not None
        assert high is not None
        assert quantity.value is not None
        assert low < quantity.value < high
        assert panel.dry_permittivity is not None
        assert panel.dry_permittivity.value == pytest.approx(known["permittivity"], rel=0.1)


def test_onsets_hold_the_truth(assessment: Assessment, truth: dict[str, Any]) -> None:
    """The metal and diffusion show from the first reading whose truth has them; what the first
    reading already shows has no beginning."""
    reacts = {"R_ct", "σ"}
    for panel in assessment.panels:
        own = sorted(
            (k["exposure_h"], reacts & set(k)) for k in truth.values() if k["panel"] == panel.panel
        )
        events = {event.code: event for event in panel.events}
        begun = next((hour for hour, symbols in own if "R_ct" in symbols), None)
        if "interface_reacting" in events:
            event = events["interface_reacting"]
            assert begun is not None
            assert event.by_h is not None
            assert begun <= event.by_h
        for event in panel.events:
            if event.by_h == own[0][0]:
                assert event.after_h is None
    leaky = [p for p in assessment.panels if p.panel[0] in "MP"]
    for panel in leaky:
        pores = next(e for e in panel.events if e.code == "pores_conducting")
        assert (pores.after_h, pores.by_h) == (None, 1.0)
        assert "before the first reading" in pores.text
