"""The sample campaign through the whole job, against the truth it was made from."""

from __future__ import annotations

import importlib.util
import json
import re
from pathlib import Path

import pytest

from coatgui.assessment import assess
from coatgui.campaign import campaign_from_found
from coatgui.intake import read_folder
from coatgui.records import Assessment, Bound, Found, ReadingAssessment
from coatgui.shipped import sample_panels

TRUTH = json.loads((sample_panels() / "truth.json").read_text(encoding="utf-8"))
FAULTY = {name for name, known in TRUTH["readings"].items() if known["fault"]}


@pytest.fixture(scope="module")
def found() -> Found:
    return read_folder(sample_panels())


@pytest.fixture(scope="module")
def assessment(found: Found) -> Assessment:
    return assess(campaign_from_found(found, "Sample"))


def name_of(reading: ReadingAssessment) -> str:
    return f"{reading.panel}_{reading.exposure_h:g}h"


def test_the_files_are_what_the_script_makes(tmp_path: Path) -> None:
    script = sample_panels() / "make_sample_panels.py"
    spec = importlib.util.spec_from_file_location("make_sample_panels", script)
    assert spec is not None
    assert spec.loader is not None
    module = importlib.util.module_from_spec(spec)
    import sys

    sys.modules["make_sample_panels"] = module
    try:
        spec.loader.exec_module(module)
        module.make(tmp_path)
    finally:
        del sys.modules["make_sample_panels"]
    made = {path.name for path in tmp_path.iterdir()}
    there = {p.name for p in sample_panels().iterdir() if p.is_file()}
    assert there - made == {"README.md", "make_sample_panels.py"}
    for name in sorted(made):
        assert (tmp_path / name).read_bytes() == (sample_panels() / name).read_bytes(), name


def test_every_file_is_read_or_refused_by_name(found: Found) -> None:
    assert sorted(refusal.file for refusal in found.refused) == sorted(TRUTH["refused"])
    assert len(found.readings) == 12 * 9 - 1
    assert found.open_lead is not None
    assert len(found.panels) == 12


def test_every_dialect_is_read_to_the_numbers(found: Found) -> None:
    """Film capacitance at 10 kHz, straight from the points, is the truth's plus the leads'."""
    import numpy as np

    areas = {panel.panel: panel.area_cm2 or 0.0 for panel in found.panels}
    for reading in found.readings:
        known = TRUTH["readings"][f"{reading.panel}_{reading.exposure_h:g}h"]
        if known["fault"]:
            continue
        place = int(np.abs(np.log(reading.spectrum.frequency_hz / 1e4)).argmin())
        omega = 2 * np.pi * reading.spectrum.frequency_hz[place]
        admittance = 1 / reading.spectrum.impedance_ohm[place]
        wanted = known["capacitance_f_per_cm2"] * areas[reading.panel] + 6e-12
        assert admittance.imag / omega == pytest.approx(wanted, rel=0.03)


def test_water_uptake_is_recovered(assessment: Assessment) -> None:
    inside = total = 0
    for reading in assessment.readings:
        known = TRUTH["readings"][name_of(reading)]
        uptake = reading.water_uptake
        if uptake is None or name_of(reading) in FAULTY:
            continue
        assert uptake.quantity.value == pytest.approx(known["water_volume_percent"], abs=0.3)
        total += 1
        low, high = uptake.quantity.low, uptake.quantity.high
        assert low is not None
        assert high is not None
        inside += low <= known["water_volume_percent"] <= high
    assert total >= 100
    assert inside >= 0.9 * total


def test_pore_resistance_is_recovered_or_bounded(assessment: Assessment) -> None:
    areas = {panel.panel: panel.area_cm2 or 0.0 for panel in assessment.panels}
    inside = total = bounds = 0
    for reading in assessment.readings:
        known = TRUTH["readings"][name_of(reading)]
        quantity = reading.pore_resistance
        if quantity is None or name_of(reading) in FAULTY:
            continue
        truth = known["R_po"] * areas[reading.panel]
        if quantity.bound is Bound.AT_LEAST:
            bounds += 1
            assert quantity.low is not None
            assert truth >= 0.97 * quantity.low
        elif quantity.bound is Bound.TWO_SIDED:
            assert quantity.value == pytest.approx(truth, rel=0.1)
            assert quantity.low is not None
            assert quantity.high is not None
            total += 1
            inside += quantity.low <= truth <= quantity.high
    assert bounds >= 20  # the best formulation lies at the leads' limit
    assert total >= 60
    assert inside >= 0.9 * total


