"""The facade with checks and fits that are known beforehand: masks, rejection, cache, records.

The real checks and the real fitting are joined up in `test_sample_truth.py`.
"""

from __future__ import annotations

import gc
import importlib
from collections.abc import Callable, Iterable, Mapping, Sequence
from dataclasses import replace
from typing import Any

import numpy as np
import pytest

from coatgui.assessment import assess
from coatgui.assessment.assess import collection
from coatgui.assessment.sorption import fickian_uptake
from coatgui.progress import Cancelled, Progress
from coatgui.records import (
    Bound,
    Campaign,
    Check,
    Finding,
    Fit,
    Formulation,
    Panel,
    Reading,
    Refusal,
    Settings,
    Severity,
    Source,
    Spectrum,
)

AREA_CM2 = 10.0
HOURS = (1.0, 4.0, 8.0, 24.0, 168.0)
UPTAKE = 0.03
Made = Callable[..., tuple[Spectrum, Fit]]


class Memory:
    """A result cache in memory that counts what is asked of it."""

    def __init__(self) -> None:
        self.kept: dict[str, bytes] = {}

    def cached_results(self, keys: Iterable[str], /) -> dict[str, bytes]:
        return {key: self.kept[key] for key in keys if key in self.kept}

    def keep_results(self, results: Mapping[str, bytes], /) -> None:
        self.kept.update(results)


class Known:
    """Stands in for checks and fitting: knows the truth of every spectrum, remembers its calls."""

    def __init__(self, made: Made) -> None:
        self._made = made
        self.fits: dict[Spectrum, Fit] = {}
        self.checks: dict[Spectrum, Check] = {}
        self.fitted: list[tuple[Spectrum, np.ndarray]] = []
        self.open_leads: list[Spectrum | None] = []

    def spectrum(self, values: Mapping[str, float]) -> Spectrum:
        # A little more in series makes equal films distinguishable spectra.
        distinct = dict(values) | {"R_s": values["R_s"] + 1e-6 * len(self.fits)}
        spectrum, fit = self._made(distinct, percent=0.2, scatter=0.2)
        self.fits[spectrum] = fit
        return spectrum

    def check_spectra(self, spectra: Sequence[Spectrum], **_: Any) -> list[Check]:
        return [self.checks.get(s, Check()) for s in spectra]

    def fit_spectra(
        self,
        spectra: Sequence[Spectrum],
        used: Sequence[np.ndarray],
        *,
        open_lead: Spectrum | None,
        **_: Any,
    ) -> list[Fit | None]:
        self.fitted.extend(zip(spectra, used, strict=True))
        self.open_leads.append(open_lead)
        return [
            replace(self.fits[s], used=mask) if mask.sum() > 10 else None
            for s, mask in zip(spectra, used, strict=True)
        ]


@pytest.fixture
def known(made: Made, monkeypatch: pytest.MonkeyPatch) -> Known:
    known = Known(made)
    # In the package, `assess` is the function; its module comes from the import system.
    module = importlib.import_module("coatgui.assessment.assess")
    monkeypatch.setattr(module, "check_spectra", known.check_spectra)
    monkeypatch.setattr(module, "fit_spectra", known.fit_spectra)
    return known


def _film(hours: float, dry: float = 1e-9, ohm: float = 1e8) -> dict[str, float]:
    share = float(fickian_uptake(1e-9 * hours * 3600 / 80e-4**2))
    wet = dry * 78.3033 ** (UPTAKE * share)
    return {"R_s": 50.0, "Q_c": wet, "n_c": 1.0, "R_po": ohm}


def _campaign(known: Known, area_cm2: float | None = AREA_CM2, ohm: float = 1e9) -> Campaign:
    """Two formulations of two panels; M is a thousand times less tight than K."""
    panels, readings = [], []
    for formulation, tightness in (("K", ohm), ("M", 1e5)):
        for number in (1, 2):
            name = f"{formulation}{number}"
            panels.append(Panel(name, name, formulation, area_cm2, 80.0, temperature_c=25.0))
            for hours in HOURS:
                spectrum = known.spectrum(_film(hours, ohm=tightness * (1 + 0.1 * number)))
                source = Source(f"{name}_{hours:g}h.csv", "00")
                readings.append(Reading(f"{name}@{hours:g}", name, hours, spectrum, source))
    return Campaign(
        "c",
        "Trial",
        formulations=(Formulation("K", "K"), Formulation("M", "M")),
        panels=tuple(panels),
        readings=tuple(reversed(readings)),
    )


