"""The batched fit of one model: against scipy, against a simulator's networks, with held values."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from scipy.optimize import least_squares
from synthetic import Made, make

from coatgui.circuits import CoatingModel, build_model, catalogue
from coatgui.circuits.layers import Layer
from coatgui.fitting.search import Batch, ask_neighbours, search, settle
from coatgui.fitting.solver import Status, minimise

NGSPICE = Path(__file__).resolve().parent.parent / "references" / "ngspice"


def batch_of(made: Made) -> Batch:
    return Batch(made.frequency_hz, made.impedance, np.ones(made.impedance.shape, dtype=bool))


def found(made: Made) -> tuple[Batch, np.ndarray, np.ndarray]:
    batch = batch_of(made)
    settled = settle(made.model, batch, search(made.model, batch).theta)
    return batch, settled.theta, settled.cost


def scipy_cost(model: CoatingModel, batch: Batch, row: int, start: np.ndarray) -> float:
    low, high = model.bounds
    measured = batch.impedance[row]

    def residual(theta: np.ndarray) -> np.ndarray:
        relative = model.impedance(theta[None, :], batch.frequency_hz)[0] / measured - 1.0
        # The relative residual with |Z| in the denominator has the same modulus.
        return np.concatenate([relative.real, relative.imag])

    inside = np.clip(start, low + 1e-6, high - 1e-6)
    return 2.0 * least_squares(residual, inside, bounds=(low, high), x_scale="jac").cost


@pytest.mark.parametrize(
    "model_id", ["film_with_pores", "pores_to_metal", "pores_reacting_interface"]
)
def test_scipy_finds_no_better_optimum(model_id: str) -> None:
    """scipy's TRF as a second opinion, started from our optimum and from the truth."""
    made = make(model_id, 40, np.random.default_rng(11))
    batch, theta, cost = found(made)
    for row in range(0, 40, 2):
        theirs = min(
            scipy_cost(made.model, batch, row, start) for start in (theta[row], made.truth[row])
        )
        assert cost[row] <= theirs * (1.0 + 1e-6)


@pytest.mark.parametrize("model_id", [m.model_id for m in catalogue().values() if m.automatic])
def test_the_best_valley_is_found_from_the_spectrum_alone(model_id: str) -> None:
    made = make(model_id, 400, np.random.default_rng(12))
    batch, _, cost = found(made)
    from_truth = minimise(batch.objective(made.model), made.truth, *made.model.bounds).cost
    assert np.mean(cost <= from_truth * 1.001) >= 0.995


@pytest.mark.parametrize(
    ("name", "model_id", "truth"),
    [
        (
            "coating_rc_ac.txt",
            "pores_reacting_interface",
            {"R_s": 100, "Q_c": 1e-9, "n_c": 1, "R_po": 1e6, "Q_dl": 1e-7, "n_dl": 1, "R_ct": 1e7},
        ),
        ("intact_coating_ac.txt", "film_with_pores", {"Q_c": 150e-12, "n_c": 1, "R_po": 50e9}),
    ],
)
def test_a_simulators_networks_are_read_back_through_scatter(
    name: str, model_id: str, truth: dict[str, float]
) -> None:
    """ngspice tables (tests/references/ngspice) with 0.5 % scatter added, 200 times."""
    columns = np.loadtxt(NGSPICE / name, skiprows=1)
    clean = columns[:, 1] + 1j * columns[:, 2]
    random = np.random.default_rng(13)
    noise = random.standard_normal((200, clean.size)) + 1j * random.standard_normal(
        (200, clean.size)
    )
    model = catalogue()[model_id]
    impedance = clean + 0.005 * np.abs(clean) * noise
    _, theta, _ = found(Made(model, columns[:, 0], impedance, np.empty((0, 0))))
    for symbol, value in truth.items():
        physical = model.physical(theta)[:, model.index(symbol)]
        error = physical.std() / np.sqrt(200)
        # An exponent at its upper end can only err downwards, and what is tied to it follows.
        slack = 0.004 * value if symbol.startswith(("n", "Q")) else 0.0
        assert abs(np.median(physical) - value) <= 4.0 * error + slack


def test_rows_do_not_depend_on_their_company() -> None:
    made = make("pores_reacting_interface", 30, np.random.default_rng(14))
    batch = batch_of(made)
    together = settle(made.model, batch, search(made.model, batch).theta)
    for row in (0, 7, 29):
        own = batch.rows([row])
        alone = settle(made.model, own, search(made.model, own).theta)
        np.testing.assert_allclose(alone.theta[0], together.theta[row], rtol=1e-5)


def test_a_point_left_out_has_no_say() -> None:
    made = make("film_with_pores", 5, np.random.default_rng(15))
    spoilt = made.impedance.copy()
    spoilt[:, 10] *= 7.0
    used = np.ones(spoilt.shape, dtype=bool)
    used[:, 10] = False
    clean = Batch(made.frequency_hz, made.impedance, used)
    bad = Batch(made.frequency_hz, spoilt, used)
    first = settle(made.model, clean, search(made.model, clean).theta)
    second = settle(made.model, bad, search(made.model, bad).theta)
    np.testing.assert_allclose(first.theta, second.theta, rtol=1e-6)


def test_held_and_tied_parameters() -> None:
    layers = (Layer("film", ionic="resistor"), Layer("interface", ionic="resistor"))
    model = build_model("own", "Own", layers, fixed={"R_s": 50.0}, tied=[("n_c", "n_dl")])
    assert model.symbols == ("Q_c", "n_c", "R_po", "Q_dl", "R_ct")
    full = catalogue()["pores_reacting_interface"]
    truth = {
        "R_s": 50,
        "Q_c": 1e-9,
        "n_c": 0.9,
        "R_po": 1e5,
        "Q_dl": 1e-6,
        "n_dl": 0.9,
        "R_ct": 1e6,
    }
    theta = full.natural(np.array([[truth[s] for s in full.symbols]], dtype=float))
    frequency_hz = np.logspace(5, -2, 43)
    batch = Batch(frequency_hz, full.impedance(theta, frequency_hz), np.ones((1, 43), dtype=bool))
    fit = settle(model, batch, search(model, batch).theta)
    values = dict(zip(model.symbols, model.physical(fit.theta)[0], strict=True))
    assert values == pytest.approx({s: truth[s] for s in model.symbols}, rel=1e-6)
    np.testing.assert_allclose(model.whole(fit.theta), theta, rtol=1e-6)


def test_a_neighbour_helps_a_row_that_went_astray() -> None:
    made = make("pores_reacting_interface", 3, np.random.default_rng(16))
    batch = batch_of(made)
    good = search(made.model, batch)
    low, high = made.model.bounds
    astray = minimise(batch.objective(made.model), np.tile(0.5 * (low + high), (3, 1)), low, high)
    spoilt = astray.cost > 1.1 * good.cost
    assert spoilt.any()
    helped = ask_neighbours(made.model, batch, astray, [good.theta[[i]] for i in range(3)])
    assert (helped.cost <= good.cost * 1.0001).all()


def test_a_start_that_cannot_be_evaluated_says_so() -> None:
    made = make("film_with_pores", 2, np.random.default_rng(17))
    batch = batch_of(made)
    low, high = made.model.bounds
    start = np.tile(0.5 * (low + high), (2, 1))
    start[1] = np.nan
    result = minimise(batch.objective(made.model), start, low, high)
    assert np.isfinite(result.cost[0])
    assert not np.isfinite(result.cost[1])
    assert result.status[1] == Status.STUCK