def test_metal_and_diffusion_are_seen(assessment: Assessment) -> None:
    reacting = {"pores_reacting_interface", "pores_to_metal", "pores_diffusion_tail"}
    wrong = []
    for reading in assessment.readings:
        known = TRUTH["readings"][name_of(reading)]
        if reading.fit is None or known["fault"]:
            continue
        metal = known["family"] != "film"
        if metal != (reading.fit.model in reacting):
            wrong.append(name_of(reading))
    assert wrong == []


def test_diffusion_is_seen_when_it_is_there_and_not_before(assessment: Assessment) -> None:
    wrong = []
    for reading in assessment.readings:
        known = TRUTH["readings"][name_of(reading)]
        if reading.fit is None or known["fault"]:
            continue
        if (known["family"] == "diffusion") != (reading.fit.model == "pores_diffusion_tail"):
            wrong.append(name_of(reading))
    assert wrong == []


def test_faults_are_named(assessment: Assessment) -> None:
    by_name = {name_of(reading): reading for reading in assessment.readings}

    def codes(name: str) -> set[str]:
        return {finding.code for finding in by_name[name].findings}

    assert "wild_point" in codes("K2_72h")
    assert "mains_pick_up" in codes("M1_168h")
    assert "wild_point" not in codes("M1_168h")
    assert codes("P2_336h") & {"drift", "kramers_kronig"}
    assert not by_name["P3_504h"].counts
    assert by_name["P3_504h"].fit is None
    assert [r.counts for r in assessment.readings].count(False) == 1


def test_the_course_of_the_campaign(assessment: Assessment) -> None:
    ranks = {rank.formulation[0]: rank for rank in assessment.ranking}
    assert (ranks["K"].rank_low, ranks["K"].rank_high) == (1, 1)
    panels = {panel.panel: panel for panel in assessment.panels}
    crossed = [(c.after_h, c.by_h) for c in panels["P4"].limit_crossings if c.by_h is not None]
    assert crossed == [(72.0, 168.0)]
    dried = [event for event in panels["M3"].events if "lost water" in event.text]
    assert [(event.after_h, event.by_h) for event in dried] == [(168.0, 336.0)]


def test_film_capacitance_is_recovered(assessment: Assessment) -> None:
    """Where the law is the fitted element at 10 kHz, the truth's own footing."""
    inside = total = 0
    for reading in assessment.readings:
        known = TRUTH["readings"][name_of(reading)]
        quantity = reading.coating_capacitance
        if quantity is None or name_of(reading) in FAULTY or "at 10 kHz" not in quantity.method:
            continue
        total += 1
        assert quantity.low is not None
        assert quantity.high is not None
        inside += quantity.low <= known["capacitance_f_per_cm2"] <= quantity.high
    assert total >= 30
    assert inside >= 0.9 * total


def test_readme_says_of_the_sample_what_the_program_says(assessment: Assessment) -> None:
    readme = Path(__file__).resolve().parent.parent.joinpath("README.md").read_text("utf-8")
    said = {assessment.headline, *(r.reason for r in assessment.refused)}
    said |= {event.text for panel in assessment.panels for event in panel.events}
    said |= {crossing.text for panel in assessment.panels for crossing in panel.limit_crossings}
    ranking = assessment.ranking_text.split(" Judged by")[0]
    after = assessment.next_inspection.text.split(";")[0] if assessment.next_inspection else ""
    example = readme.split("## A worked example")[1].split("\n## ")[0]
    quoted = re.findall("“([^”]*)”", example)
    known = {*said, ranking, after, "at least", "Try the sample campaign"}
    assert [words for words in quoted if words not in known] == []
    assert any(reason in example for reason in (r.reason for r in assessment.refused))
    assert {assessment.headline, ranking, after} <= set(quoted)
    # The means at the end, to the tenth of a percent that is quoted.
    courses = [
        course
        for formulation in assessment.formulations
        for course in formulation.courses
        if course.code == "water_uptake"
    ]
    wanted = [f"{course.points[-1].quantity.value:.1f}" for course in courses]
    assert f"{wanted[0]}, {wanted[1]} and {wanted[2]} volume-percent" in example