def _with(campaign: Campaign, reading_id: str, **changes: Any) -> Campaign:
    return replace(
        campaign,
        readings=tuple(
            replace(r, **changes) if r.reading_id == reading_id else r for r in campaign.readings
        ),
    )


def _of(campaign: Campaign, reading_id: str) -> Spectrum:
    return next(r.spectrum for r in campaign.readings if r.reading_id == reading_id)


REJECTION = Check((Finding("kramers_kronig", Severity.REJECT, "It drifted."),))


def test_whole_campaign(known: Known) -> None:
    result = assess(_campaign(known))
    assert [(r.panel, r.exposure_h) for r in result.readings] == [
        (panel, hours) for panel in ("K1", "K2", "M1", "M2") for hours in HOURS
    ]
    reading = result.reading("K1@168")
    assert reading is not None
    assert reading.points_used == reading.points_read == 71
    assert reading.counts
    assert [p.quantity.unit for p in reading.parameters] == [
        "Ω cm²",
        "S·sⁿ/cm²",
        "",
        "Ω cm²",
        "F/cm²",
    ]
    assert reading.parameters[-1].symbol == "C_c"
    assert "Hsu–Mansfeld" in reading.parameters[-1].quantity.method
    assert reading.pore_resistance is not None
    assert reading.pore_resistance.value == pytest.approx(1.1e9 * AREA_CM2)
    assert reading.coating_capacitance is not None
    assert reading.coating_capacitance.value == pytest.approx(1e-10 * 78.3033**UPTAKE, rel=1e-3)
    assert reading.water_uptake is not None
    assert reading.water_uptake.reference_h == 0.0
    assert reading.water_uptake.quantity.value == pytest.approx(100 * UPTAKE, abs=0.1)
    assert result.headline.startswith(
        "4 panels, 5 inspections; 2 panels fell below 10⁷ Ω cm² at 0.1 Hz"
    )
    assert [r.formulation for r in result.ranking] == ["K", "M"]
    assert "K is ahead of M" in result.ranking_text
    assert len(result.cautions) == 7
    assert [c.code for c in result.formulations[0].courses] == [
        "modulus_0.1",
        "modulus_0.01",
        "coating_capacitance",
        "pore_resistance",
        "water_uptake",
    ]


def test_panels_carry_what_their_series_says(known: Known) -> None:
    result = assess(_campaign(known))
    panel = next(p for p in result.panels if p.panel == "M1")
    assert panel.dry_capacitance is not None
    assert panel.dry_capacitance.value == pytest.approx(1e-10, rel=0.005)
    assert panel.diffusion_coefficient is not None
    assert panel.diffusion_coefficient.low is not None
    assert panel.diffusion_coefficient.high is not None
    assert panel.diffusion_coefficient.low < 1e-9 < panel.diffusion_coefficient.high
    (crossing,) = panel.limit_crossings
    assert (crossing.after_h, crossing.by_h) == (None, 1.0)
    assert [e.code for e in panel.events] == ["pores_conducting", "film_saturated"]
    assert panel.events[0].after_h is None  # a leaky film: its first reading dates nothing
    # A film so tight that its capacitance carries the current all the way down has closed pores.
    tight = assess(_campaign(known, ohm=1e12))
    told = next(p for p in tight.panels if p.panel == "K1").events
    assert [e.code for e in told] == ["film_saturated"]


def test_mask_is_checks_less_kept_in_plus_left_out(known: Known) -> None:
    campaign = _campaign(known)
    known.checks[_of(campaign, "K1@4")] = Check(
        suggested=((10, "mains"), (11, "mains")),
    )
    campaign = _with(campaign, "K1@4", kept_in=(11,), left_out=((70, "by hand"),))
    reading = assess(campaign).reading("K1@4")
    assert reading is not None
    assert reading.points_used == 69
    assert [p.reason for p in reading.left_out] == ["mains", "by hand"]
    assert reading.left_out[1].frequency_hz == pytest.approx(0.01)
    mask = next(mask for s, mask in known.fitted if s == _of(campaign, "K1@4"))
    assert np.flatnonzero(~mask).tolist() == [10, 70]
    at_lowest = reading.modulus_at(0.01)
    assert at_lowest is not None
    assert at_lowest.status == "not_reached"


