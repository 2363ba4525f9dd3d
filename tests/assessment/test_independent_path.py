"""The sample campaign by another path, `tests/references/independent_path.py`: numpy and scipy
alone, from the same files to the same answers."""

from __future__ import annotations

import importlib.util
import sys
from collections.abc import Iterator
from pathlib import Path
from types import ModuleType
from typing import Any

import numpy as np
import pytest

from coatgui.assessment import assess
from coatgui.campaign import campaign_from_found
from coatgui.intake import read_folder
from coatgui.records import Assessment, ReadingAssessment
from coatgui.shipped import sample_panels

_PATH = Path(__file__).parents[1] / "references" / "independent_path.py"


@pytest.fixture(scope="module")
def other() -> Iterator[ModuleType]:
    spec = importlib.util.spec_from_file_location("independent_path", _PATH)
    assert spec is not None
    assert spec.loader is not None
    module = importlib.util.module_from_spec(spec)
    sys.modules["independent_path"] = module
    try:
        spec.loader.exec_module(module)
        yield module
    finally:
        del sys.modules["independent_path"]


@pytest.fixture(scope="module")
def assessment() -> Assessment:
    return assess(campaign_from_found(read_folder(sample_panels()), "Sample"))


@pytest.fixture(scope="module")
def pairs(assessment: Assessment, other: ModuleType) -> list[tuple[ReadingAssessment, Any]]:
    theirs = {(r.panel, r.hours): r for r in other.results()}
    ours = {(r.panel, r.exposure_h): r for r in assessment.readings}
    assert theirs.keys() == ours.keys()
    return [(ours[key], theirs[key]) for key in ours if ours[key].counts]


def test_it_uses_nothing_of_the_program() -> None:
    assert "coatgui" not in _PATH.read_text(encoding="utf-8")


def test_modulus(pairs: list[tuple[ReadingAssessment, Any]]) -> None:
    """0.1 Hz is a point of every file, so nothing but rounding may lie between the two."""
    assert len(pairs) >= 100
    for ours, theirs in pairs:
        at = ours.modulus_at(0.1)
        assert at is not None
        assert at.quantity is not None
        assert theirs.modulus == pytest.approx(at.quantity.value, rel=1e-9)


def test_film_capacitance(pairs: list[tuple[ReadingAssessment, Any]]) -> None:
    """Both run through points of 0.3 % scatter, about 17 from 1 kHz up, so two sound curves differ
    by some 0.3 %/√17 = 0.07 %: the median must be within that. The simple circuit has no metal
    behind the pores; where they are widest open (P4) that moves it by half a percent, so single
    readings may differ by ten times as much."""
    apart = []
    for ours, theirs in pairs:
        if ours.coating_capacitance is not None and theirs.capacitance is not None:
            apart.append(theirs.capacitance / ours.coating_capacitance.value - 1)
    assert len(apart) >= 100
    assert np.abs(apart).max() < 0.007
    assert np.median(np.abs(apart)) < 0.0007


def test_water_uptake(pairs: list[tuple[ReadingAssessment, Any]]) -> None:
    """The tolerances of the capacitance, through 100/ln 79 = 23 vol-% for a unit of ln C; the dry
    film's is as uncertain as the reading's."""
    apart = []
    for ours, theirs in pairs:
        if ours.water_uptake is not None and theirs.water is not None:
            apart.append(theirs.water - ours.water_uptake.quantity.value)
    assert len(apart) >= 100
    assert np.abs(apart).max() < 0.16
    assert np.median(np.abs(apart)) < 0.023


def test_order_of_formulations(assessment: Assessment, other: ModuleType) -> None:
    best_to_worst = [rank.formulation[0] for rank in assessment.ranking]
    assert other.order(other.results()) == best_to_worst
