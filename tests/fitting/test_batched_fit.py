"""The batched fit of one model: against scipy, against a simulator's networks, with held values."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
from scipy.optimize import least_squares
from synthetic import Made, make

from coatgui.circuits import CoatingModel, build_model, catalogue
from coatgui.circuits.layers import Layer
from coatgui.fitting.search import Batch, ask_neighbours, search, settle, try_from_inside
from coatgui.fitting.solver import Status, _steps, minimise

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


@pytest.mark.parametrize("model_id", [m.model_id for m in catalogue().values() if m.automatic])
def test_scipy_finds_no_better_optimum(model_id: str) -> None:
    """scipy's TRF as a second opinion on 204 spectra, 34 of each model, started from our optimum
    and from the truth."""
    made = make(model_id, 34, np.random.default_rng(11))
    batch, theta, cost = found(made)
    for row in range(34):
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


def test_a_row_thrown_to_an_end_of_its_search_is_tried_from_inside() -> None:
    made = make("pores_reacting_interface", 20, np.random.default_rng(18))
    batch = batch_of(made)
    low, high = made.model.bounds
    good = settle(made.model, batch, search(made.model, batch).theta)
    spoilt = good.theta.copy()
    place = made.model.index("R_ct")
    spoilt[:, place] = high[place]
    held = np.zeros(spoilt.shape, dtype=bool)
    held[:, place] = True
    there = minimise(batch.objective(made.model), spoilt, low, high, fixed=held)
    stuck = replace(there, at_bound=held)
    assert (stuck.cost > 1.5 * good.cost).all()
    again = try_from_inside(made.model, batch, stuck)
    assert np.mean(again.cost <= 1.0001 * good.cost) >= 0.9
    assert try_from_inside(made.model, batch, good) is good or not good.at_bound.any()


def test_bounds_hold_and_the_size_of_the_working_set_changes_nothing() -> None:
    made = make("pores_reacting_interface", 60, np.random.default_rng(19))
    batch = batch_of(made)
    low, high = made.model.bounds
    low, high = np.tile(low, (60, 1)), np.tile(high, (60, 1))
    place = made.model.index("R_po")
    high[::2, place] = made.truth[::2, place] - 0.5  # below the truth: the bound must hold
    start = np.clip(made.truth + 0.3, low, high)
    start[0] += 100.0  # outside
    whole = minimise(batch.objective(made.model), start, low, high)
    few = minimise(batch.objective(made.model), start, low, high, working_set=7)
    assert (whole.theta <= high).all()
    assert (whole.theta >= low).all()
    assert whole.at_bound[2::2, place].all()
    assert not whole.at_bound[1::2, place].any()
    np.testing.assert_allclose(few.theta[1:], whole.theta[1:], rtol=1e-5, atol=1e-4)
    np.testing.assert_allclose(few.cost[1:], whole.cost[1:], rtol=1e-6)


def test_a_step_solves_the_damped_equations() -> None:
    """The elimination over many systems at once against LAPACK, with held and idle parameters."""
    random = np.random.default_rng(20)
    size, count = 300, 6
    jacobian = random.standard_normal((size, 20, count)) * 10.0 ** random.uniform(-6, 6, count)
    jacobian[:50, :, 2] = 0.0  # without effect
    normal = jacobian.transpose(0, 2, 1) @ jacobian
    gradient = np.einsum("bmp,bm->bp", jacobian, random.standard_normal((size, 20)))
    free = random.random((size, count)) < 0.8
    damping = 10.0 ** random.uniform(-8, 2, size)
    found = _steps(
        np.ascontiguousarray(normal.transpose(1, 2, 0)), gradient.T.copy(), free.T, damping
    ).T
    for b in range(size):
        moving = np.flatnonzero(free[b] & (np.diag(normal[b]) > 0))
        own = normal[b][np.ix_(moving, moving)]
        scale = 1.0 / np.sqrt(np.diag(own))
        unit = own * np.outer(scale, scale) + damping[b] * np.eye(moving.size)
        wanted = np.zeros(count)
        wanted[moving] = -scale * np.linalg.solve(unit, scale * gradient[b][moving])
        np.testing.assert_allclose(found[b] / np.abs(wanted).max(), wanted / np.abs(wanted).max(),
                                   atol=1e-7)  # fmt: skip


@pytest.mark.parametrize("model_id", [m.model_id for m in catalogue().values() if m.automatic])
def test_jacobian_and_sums_are_those_of_the_residuals(model_id: str) -> None:
    """S, Jᵀr and JᵀJ of the chunks against residuals differentiated by steps, with points left out
    and with given deviations: turning each residual by its phase alters none of them."""
    made = make(model_id, 5, np.random.default_rng(21))
    random = np.random.default_rng(22)
    used = random.random(made.impedance.shape) < 0.8
    for deviation in (None, random.uniform(0.5, 2.0, used.shape)):
        objective = Batch(made.frequency_hz, made.impedance, used, deviation).objective(made.model)
        rows = np.array([4, 0, 2])
        theta = made.truth[rows] + 0.05
        cost, gradient, normal = objective.normal(np.ascontiguousarray(theta.T), rows)
        residual = objective.residuals(theta, rows)
        steps = 1e-6 * np.eye(theta.shape[1])
        jacobian = np.stack(
            [
                (objective.residuals(theta + s, rows) - objective.residuals(theta - s, rows)) / 2e-6
                for s in steps
            ],
            axis=1,
        )
        np.testing.assert_allclose(cost, (np.abs(residual) ** 2).sum(axis=1))
        np.testing.assert_allclose(objective.cost(theta, rows), cost)
        wanted = np.einsum("bpn,bn->pb", jacobian.conj(), residual).real
        np.testing.assert_allclose(gradient, wanted, rtol=1e-5, atol=1e-7 * np.abs(wanted).max())
        wanted = np.einsum("bpn,bqn->pqb", jacobian.conj(), jacobian).real
        np.testing.assert_allclose(normal, wanted, rtol=1e-5, atol=1e-7 * np.abs(wanted).max())
