"""A small assessment made by hand: every kind of bound, a panel without an area, nothing fitted."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np
import pytest

from coatgui.records import (
    Assessment,
    Bound,
    Campaign,
    Column,
    Course,
    CoursePoint,
    Criterion,
    Dialect,
    Event,
    Finding,
    Fit,
    FormulationAssessment,
    LeftOutPoint,
    LimitCrossing,
    Modulus,
    ModulusStatus,
    Panel,
    PanelAssessment,
    Parameter,
    Quantity,
    Rank,
    Reading,
    ReadingAssessment,
    Refusal,
    Settings,
    Severity,
    Source,
    Spectrum,
    Trial,
    WaterUptake,
)

SPECTRUM = Spectrum(np.array([1e4, 1.0]), np.array([1e3 - 1e4j, 1e6 - 1e5j]))
DIALECT = Dialect(
    "cp1252",
    ";",
    ",",
    4,
    (Column(0, "f", "frequency", "kHz", 1e3), Column(1, "note", "other", "")),
    remarks=("The decimal sign is a comma.",),
)
THIRD = 1.0 / 3.0


def two_sided(value: float, unit: str, method: str = "") -> Quantity:
    return Quantity(value, 0.9 * value, 1.1 * value, Bound.TWO_SIDED, unit, method)


@pytest.fixture
def assessment() -> Assessment:
    at_least = Quantity(3e9, 3e9, None, Bound.AT_LEAST, "Ω cm²", "the leads")
    parameters = (
        Parameter("Q_c", "film", 1, two_sided(THIRD * 1e-9, "S·sⁿ/cm²")),
        Parameter("R_po", "pores", 1, at_least),
        Parameter("σ", "diffusion", 2, Quantity(2e5, None, 2e5, Bound.AT_MOST, "Ω·s^-½ cm²")),
        Parameter("n_c", "film", 1, Quantity(1.0, None, None, Bound.FIXED, "")),
        Parameter("R_ct", "metal", 2, Quantity(None, None, None, Bound.UNDETERMINED, "Ω cm²")),
        Parameter(
            "R_s", "solution", 0, Quantity(math.nan, -math.inf, math.inf, Bound.TWO_SIDED, "Ω cm²")
        ),
    )
    fit = Fit(
        "film_with_pores",
        "Film with pores",
        parameters,
        SPECTRUM.impedance_ohm,
        np.array([True, False]),
        0.31,
        True,
        "",
        (Trial("closed_film", 3, math.inf, math.nan, "no better"),),
    )
    first = ReadingAssessment(
        reading_id="r1",
        panel_id="p1",
        panel="A1",
        formulation="A",
        exposure_h=24.0,
        file="A1_24h.csv",
        sha256="1" * 64,
        points_read=2,
        points_used=1,
        left_out=(LeftOutPoint(1.0, "wild point"),),
        findings=(Finding("drift", Severity.DOUBT, "It drifted.", (1,), (("percent", math.nan),)),),
        counts=True,
        modulus=(
            Modulus(0.1, ModulusStatus.INTERPOLATED, two_sided(5e9, "Ω cm²")),
            Modulus(0.01, ModulusStatus.NOT_REACHED, None),
        ),
        fit=fit,
        parameters=parameters,
        coating_capacitance=two_sided(4e-11, "F/cm²", "law of the film"),
        capacitance_at_high_frequency=two_sided(4.2e-11, "F/cm²", "parallel"),
        pore_resistance=at_least,
        water_uptake=WaterUptake(two_sided(1.5, "vol-%", "Brasher–Kingsbury"), 0.0),
    )
    second = replace(
        first,
        reading_id="r2",
        panel_id="p2",
        panel="B1",
        formulation="B",
        exposure_h=48.0,
        file="stack.csv",
        left_out=(),
        findings=(Finding("useless", Severity.REJECT, "Measure again."),),
        counts=False,
        modulus=(Modulus(0.01, ModulusStatus.MEASURED, two_sided(7e8, "Ω")),),
        fit=None,
        parameters=(),
        coating_capacitance=None,
        capacitance_at_high_frequency=None,
        pore_resistance=Quantity(6e8, None, 6e8, Bound.AT_MOST, "Ω"),
        water_uptake=None,
    )
    limit = Criterion("Barrier limit", 0.1, 1e7, "agreed")
    panels = (
        PanelAssessment(
            "p1",
            "A1",
            "A",
            14.6,
            80.0,
            two_sided(3.8e-11, "F/cm²"),
            two_sided(9e-10, "cm²/s"),
            (Finding("fick", Severity.NOTE, "Fick's law follows."),),
            (Event("pores", "The pores conduct.", 8.0, 24.0),),
            (LimitCrossing(limit, 8.0, 24.0, "Below the limit."),),
        ),
        PanelAssessment("p2", "B1", "B", None, None, None, None),
    )
    course = Course(
        "modulus_0.1",
        "|Z| at 0.1 Hz",
        (CoursePoint(24.0, replace(at_least, method="geometric mean of 1 panel"), 1, 1),),
    )
    return Assessment(
        title="By hand",
        readings=(first, second),
        panels=panels,
        formulations=(
            FormulationAssessment("f1", "A", 1, (course,), "Steady."),
            FormulationAssessment("f2", "B", 1, ()),
        ),
        ranking=(Rank("A", 1, 1, "a"), Rank("B", 1, 2, "a")),
        ranking_text="A and B cannot be told apart.",
        refused=(Refusal("notes.txt", "No table."),),
        findings=(Finding("default", Severity.NOTE, "Usual limits are used."),),
        cautions=("Mind the fog.",),
        headline="2 panels.",
    )


@pytest.fixture
def campaign() -> Campaign:
    source = Source("A1_24h.csv", "1" * 64, dialect=DIALECT)
    return Campaign(
        "c",
        "By hand",
        Settings(temperature_c=21.5, criteria=(Criterion("Own limit", 0.01, 1e6, "contract"),)),
        panels=(
            Panel("p1", "A1", "f1", 14.6, 80.0, "steel", "brine", 23.0, "cyclic", "chipped",
                  (("operator", "night shift"),)),
            Panel("p2", "B1", "f2"),
        ),
        readings=(
            Reading("r1", "p1", 24.0, SPECTRUM, source, remark="door open", left_out=((1, "x"),),
                    pinned_model="film_with_pores"),
            Reading("r2", "p2", 48.0, SPECTRUM, Source("stack.csv", "2" * 64, "48 h")),
        ),
        open_lead=SPECTRUM,
        open_lead_source=Source("open_lead.csv", "3" * 64),
    )  # fmt: skip