def test_rejected_reading_is_not_fitted_nor_counted(known: Known) -> None:
    campaign = _campaign(known)
    known.checks[_of(campaign, "M1@1")] = REJECTION
    result = assess(campaign)
    reading = result.reading("M1@1")
    assert reading is not None
    assert not reading.counts
    assert reading.fit is None
    assert reading.parameters == ()
    assert reading.water_uptake is None
    assert "not_counted" in {f.code for f in reading.findings}
    assert _of(campaign, "M1@1") not in {s for s, _ in known.fitted}
    assert "1 reading rejected" in result.headline
    (crossing,) = next(p for p in result.panels if p.panel == "M1").limit_crossings
    assert crossing.by_h == 4.0


def test_overruled_reading_is_used_and_says_why(known: Known) -> None:
    campaign = _campaign(known)
    known.checks[_of(campaign, "M1@1")] = REJECTION
    result = assess(_with(campaign, "M1@1", overruled_because="the door was open, no harm"))
    reading = result.reading("M1@1")
    assert reading is not None
    assert reading.counts
    assert reading.fit is not None
    overruled = next(f for f in reading.findings if f.code == "rejection_overruled")
    assert "the door was open" in overruled.text


def test_too_few_points_say_so(known: Known) -> None:
    campaign = _campaign(known)
    left_out = tuple((i, "by hand") for i in range(65))
    reading = assess(_with(campaign, "K1@4", left_out=left_out)).reading("K1@4")
    assert reading is not None
    assert reading.fit is None
    assert "no_fit" in {f.code for f in reading.findings}
    assert reading.counts


def test_only_the_panel_that_changed_is_fitted_again(known: Known) -> None:
    campaign = _campaign(known)
    memory = Memory()
    first = assess(campaign, cache=memory)
    assert len(known.fitted) == 20
    known.fitted.clear()
    again = assess(campaign, cache=memory)
    assert known.fitted == []
    assert again.readings[3].parameters == first.readings[3].parameters
    assert again.headline == first.headline
    assess(_with(campaign, "K2@4", left_out=((3, "by hand"),)), cache=memory)
    assert {_panel_of(campaign, s) for s, _ in known.fitted} == {"K2"}
    known.fitted.clear()
    memory.kept = dict.fromkeys(memory.kept, b"damaged")
    assess(campaign, cache=memory)
    assert len(known.fitted) == 20


def _panel_of(campaign: Campaign, spectrum: Spectrum) -> str:
    return next(r.panel_id for r in campaign.readings if r.spectrum == spectrum)


def test_without_area_values_are_per_specimen_and_say_so(known: Known) -> None:
    result = assess(_campaign(known, area_cm2=None))
    reading = result.reading("K1@168")
    assert reading is not None
    assert "no_area" in {f.code for f in reading.findings}
    assert reading.pore_resistance is not None
    assert reading.pore_resistance.unit == "Ω"
    modulus = reading.modulus_at(0.1)
    assert modulus is not None
    assert modulus.quantity is not None
    assert modulus.quantity.unit == "Ω"
    assert all(p.limit_crossings == () for p in result.panels)


@pytest.mark.parametrize("factor", [0.1, 7.0])
def test_area_scales_everything_and_changes_no_uptake(known: Known, factor: float) -> None:
    one = assess(_campaign(known)).reading("K2@24")
    other = assess(_campaign(known, area_cm2=AREA_CM2 * factor)).reading("K2@24")
    assert one is not None
    assert other is not None

    def value(quantity: Any) -> float:
        assert quantity is not None
        assert quantity.value is not None
        return float(quantity.value)

    def modulus(reading: Any) -> float:
        return value(reading.modulus_at(0.1).quantity)

    assert modulus(other) == pytest.approx(modulus(one) * factor, rel=1e-6)
    assert value(other.pore_resistance) == pytest.approx(value(one.pore_resistance) * factor)
    assert value(other.coating_capacitance) == pytest.approx(
        value(one.coating_capacitance) / factor
    )
    assert one.water_uptake is not None
    assert other.water_uptake is not None
    assert value(other.water_uptake.quantity) == pytest.approx(
        value(one.water_uptake.quantity), abs=1e-6
    )


def test_missing_facts_are_found(known: Known) -> None:
    campaign = _campaign(known)
    first = replace(campaign.panels[0], thickness_um=None, temperature_c=None)
    campaign = replace(
        campaign,
        panels=(first, *campaign.panels[1:]),
        refused=(Refusal("odd.csv", "It holds no numbers."),),
    )
    result = assess(campaign)
    assert {f.code for f in result.panels[0].findings} == {
        "no_thickness",
        "temperature_assumed",
        "sorption_fickian",
    }
    assert result.panels[0].diffusion_coefficient is None
    assert result.panels[0].dry_capacitance is not None
    assert {f.code for f in result.findings} == {"no_open_lead", "default_criterion"}
    assert result.refused == campaign.refused


