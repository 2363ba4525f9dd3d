"""Faults of graded strength are found, clean spectra are left in peace. The benchmark prints the
whole table (tests/benchmarks/checks.py); these are smaller samples of the same kind."""

from __future__ import annotations

from types import ModuleType

import numpy as np
import pytest

from coatgui.quality import check_spectra
from coatgui.records import Settings, Severity, Spectrum


def test_clean_spectra_raise_few_doubts_and_no_rejects(
    faults: ModuleType, benchmark_table: ModuleType
) -> None:
    rng = np.random.default_rng(11)
    z = [
        faults.scattered(rng, s.impedance(), 10 ** rng.uniform(-2.7, -1.7))
        for s in faults.specimens(rng, 125)
    ]
    answers = benchmark_table.checked(z)
    doubts = sum(any(f.severity is Severity.DOUBT for f in c.findings) for c in answers)
    rejects = sum(c.rejected for c in answers)
    assert doubts <= 0.02 * len(z)
    assert rejects == 0


@pytest.mark.parametrize("points", [12, 20, 29, 91, 141])
def test_clean_spectra_are_left_in_peace_on_any_grid(faults: ModuleType, points: int) -> None:
    rng = np.random.default_rng(16)
    grid = np.logspace(5, -2, points)
    spectra = [
        Spectrum(grid, faults.scattered(rng, s.impedance(grid), 10 ** rng.uniform(-2.7, -1.7)))
        for s in faults.specimens(rng, 125)
    ]
    answers = check_spectra(spectra, settings=Settings(), area_cm2=[1.0] * len(spectra))
    weighty = [any(f.severity is not Severity.NOTE for f in c.findings) for c in answers]
    assert np.mean(weighty) <= 0.02
    assert not any(c.rejected for c in answers)


# Fault and strength (share of |Z| or as the table says), share that must be named, with a scatter
# of 0.5 %. Where the table finds all, one in fifty may be missed here.
WANTED = [
    ("one wild point", 0.05, 0.95),
    ("one wild point", 0.1, 0.98),
    ("two wild neighbours", 0.1, 0.93),
    ("burst of scatter", 0.05, 0.93),
    ("mains pick-up", 0.05, 0.95),
    ("step that stays", 0.02, 0.75),
    ("step that stays", 0.05, 0.97),
    ("step that dies away", 0.1, 0.95),
    ("inductive tail", 0.1, 0.98),
    ("phase past -90°", 0.05, 0.95),
    ("turned sign", 1.0, 0.99),
]


@pytest.mark.parametrize(("name", "strength", "least"), WANTED)
def test_a_fault_is_named(
    faults: ModuleType,
    benchmark_table: ModuleType,
    monkeypatch: pytest.MonkeyPatch,
    name: str,
    strength: float,
    least: float,
) -> None:
    monkeypatch.setattr(benchmark_table, "NOISE", (0.005, 0.005))
    fault = next(f for f in faults.FAULTS if f.name == name)
    outcome = benchmark_table.rates(fault, strength, 20, 12, False)
    assert np.mean(outcome.named) >= least


@pytest.mark.parametrize(
    ("name", "strength"),
    [("step that stays", 0.05), ("step that dies away", 0.1), ("one wild point", 0.1)],
)
def test_what_moves_a_reported_quantity_is_found_whatever_the_scatter(
    faults: ModuleType, benchmark_table: ModuleType, name: str, strength: float
) -> None:
    """At 0.2 to 2 %, with what the circuit leaves over."""
    fault = next(f for f in faults.FAULTS if f.name == name)
    outcome = benchmark_table.rates(fault, strength, 20, 18, True)
    moving = benchmark_table.only(outcome.doubted, outcome.moving)
    assert len(moving) > 50
    assert np.mean(moving) >= 0.95


@pytest.mark.parametrize("strength", [0.1, 0.2])
def test_a_drift_is_found_about_as_often_as_any_such_test_can(
    faults: ModuleType, benchmark_table: ModuleType, moved_table: ModuleType, strength: float
) -> None:
    """In part of the cases it lies within what a panel may do; the measurement model alone then
    shows less than the circuit does."""
    fault = next(f for f in faults.FAULTS if f.name == "drift of the resistances")
    outcome = benchmark_table.rates(fault, strength, 20, 18, True)
    found = np.mean(benchmark_table.only(outcome.doubted, outcome.moving))
    lengths = benchmark_table.only(outcome.left_by_model, outcome.moving)
    most = np.mean(moved_table.most_found(lengths, fault.name))
    assert found >= most - 0.04


def test_a_resistance_that_drifts_by_a_fifth_fails(
    faults: ModuleType, benchmark_table: ModuleType
) -> None:
    """Wherever the resistance shows: where the drift moves the slowest point by 5 % or more."""
    rng = np.random.default_rng(13)
    z = []
    for specimen in faults.specimens(rng, 25):
        growth = 1 + rng.choice([-0.2, 0.2]) * faults.ELAPSED
        drifting, steady = specimen.impedance(growth=growth), specimen.impedance()
        if abs(drifting[-1] / steady[-1] - 1) > 0.05:
            z.append(faults.scattered(rng, drifting, 0.005))
    found = [{f.code for f in c.findings} for c in benchmark_table.checked(z)]
    assert len(z) > 100
    assert np.mean(["drift" in codes for codes in found]) >= 0.95


def test_a_step_is_not_called_a_wild_point(faults: ModuleType, benchmark_table: ModuleType) -> None:
    rng = np.random.default_rng(14)
    z = []
    for specimen in faults.specimens(rng, 10):
        stepped = faults.scattered(rng, specimen.impedance(), 0.003)
        stepped[50:] *= np.exp(0.1 * np.exp(-0.3 * np.arange(stepped.size - 50)))
        z.append(stepped)
    answers = benchmark_table.checked(z)
    assert sum("step" in {f.code for f in c.findings} for c in answers) >= 0.97 * len(z)
    assert sum("wild_point" in {f.code for f in c.findings} for c in answers) <= 0.05 * len(z)


def test_neighbouring_wild_points_are_not_called_a_step(
    faults: ModuleType, benchmark_table: ModuleType
) -> None:
    """What was taken for a step first is given back when the points explain it."""
    rng = np.random.default_rng(17)
    fault = next(f for f in faults.FAULTS if f.name == "two wild neighbours")
    z = [fault.put(rng, s, 0.005, 0.3)[0] for s in faults.specimens(rng, 30)]
    answers = benchmark_table.checked(z)
    assert sum("step" in {f.code for f in c.findings} for c in answers) <= 0.06 * len(z)


def test_a_phase_in_the_wrong_unit_is_recognised(
    faults: ModuleType, benchmark_table: ModuleType
) -> None:
    rng = np.random.default_rng(15)
    for name, code in (
        ("radians as degrees", "phase_in_radians"),
        ("degrees as radians", "phase_in_degrees"),
    ):
        fault = next(f for f in faults.FAULTS if f.name == name)
        z = [fault.put(rng, s, 0.003, 1.0)[0] for s in faults.specimens(rng, 20)]
        answers = benchmark_table.checked(z)
        recognised = [code in {f.code for f in c.findings} for c in answers]
        weighty = [any(f.severity is not Severity.NOTE for f in c.findings) for c in answers]
        assert np.mean(recognised) >= 0.95, name
        assert np.mean(weighty) >= 0.98, name
