"""The measurement model follows what is causal, stable and passive, and nothing else."""

from __future__ import annotations

from types import ModuleType

import numpy as np
import pytest

from coatgui.circuits import catalogue
from coatgui.quality import check_spectra, kramers_kronig_residuals
from coatgui.quality.kramers_kronig import MeasurementModel, complexes, measurement_model, parts
from coatgui.records import Settings, Spectrum

GRIDS = [
    np.logspace(5, -2, 71), np.logspace(5, -2, 36), np.logspace(6, -3, 91), np.logspace(4, -1, 26)
]  # fmt: skip


def left(frequency_hz: np.ndarray, impedance: np.ndarray) -> np.ndarray:
    model = measurement_model(frequency_hz)
    return complexes(model.residuals(parts(np.log(impedance))[None], model.levels[-1]))[0]


@pytest.mark.parametrize("frequency_hz", GRIDS, ids=lambda f: f"{f.size} points")
def test_every_model_of_the_catalogue_is_followed(
    faults: ModuleType, frequency_hz: np.ndarray
) -> None:
    rng = np.random.default_rng(21)
    for specimen in faults.specimens(rng, 30):
        off = left(frequency_hz, specimen.impedance(frequency_hz))
        # Well below a scatter of 0.2 %.
        assert np.sqrt((np.abs(off) ** 2).mean() / 2) < 5e-4, specimen
        assert np.abs(off).max() < 2.5e-3, specimen


@pytest.mark.parametrize(
    "impedance",
    [
        lambda s: 50 + 1e-6 * s + 1 / (1e-9 * s),  # leads and a blocking film
        lambda s: 1 / (1e-12 + 5e-12 * s),  # open leads: the admittance is the simple one
        lambda s: np.full_like(s, 1e6),
        lambda s: 100 + 1e5 * np.tanh(np.sqrt(20 * s)) / np.sqrt(20 * s),
        lambda s: 1 / (1e-9 * s) ** 0.5,
    ],
    ids=["leads and film", "open leads", "resistor", "finite diffusion", "diffusion"],
)
def test_blocking_leaking_inductive_and_diffusing_circuits_are_followed(impedance) -> None:
    frequency_hz = np.logspace(5, -2, 71)
    off = left(frequency_hz, impedance(2j * np.pi * frequency_hz))
    assert np.abs(off).max() < 1e-3


@pytest.mark.parametrize(
    "wrong",
    [np.conj, lambda z: z.real * 0.5 + 1j * z.imag, lambda z: np.abs(z) + 0j, lambda z: 1 / z],
    ids=["conjugate", "real part halved", "modulus alone", "admittance as impedance"],
)
def test_what_is_not_causal_is_not_followed(wrong) -> None:
    frequency_hz = np.logspace(5, -2, 71)
    model = catalogue()["pores_reacting_interface"]
    values = np.array([[50.0, 1e-9, 0.95, 1e5, 1e-6, 0.85, 1e6]])
    z = model.impedance(model.natural(values), frequency_hz)[0]
    off = left(frequency_hz, wrong(z))
    rms = np.sqrt((np.abs(off) ** 2).mean() / 2)
    if wrong(z) == pytest.approx(1 / z):
        # 1/Z obeys the relations as Z does: that the test cannot see it is known.
        assert rms < 1e-3
    else:
        assert rms > 0.02


def test_the_number_of_terms_follows_the_scatter(faults: ModuleType) -> None:
    """Cross-validation takes more directions where the scatter lets more be seen."""
    rng = np.random.default_rng(22)
    model = measurement_model(faults.FREQUENCY_HZ)
    specimens = list(faults.specimens(rng, 20))
    chosen = []
    for noise in (0.02, 1e-5):
        z = np.array([faults.scattered(rng, s.impedance(), noise) for s in specimens])
        chosen.append(np.mean(model.level(parts(np.log(z)))))
    assert chosen[1] > chosen[0] + 2
    few = MeasurementModel(np.logspace(3, 0, 9))
    assert few.levels[-1] <= 9


def test_many_are_answered_as_one_by_one(faults: ModuleType) -> None:
    rng = np.random.default_rng(23)
    spectra = [
        Spectrum(grid, faults.scattered(rng, s.impedance(grid), 0.005))
        for grid in GRIDS
        for s in faults.specimens(rng, 3)
    ]
    rng.shuffle(spectra)
    many = check_spectra(spectra, settings=Settings(), area_cm2=[1.0] * len(spectra))
    for spectrum, check in zip(spectra, many, strict=True):
        (alone,) = check_spectra([spectrum], settings=Settings(), area_cm2=[1.0])
        assert {f.code for f in alone.findings} == {f.code for f in check.findings}
        assert alone.suggested == check.suggested


def test_residuals_are_shown_with_their_fault_in_them(faults: ModuleType) -> None:
    rng = np.random.default_rng(24)
    specimen = next(faults.specimens(rng, 1))
    z = faults.scattered(rng, specimen.impedance(), 0.002)
    z[30] *= np.exp(0.2 + 0.1j)
    off = kramers_kronig_residuals(Spectrum(faults.FREQUENCY_HZ, z), Settings())
    assert off[30] == pytest.approx(0.2 + 0.1j, abs=0.02)
    others = np.delete(off, 30)
    assert np.abs(others).max() < 0.02
    short = Spectrum(faults.FREQUENCY_HZ[:4], z[:4])
    assert np.isnan(kramers_kronig_residuals(short, Settings())).all()