def test_reading_temperature_comes_before_the_panels(known: Known) -> None:
    campaign = _with(_campaign(known), "K1@168", temperature_c=40.0)
    at_40, at_25 = (assess(campaign).reading(f"{panel}@168") for panel in ("K1", "K2"))
    assert at_40 is not None
    assert at_25 is not None
    assert at_40.water_uptake is not None
    assert at_25.water_uptake is not None
    assert "40 °C" in at_40.water_uptake.quantity.method
    assert "25 °C" in at_25.water_uptake.quantity.method


def test_temperature_beyond_the_law_gives_no_uptake_and_says_so(known: Known) -> None:
    reading = assess(_with(_campaign(known), "K1@24", temperature_c=-5.0)).reading("K1@24")
    assert reading is not None
    assert reading.water_uptake is None
    assert "temperature_outside_law" in {f.code for f in reading.findings}


def test_drying_is_a_finding_and_an_event_and_not_part_of_the_dry_value(known: Known) -> None:
    campaign = _campaign(known)
    dried = known.spectrum(_film(168.0, dry=0.8e-9, ohm=1e9))
    result = assess(_with(campaign, "K1@168", spectrum=dried))
    reading = result.reading("K1@168")
    assert reading is not None
    assert "capacitance_dropped" in {f.code for f in reading.findings}
    panel = next(p for p in result.panels if p.panel == "K1")
    event = next(e for e in panel.events if e.code == "dried_out")
    assert (event.after_h, event.by_h) == (24.0, 168.0)
    assert panel.dry_capacitance is not None
    assert panel.dry_capacitance.value == pytest.approx(1e-10, rel=0.02)


def test_wanted_frequencies_are_the_settings(known: Known) -> None:
    campaign = replace(_campaign(known), settings=Settings(modulus_frequencies_hz=(1.0,)))
    result = assess(campaign)
    assert [m.frequency_hz for m in result.readings[0].modulus] == [1.0]
    assert result.formulations[0].courses[0].code == "modulus_1"
    assert "at 1 Hz" in result.ranking_text
    # The criterion's own frequency is worked out all the same.
    assert result.panels[2].limit_crossings[0].by_h == 1.0


def test_leads_make_values_bounds_and_reach_the_fitting(known: Known, made: Made) -> None:
    campaign = _campaign(known)
    leads, _ = made({"Q_c": 1e-12, "n_c": 1.0, "R_po": 2e9})
    result = assess(replace(campaign, open_lead=leads))
    assert known.open_leads == [leads]
    tight, open_ = result.reading("K1@24"), result.reading("M1@24")
    assert tight is not None
    assert open_ is not None
    assert tight.pore_resistance is not None
    assert tight.pore_resistance.bound is Bound.AT_LEAST
    assert open_.pore_resistance is not None
    assert open_.pore_resistance.bound is Bound.TWO_SIDED
    assert "no_open_lead" not in {f.code for f in result.findings}


def test_empty_campaign_is_assessed_to_nothing(known: Known) -> None:
    result = assess(Campaign("c", "Empty", panels=(Panel("p", "P", "K"),)))
    assert result.readings == ()
    assert {f.code for f in result.panels[0].findings} >= {"no_readings", "no_area"}
    assert result.headline == "1 panel, 0 inspections; no doubts."
    assert result.ranking == ()


def test_progress_is_told_in_words_and_cancelling_keeps_nothing(known: Known) -> None:
    told: list[str] = []
    assess(_campaign(known), progress=Progress(lambda stage, done, total: told.append(stage)))
    assert list(dict.fromkeys(told)) == [
        "Checking readings",
        "Fitting circuits",
        "Drawing conclusions",
    ]
    memory = Memory()
    with pytest.raises(Cancelled):
        assess(_campaign(known), progress=Progress(cancelled=lambda: True), cache=memory)
    assert memory.kept == {}


def test_the_collector_rests_until_the_last_assessment_is_done() -> None:
    assert gc.isenabled()
    with collection.off():
        with pytest.raises(ValueError, match="in between"), collection.off():
            raise ValueError("in between")
        assert not gc.isenabled()
    assert gc.isenabled()
    gc.disable()
    try:
        with collection.off():
            pass
        assert not gc.isenabled()
    finally:
        gc.enable()
