"""The leads as a limit and as something to take away; models of a person's own; repeated sweeps."""

from __future__ import annotations

import json
from dataclasses import replace

import numpy as np
import pytest

from coatgui.assessment import assess
from coatgui.assessment.own_models import own_model
from coatgui.circuits import ModelError, catalogue
from coatgui.records import (
    Bound,
    Campaign,
    Formulation,
    Panel,
    Reading,
    ReadingAssessment,
    Settings,
    Source,
    Spectrum,
)

FREQUENCY_HZ = np.logspace(5, -2, 57)
LEAK_OHM, LEADS_OHM, LEADS_F = 2e11, 6e11, 8e-12


def film(leak_ohm: float, *, leads: bool, seed: int = 41) -> Spectrum:
    model = catalogue()["film_with_pores"]
    theta = model.natural(np.array([[60.0, 6e-10, 0.985, leak_ohm]]))
    admittance = 1.0 / model.impedance(theta, FREQUENCY_HZ)[0]
    if leads:
        admittance = admittance + 1.0 / LEADS_OHM + 2j * np.pi * FREQUENCY_HZ * LEADS_F
    random = np.random.default_rng(seed)
    noise = random.standard_normal(57) + 1j * random.standard_normal(57)
    return Spectrum(FREQUENCY_HZ, (1.0 / admittance) * (1.0 + 0.002 * noise))


def campaign(
    *spectra: Spectrum, hours: tuple[float, ...] = (24.0,), **settings: object
) -> Campaign:
    readings = tuple(
        Reading(f"r{i}", "p", hour, spectrum, Source(f"{i}.csv", f"{i:064d}"))
        for i, (spectrum, hour) in enumerate(zip(spectra, hours, strict=True))
    )
    return Campaign(
        "c",
        "t",
        Settings(**settings),  # type: ignore[arg-type]
        (Formulation("f", "F"),),
        (Panel("p", "P", "f", 10.0),),
        readings,
    )


def only(of: Campaign) -> ReadingAssessment:
    (reading,) = assess(of).readings
    return reading


def codes(reading: ReadingAssessment) -> set[str]:
    return {finding.code for finding in reading.findings}


STATED = {"input_resistance_ohm": LEADS_OHM, "input_capacitance_f": LEADS_F}


def test_a_leak_near_the_stated_input_is_a_lower_bound() -> None:
    reading = only(campaign(film(LEAK_OHM, leads=True), **STATED))
    leak = reading.pore_resistance
    assert leak is not None
    assert leak.bound is Bound.AT_LEAST
    assert leak.value is not None
    assert leak.value <= 10.0 * LEAK_OHM


def test_the_leads_can_be_taken_away_and_the_leak_comes_out() -> None:
    measured = film(LEAK_OHM, leads=True)
    without = only(campaign(measured, **STATED))
    corrected = only(campaign(measured, take_leads_away=True, **STATED))
    assert "leads_taken_away" in codes(corrected)
    assert "leads_taken_away" not in codes(without)
    leak = corrected.pore_resistance
    assert leak is not None
    assert leak.bound is Bound.TWO_SIDED
    assert leak.low is not None
    assert leak.high is not None
    assert leak.low <= 10.0 * LEAK_OHM <= leak.high
    alone = only(campaign(film(LEAK_OHM, leads=False)))
    assert corrected.coating_capacitance is not None
    assert alone.coating_capacitance is not None
    assert corrected.coating_capacitance.value == pytest.approx(
        alone.coating_capacitance.value, rel=0.01
    )
    # The fit lies beside the spectrum as it was measured.
    assert corrected.fit is not None
    apart = np.abs(corrected.fit.modelled_ohm / measured.impedance_ohm - 1.0)
    assert np.sqrt(np.mean(apart**2)) < 0.005


def test_an_open_lead_run_counts_before_a_statement() -> None:
    lead = Spectrum(FREQUENCY_HZ, 1.0 / (1.0 / LEADS_OHM + 2j * np.pi * FREQUENCY_HZ * LEADS_F))
    wrong = {"input_resistance_ohm": 1e3, "take_leads_away": True}
    given = replace(campaign(film(LEAK_OHM, leads=True), **wrong), open_lead=lead)
    leak = only(given).pore_resistance
    assert leak is not None
    assert leak.value == pytest.approx(10.0 * LEAK_OHM, rel=0.05)


def test_what_the_leads_hide_altogether_stays_hidden() -> None:
    hidden = only(campaign(film(1e15, leads=True), take_leads_away=True, **STATED))
    leak = hidden.pore_resistance
    assert leak is None or leak.bound is not Bound.TWO_SIDED


OWN = {
    "id": "sealed",
    "name": "Sealed film",
    "inductance": True,
    "layer": [{"role": "film", "dielectric": "capacitor", "ionic": "resistor"}],
    "fixed": {"L": 1e-6},
}


def test_a_campaigns_own_model_can_be_pinned() -> None:
    given = campaign(film(1e8, leads=False), own_models=(json.dumps(OWN),))
    pinned = replace(given, readings=(replace(given.readings[0], pinned_model="sealed"),))
    reading = only(pinned)
    assert reading.fit is not None
    assert (reading.fit.model, reading.fit.model_name) == ("sealed", "Sealed film")
    # Gone again, the reading is fitted all the same, and says so.
    gone = replace(pinned, settings=Settings())
    reading = only(gone)
    assert reading.fit is not None
    assert reading.fit.model == "film_with_pores"
    assert "pinned_model_missing" in codes(reading)


@pytest.mark.parametrize(
    ("text", "said"),
    [
        ("{", "JSON object"),
        ("[]", "JSON object"),
        (json.dumps(OWN | {"id": "film_with_pores"}), "choose another id"),
        (json.dumps(OWN | {"layer": [{"role": "film", "ionic": "pipe"}]}), "use one of"),
        (
            json.dumps(
                OWN
                | {
                    "layer": [
                        {"role": "film", "dielectric": "capacitor", "next_layer": "behind_layer"},
                        {"role": "interface", "dielectric": "capacitor"},
                    ]
                }
            ),
            "C_c and C_dl apart",
        ),
    ],
)
def test_a_model_that_cannot_be_used_is_named_and_nothing_else_is_lost(
    text: str, said: str
) -> None:
    with pytest.raises(ModelError, match=said):
        own_model(text)
    assessment = assess(campaign(film(1e8, leads=False), own_models=(text,)))
    assert any(f.code == "own_model_unusable" for f in assessment.findings)
    assert assessment.readings[0].fit is not None


def test_repeated_sweeps_weigh_each_other() -> None:
    sweeps = [film(1e8, leads=False, seed=seed) for seed in (1, 2, 3)]
    together = assess(campaign(*sweeps, hours=(24.0, 24.0, 24.0)))
    assert all("weights_from_repeats" in codes(r) for r in together.readings)
    apart = assess(campaign(*sweeps, hours=(24.0, 48.0, 72.0)))
    assert not any("weights_from_repeats" in codes(r) for r in apart.readings)
