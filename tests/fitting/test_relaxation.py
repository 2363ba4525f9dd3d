"""The relaxation outline against arcs whose distribution is known in closed form."""

from __future__ import annotations

import numpy as np
import pytest
from synthetic import make

from coatgui.circuits import catalogue
from coatgui.fitting.relaxation import RelaxationOutline, relaxation_outline
from coatgui.fitting.search import Batch
from coatgui.fitting.solver import minimise
from coatgui.fitting.starts import outline_start

FREQUENCY_HZ = np.logspace(5, -2, 57)


def outline(model_id: str, *, scatter: float = 0.003, **values: float) -> RelaxationOutline:
    model = catalogue()[model_id]
    theta = model.natural(np.array([[values[s] for s in model.symbols]], dtype=float))
    clean = model.impedance(theta, FREQUENCY_HZ)[0]
    random = np.random.default_rng(31)
    noise = random.standard_normal(57) + 1j * random.standard_normal(57)
    found = relaxation_outline(
        FREQUENCY_HZ, clean * (1.0 + scatter * noise), np.ones(57, dtype=bool)
    )
    assert found is not None
    return found


def test_two_arcs_are_two_humps_of_the_right_size() -> None:
    found = outline(
        "pores_reacting_interface",
        R_s=50, Q_c=1e-9, n_c=1, R_po=1e5, Q_dl=1e-7, n_dl=1, R_ct=1e6,
    )  # fmt: skip
    assert found.blocking_capacitance_f is None
    assert [p.time_constant_s for p in found.peaks] == pytest.approx([1e-4, 0.1], rel=0.1)
    assert [p.resistance_ohm for p in found.peaks] == pytest.approx([1e5, 1e6], rel=0.05)


def test_a_depressed_arc_follows_cole_and_cole() -> None:
    """Density of one depressed arc: R sin((1−n)π) / (2π (cosh(n ln(τ/τ₀)) − cos((1−n)π)));
    Cole & Cole, J. Chem. Phys. 9 (1941) 341, from memory, confirmed below by its integral."""
    resistance, n = 1e6, 0.8
    tau0 = 0.01
    found = outline(
        "film_with_pores", R_s=50, Q_c=tau0**n / resistance, n_c=n, R_po=resistance, scatter=0.001
    )
    x = np.log(found.time_constant_s / tau0)
    turn = (1.0 - n) * np.pi
    wanted = resistance * np.sin(turn) / (2.0 * np.pi * (np.cosh(n * x) - np.cos(turn)))
    step = x[1] - x[0]
    assert wanted.sum() * step == pytest.approx(resistance, rel=0.02)
    middle = np.abs(x) < 5.0
    apart = np.abs(found.density_ohm - wanted)[middle].max() / wanted.max()
    assert apart < 0.15
    assert found.density_ohm.sum() * step == pytest.approx(resistance, rel=0.02)


def test_a_blocking_film_is_taken_out_first() -> None:
    found = outline("closed_film", R_s=50, Q_c=1e-9, n_c=1)
    assert found.blocking_capacitance_f == pytest.approx(1e-9, rel=0.02)
    assert found.peaks == ()


def test_the_band_holds_the_outline_and_points_left_out_have_no_say() -> None:
    found = outline("film_with_pores", R_s=50, Q_c=1e-9, n_c=0.95, R_po=1e6)
    top = int(np.argmax(found.density_ohm))
    assert found.low_ohm[top] < found.density_ohm[top] < found.high_ohm[top]
    assert (found.low_ohm <= found.density_ohm).all()
    assert (found.density_ohm <= found.high_ohm).all()

    model = catalogue()["film_with_pores"]
    z = model.impedance(model.natural(np.array([[50, 1e-9, 0.95, 1e6]])), FREQUENCY_HZ)[0].copy()
    used = np.ones(57, dtype=bool)
    used[20] = False
    before = relaxation_outline(FREQUENCY_HZ, z, used)
    z[20] *= 9.0
    after = relaxation_outline(FREQUENCY_HZ, z, used)
    assert before is not None
    assert after is not None
    np.testing.assert_array_equal(before.density_ohm, after.density_ohm)
    assert relaxation_outline(FREQUENCY_HZ[:10], z[:10], used[:10]) is None


def test_a_start_from_the_outline_leads_to_the_valley() -> None:
    made = make("pores_reacting_interface", 12, np.random.default_rng(32))
    used = np.ones(made.impedance.shape, dtype=bool)
    batch = Batch(made.frequency_hz, made.impedance, used)
    low, high = made.model.bounds
    best = minimise(batch.objective(made.model), made.truth, low, high).cost
    reached = 0
    for row in range(12):
        start = outline_start(made.model, made.frequency_hz, made.impedance[row], used[row])
        if start is not None:
            own = batch.rows([row]).objective(made.model)
            reached += bool(minimise(own, start[None, :], low, high).cost[0] <= 1.01 * best[row])
    assert reached >= 7  # most: some outlines show one hump too few
