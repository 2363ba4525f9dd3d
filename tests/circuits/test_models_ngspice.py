"""Models against a general circuit simulator and the dummy circuit of ASTM G106; the catalogue."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest

from coatgui.circuits import Grid, Layer, ModelError, build_model, catalogue, model_from_data

TABLES = Path(__file__).resolve().parent.parent / "references" / "ngspice"


def table(name: str) -> tuple[np.ndarray, np.ndarray]:
    columns = np.loadtxt(TABLES / name, skiprows=1)
    return columns[:, 0], columns[:, 1] + 1j * columns[:, 2]


@pytest.mark.parametrize(
    ("name", "model", "values"),
    [
        (
            "coating_rc_ac.txt",
            "pores_reacting_interface",
            {"R_s": 100, "Q_c": 1e-9, "n_c": 1, "R_po": 1e6, "Q_dl": 1e-7, "n_dl": 1, "R_ct": 1e7},
        ),
        (
            "dummy_10_100_100u_ac.txt",
            "bare_metal",
            {"R_s": 10, "Q_dl": 1e-4, "n_dl": 1, "R_ct": 100},
        ),
        (
            "intact_coating_ac.txt",
            "film_with_pores",
            {"R_s": 100, "Q_c": 150e-12, "n_c": 1, "R_po": 50e9},
        ),
    ],
)
def test_against_the_circuit_simulator(name: str, model: str, values: dict[str, float]) -> None:
    frequency, wanted = table(name)
    circuit = catalogue()[model]
    theta = circuit.natural(np.array([[values[s] for s in circuit.symbols]], dtype=float))
    found = circuit.impedance(theta, frequency)[0]
    # The table holds twelve digits, the simulator's own tolerance is 1e-9.
    assert np.abs(found - wanted).max() <= 1e-8 * np.abs(wanted).max()
    assert (np.abs(found - wanted) / np.abs(wanted)).max() <= 1e-7


def test_dummy_circuit_of_astm_g106() -> None:
    """Z(0) = 110 Ω, Z(∞) = 10 Ω, −Z″ peaks at 50 Ω at 15.92 Hz (derived from the circuit)."""
    circuit = catalogue()["bare_metal"]
    theta = circuit.natural(np.array([[10.0, 1e-4, 1.0, 100.0]]))
    found = circuit.impedance(theta, np.array([1e-6, 15.9155, 1e9]))[0]
    assert found[0].real == pytest.approx(110.0, rel=1e-6)
    assert -found[1].imag == pytest.approx(50.0, rel=1e-6)
    assert found[2].real == pytest.approx(10.0, rel=1e-6)


@pytest.mark.parametrize("name", list(catalogue()))
def test_derivatives_of_every_model_against_differences(name: str) -> None:
    model = catalogue()[name]
    low, high = model.bounds
    theta = np.random.default_rng(5).uniform(
        low + 0.35 * (high - low), low + 0.65 * (high - low), (4, low.size)
    )
    grid = Grid.of_hertz(np.logspace(5, -2, 15))
    evaluation = model.evaluate(theta, grid)
    slopes = evaluation.derivatives(np.ones(evaluation.impedance.shape, dtype=complex))
    for k in range(low.size):
        step = np.zeros(low.size)
        step[k] = 1e-5
        ahead = model.evaluate(theta + step, grid).impedance
        behind = model.evaluate(theta - step, grid).impedance
        wanted = (ahead - behind) / 2e-5
        assert np.abs(slopes[:, k] - wanted).max() <= 1e-6 * np.abs(evaluation.impedance).max()


def test_natural_coordinates_go_there_and_back() -> None:
    model = catalogue()["pores_diffusion_tail"]
    values = np.array([[35.0, 2e-10, 0.97, 1e9, 3e-8, 0.8, 1e10, 1e9]])
    assert model.physical(model.natural(values)) == pytest.approx(values)


@pytest.mark.parametrize(
    "layers",
    [
        (),
        (Layer("film"), Layer("film")),
        (Layer("film"), Layer("interface")),
        (Layer("skin"),),
        (Layer("film", ionic="resistor", diffusion="open"), Layer("interface", diffusion="closed")),
    ],
)
def test_a_description_that_makes_no_circuit_is_refused(layers: tuple[Layer, ...]) -> None:
    with pytest.raises(ModelError):
        build_model("mine", "Mine", layers)


def test_a_model_of_ones_own_from_data() -> None:
    layers = [
        {"role": "film", "dielectric": "graded_film", "ionic": "resistor", "diffusion": "open"},
        {"role": "interface", "dielectric": "capacitor", "ionic": "resistor"},
    ]
    model = model_from_data({"id": "mine", "name": "Mine", "inductance": True, "layer": layers})
    assert model.symbols == ("L", "R_s", "C_c", "τ_c", "p_c", "R_po", "R_D", "τ_D", "C_dl", "R_ct")
    with pytest.raises(ModelError, match="not described in full"):
        model_from_data({"id": "mine", "layer": layers})
