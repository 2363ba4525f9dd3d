"""Faults of bookkeeping put into the sample campaign are suspected; a sound campaign is not."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace

import numpy as np
import pytest

from coatgui.assessment import assess
from coatgui.assessment.suspicion import with_suspicions
from coatgui.campaign import campaign_from_found
from coatgui.intake import read_folder
from coatgui.records import (
    Assessment,
    Bound,
    Campaign,
    Finding,
    Panel,
    Parameter,
    Quantity,
    Reading,
    Severity,
    Spectrum,
)
from coatgui.shipped import sample_panels

CODES = {
    "same_numbers", "temperature_apart", "potential_apart", "same_time", "exposure_time_suspected",
    "panel_suspected", "unit_suspected", "amplitude_large", "interface_capacitance_unphysical",
    "permittivity_implausible", "temperature_drift", "potential_drift",
}  # fmt: skip


@pytest.fixture(scope="module")
def campaign() -> Campaign:
    return campaign_from_found(read_folder(sample_panels()), "Sample")


@pytest.fixture(scope="module")
def assessment(campaign: Campaign) -> Assessment:
    return assess(campaign)


Suspected = dict[tuple[str, float], list[Finding]]


@pytest.fixture
def suspected(assessment: Assessment) -> Callable[[Campaign], Suspected]:
    """Suspicions about a changed campaign, by panel and exposure time in the campaign as it was
    (-1 for the panel itself)."""

    def answer(changed: Campaign) -> Suspected:
        bare = [replace(r, findings=()) for r in assessment.readings]
        panels = [replace(p, findings=()) for p in assessment.panels]
        readings, panels = with_suspicions(changed, bare, panels)
        result = {(r.panel, r.exposure_h): list(r.findings) for r in readings if r.findings}
        result |= {(p.panel, -1.0): list(p.findings) for p in panels if p.findings}
        return result

    return answer


def reading(campaign: Campaign, panel: str, exposure_h: float) -> Reading:
    ids = {p.name: p.panel_id for p in campaign.panels}
    return next(
        r for r in campaign.readings if r.panel_id == ids[panel] and r.exposure_h == exposure_h
    )


def changed(campaign: Campaign, *readings: Reading) -> Campaign:
    new = {r.reading_id: r for r in readings}
    return replace(campaign, readings=tuple(new.get(r.reading_id, r) for r in campaign.readings))


def changed_panel(campaign: Campaign, name: str, **facts: float) -> Campaign:
    def edit(panel: Panel) -> Panel:
        return replace(panel, **facts) if panel.name == name else panel

    return replace(campaign, panels=tuple(edit(p) for p in campaign.panels))


def test_a_sound_campaign_raises_no_suspicion(
    campaign: Campaign, assessment: Assessment, suspected: Callable[[Campaign], Suspected]
) -> None:
    assert suspected(campaign) == {}
    codes = {f.code for r in assessment.readings for f in r.findings}
    assert not codes & CODES


def test_exchanged_files_are_suspected_of_each_other(
    campaign: Campaign, suspected: Callable[[Campaign], Suspected]
) -> None:
    first, second = reading(campaign, "K1", 72), reading(campaign, "M2", 72)
    swapped = changed(
        campaign,
        replace(first, spectrum=second.spectrum),
        replace(second, spectrum=first.spectrum),
    )
    found = suspected(swapped)
    assert set(found) == {("K1", 72), ("M2", 72)}
    for (panel, _), other in zip(sorted(found), ("M", "K"), strict=True):
        (finding,) = found[(panel, 72)]
        assert finding.code == "panel_suspected"
        assert finding.severity is Severity.DOUBT
        assert f"panel {other}" in finding.text
        assert dict(finding.evidence)["apart_own"] > 2 * dict(finding.evidence)["apart_other"]


@pytest.mark.parametrize(
    ("factor", "words"),
    [(1e-3, "kΩ and read as Ω"), (1e3, "Ω and read as kΩ"), (1e6, "Ω and read as MΩ")],
)
def test_a_reading_in_another_unit_is_suspected(
    campaign: Campaign,
    suspected: Callable[[Campaign], Suspected],
    factor: float,
    words: str,
) -> None:
    one = reading(campaign, "M1", 24)
    other = Spectrum(one.spectrum.frequency_hz, factor * one.spectrum.impedance_ohm)
    found = suspected(changed(campaign, replace(one, spectrum=other)))
    assert set(found) == {("M1", 24)}
    (finding,) = found[("M1", 24)]
    assert finding.code == "unit_suspected"
    assert words in finding.text
    assert dict(finding.evidence)["factor"] == pytest.approx(factor)


@pytest.mark.parametrize(("times", "words"), [(True, "multiplied"), (False, "divided")])
def test_a_reading_with_the_area_in_it_is_suspected(
    campaign: Campaign,
    suspected: Callable[[Campaign], Suspected],
    times: bool,
    words: str,
) -> None:
    one = reading(campaign, "K2", 168)
    area = next(p.area_cm2 for p in campaign.panels if p.panel_id == one.panel_id)
    assert area is not None
    factor = area if times else 1 / area
    other = Spectrum(one.spectrum.frequency_hz, factor * one.spectrum.impedance_ohm)
    (finding,) = suspected(changed(campaign, replace(one, spectrum=other)))[("K2", 168)]
    assert finding.code == "unit_suspected"
    assert f"{words} by the area" in finding.text


def test_the_same_numbers_twice_are_named(
    campaign: Campaign, suspected: Callable[[Campaign], Suspected]
) -> None:
    copied = replace(reading(campaign, "K3", 672), spectrum=reading(campaign, "K3", 504).spectrum)
    found = suspected(changed(campaign, copied))
    (finding,) = [f for those in found.values() for f in those if f.code == "same_numbers"]
    assert "K3" in finding.text


def test_temperature_and_potential_apart_are_named(
    campaign: Campaign, suspected: Callable[[Campaign], Suspected]
) -> None:
    warm = [
        replace(reading(campaign, "M1", t), temperature_c=c, potential_mv=mv)
        for t, c, mv in (
            (1, 23.0, -510.0),
            (3, 24.0, -520.0),
            (8, 29.0, -530.0),
            (24, 22.5, -300.0),
        )
    ]
    found = suspected(changed(campaign, *warm))
    assert {key: [f.code for f in those] for key, those in found.items()} == {
        ("M1", 8): ["temperature_apart"],
        ("M1", 24): ["potential_apart"],
    }
    assert "29 °C" in found[("M1", 8)][0].text
    assert found[("M1", 24)][0].severity is Severity.NOTE


def test_what_ran_within_a_sweep_is_named(
    campaign: Campaign, suspected: Callable[[Campaign], Suspected]
) -> None:
    warm = replace(reading(campaign, "M1", 24), temperature_span_c=(22.5, 25.0))
    restless = replace(reading(campaign, "P4", 672), potential_span_mv=(-640.0, -605.0))
    behind_a_barrier = replace(reading(campaign, "K1", 24), potential_span_mv=(-300.0, -200.0))
    found = suspected(changed(campaign, warm, restless, behind_a_barrier))
    said = {key: [(f.code, f.severity) for f in those] for key, those in found.items()}
    assert said == {
        ("M1", 24): [("temperature_drift", Severity.DOUBT)],
        ("P4", 672): [("potential_drift", Severity.DOUBT)],
        ("K1", 24): [("potential_drift", Severity.NOTE)],
    }
    assert "between 22.5 and 25 °C" in found[("M1", 24)][0].text
    steady = replace(warm, temperature_span_c=(22.5, 23.0), potential_span_mv=(-520.0, -515.0))
    assert suspected(changed(campaign, steady)) == {}


def test_the_amplitude_is_held_against_what_the_spectrum_shows(
    campaign: Campaign, suspected: Callable[[Campaign], Suspected]
) -> None:
    """50 mV: fine on a barrier, too much where pores conduct or metal shows."""
    same = [
        replace(reading(campaign, panel, t), amplitude_mv=50.0)
        for panel, t in (("K1", 24), ("M1", 672), ("P4", 672))
    ]
    found = suspected(changed(campaign, *same))
    assert set(found) == {("M1", 672), ("P4", 672)}
    assert all(those[0].code == "amplitude_large" for those in found.values())
    # Tafel slope of 120 mV a decade: 12 % at 50 mV (calculated).
    assert "off by 12 %" in found[("P4", 672)][0].text
    gentle = [replace(r, amplitude_mv=10.0) for r in same]
    assert suspected(changed(campaign, *gentle)) == {}


def test_a_mistyped_exposure_time_is_suspected(
    campaign: Campaign, suspected: Callable[[Campaign], Suspected]
) -> None:
    typed = replace(reading(campaign, "M2", 168), exposure_h=1680.0)
    found = suspected(changed(campaign, typed))
    finding = next(f for f in found[("M2", 168)] if f.code == "exposure_time_suspected")
    assert "1680 h" in finding.text or "70 d" in finding.text
    twice = replace(reading(campaign, "M2", 168), exposure_h=72.0)
    codes = {f.code for those in suspected(changed(campaign, twice)).values() for f in those}
    assert "same_time" in codes


@pytest.mark.parametrize(
    ("factor", "words"), [(1 / 1000, "Ω had been read as kΩ"), (1 / 25.4, "mil"), (7.0, "")]
)
def test_a_thickness_that_means_no_film_is_named(
    campaign: Campaign,
    suspected: Callable[[Campaign], Suspected],
    factor: float,
    words: str,
) -> None:
    thickness = next(p.thickness_um for p in campaign.panels if p.name == "K1")
    assert thickness is not None
    found = suspected(changed_panel(campaign, "K1", thickness_um=factor * thickness))
    (finding,) = found[("K1", -1.0)]
    assert finding.code == "permittivity_implausible"
    assert words in finding.text


def test_an_interface_beyond_bare_metal_is_named(
    campaign: Campaign, assessment: Assessment
) -> None:
    quantity = Quantity(3e-4, 2e-4, 4e-4, Bound.TWO_SIDED, "F/cm²")
    first = replace(
        assessment.readings[0], findings=(), parameters=(Parameter("C_dl", "", 2, quantity),)
    )
    readings, _ = with_suspicions(campaign, [first], [])
    assert [f.code for f in readings[0].findings] == ["interface_capacitance_unphysical"]
    usual = replace(first, parameters=(Parameter("C_dl", "", 2, replace(quantity, low=9e-5)),))
    readings, _ = with_suspicions(campaign, [usual], [])
    assert readings[0].findings == ()


def test_most_exchanges_and_units_are_found(campaign: Campaign) -> None:
    """A smaller sample of what tests/benchmarks/checks_series.py counts in full."""
    from coatgui.assessment.neighbours import course_findings
    from coatgui.quality import thresholds

    ids = {p.panel_id: p.name for p in campaign.panels}
    counting = [
        r.reading_id
        for r in campaign.readings
        if (ids[r.panel_id], r.exposure_h) != ("P3", 504)  # useless, and rejected as such
    ]
    limits = thresholds(campaign.settings)
    assert not list(course_findings(campaign, counting, limits))
    hits = total = 0
    for exposure_h in (8.0, 72.0, 168.0, 336.0):
        for one, other in (("K1", "P1"), ("K2", "M2"), ("M1", "P2"), ("K4", "M1"), ("M2", "P4")):
            first, second = (reading(campaign, name, exposure_h) for name in (one, other))
            swapped = changed(
                campaign,
                replace(first, spectrum=second.spectrum),
                replace(second, spectrum=first.spectrum),
            )
            total += 1
            hits += bool(list(course_findings(swapped, counting, limits)))
    assert hits >= 0.95 * total


def test_the_first_and_the_last_reading_are_held_against_their_neighbour(
    campaign: Campaign, suspected: Callable[[Campaign], Suspected]
) -> None:
    times = sorted(r.exposure_h for r in campaign.readings if r.panel_id == panel_id(campaign))
    for exposure_h, words in ((times[0], "reading after it"), (times[-1], "reading before it")):
        one = reading(campaign, "K1", exposure_h)
        small = Spectrum(one.spectrum.frequency_hz, 1e-3 * one.spectrum.impedance_ohm)
        found = suspected(changed(campaign, replace(one, spectrum=small)))
        assert set(found) == {("K1", exposure_h)}
        (finding,) = found[("K1", exposure_h)]
        assert finding.code == "unit_suspected"
        assert words in finding.text
        other = reading(campaign, "P1", exposure_h)
        swapped = suspected(
            changed(
                campaign,
                replace(one, spectrum=other.spectrum),
                replace(other, spectrum=one.spectrum),
            )
        )
        assert set(swapped) == {("K1", exposure_h), ("P1", exposure_h)}
        assert {f.code for those in swapped.values() for f in those} == {"panel_suspected"}


def test_a_panel_that_fails_at_its_last_reading_is_not_suspected(
    campaign: Campaign, suspected: Callable[[Campaign], Suspected]
) -> None:
    """It looks like a panel that failed long ago, but that one's reading is where it belongs."""
    last = max(r.exposure_h for r in campaign.readings if r.panel_id == panel_id(campaign))
    good, failed = reading(campaign, "K1", last), reading(campaign, "P1", last)
    noise = 1 + 0.01 * np.random.default_rng(1).standard_normal(len(failed.spectrum))
    alike = Spectrum(failed.spectrum.frequency_hz, noise * failed.spectrum.impedance_ohm)
    found = suspected(changed(campaign, replace(good, spectrum=alike)))
    assert ("K1", last) not in found


def panel_id(campaign: Campaign, name: str = "K1") -> str:
    return next(p.panel_id for p in campaign.panels if p.name == name)
