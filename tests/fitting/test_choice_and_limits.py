"""Choice of model along a series, 95 % limits, bounds, weights: what a fit may claim."""

from __future__ import annotations

import numpy as np
import pytest
from synthetic import FREQUENCY_HZ, make

from coatgui.circuits import CoatingModel, ModelError, build_model, catalogue, model_from_data
from coatgui.circuits.layers import Layer
from coatgui.circuits.told_apart import tied_by_the_circuit
from coatgui.fitting import fit_spectra, scatter_of_repeats
from coatgui.fitting.choice import choose_path
from coatgui.fitting.limits import parameter_limits
from coatgui.fitting.search import Batch, search, settle
from coatgui.records import Bound, Fit, Spectrum

AUTOMATIC = [m for m in catalogue().values() if m.automatic]


def fits_of(
    impedance: np.ndarray, series: list[str] | None = None, **more: object
) -> list[Fit | None]:
    count = len(impedance)
    given: dict[str, object] = {"pinned": [""] * count} | more
    return fit_spectra(
        [Spectrum(FREQUENCY_HZ, z) for z in impedance],
        [np.ones(FREQUENCY_HZ.size, dtype=bool)] * count,
        area_cm2=[10.0] * count,
        series=series or [str(i) for i in range(count)],
        exposure_h=[float(i) for i in range(count)],
        **given,  # type: ignore[arg-type]
    )


@pytest.mark.parametrize("model_id", [m.model_id for m in AUTOMATIC if m.model_id != "closed_film"])
def test_the_model_that_made_a_spectrum_is_chosen(model_id: str) -> None:
    made = make(model_id, 100, np.random.default_rng(21))
    names = [fit.model for fit in fits_of(made.impedance) if fit]
    assert names.count(model_id) >= 97


def test_a_closed_film_stays_closed() -> None:
    model = catalogue()["closed_film"]
    theta = np.tile(model.natural(np.array([[60.0, 8e-10, 0.97]])), (100, 1))
    clean = model.impedance(theta, FREQUENCY_HZ)
    random = np.random.default_rng(22)
    noise = random.standard_normal(clean.shape) + 1j * random.standard_normal(clean.shape)
    fits = fits_of(clean + 0.005 * np.abs(clean) * noise)
    assert sum(fit.model == "closed_film" for fit in fits if fit) >= 98


def test_a_path_goes_on_readily_and_back_unwillingly() -> None:
    scores = np.array([[0.0, 9.0], [3.0, 0.0], [0.0, 3.0], [9.0, 0.0]])
    assert choose_path(scores, [None] * 4) == [0, 1, 1, 1]
    back = np.array([[9.0, 0.0], [0.0, 9.0], [0.0, 9.0]])
    assert choose_path(back, [None] * 3) == [1, 0, 0]


def test_no_stage_is_skipped_to_save_the_price_of_a_change() -> None:
    scores = np.array([[0.0, 50.0, 60.0], [50.0, 0.3, 0.0], [50.0, 0.0, 5.0], [90.0, 50.0, 0.0]])
    assert choose_path(scores, [None] * 4) == [0, 1, 1, 2]


def test_a_pin_holds_and_says_nothing_of_its_neighbours() -> None:
    scores = np.array([[0.0, 9.0], [0.0, 9.0], [0.0, 9.0]])
    assert choose_path(scores, [None, 1, None]) == [0, 1, 0]
    assert choose_path(np.full((2, 2), np.inf), [None, None]) == [0, 0]


def test_a_pinned_own_model_is_used() -> None:
    own = build_model(
        "own", "Own", (Layer("film", "capacitor", "resistor"),), inductance=True, fixed={"L": 1e-6}
    )
    made = make("film_with_pores", 2, np.random.default_rng(23))
    first, second = fits_of(made.impedance, own_models=[own], pinned=["own", ""])
    assert first is not None
    assert second is not None
    assert (first.model, second.model) == ("own", "film_with_pores")
    assert [p.symbol for p in first.parameters] == ["L", "R_s", "C_c", "R_po"]
    held = first.parameter("L")
    assert held is not None
    assert (held.bound, held.value) == (Bound.FIXED, pytest.approx(1e-6))
    assert first.log_covariance is not None
    assert first.log_covariance.shape == (4, 4)
    assert not first.log_covariance[0].any()
    with pytest.raises(KeyError, match="unheard_of"):
        fits_of(made.impedance, pinned=["unheard_of", ""])


def coverage(model: CoatingModel, theta: np.ndarray, limits: object, truth: np.ndarray) -> float:
    low, high = limits.low, limits.high  # type: ignore[attr-defined]
    two_sided = np.isfinite(low) & np.isfinite(high)
    inside = (low <= truth) & (truth <= high)
    return float(inside[two_sided].mean())


@pytest.mark.parametrize("model_id", ["film_with_pores", "pores_reacting_interface"])
def test_limits_hold_the_truth_as_often_as_they_say(model_id: str) -> None:
    made = make(model_id, 400, np.random.default_rng(24))
    batch = Batch(made.frequency_hz, made.impedance, np.ones(made.impedance.shape, dtype=bool))
    fits = settle(made.model, batch, search(made.model, batch).theta)
    limits = parameter_limits(made.model, batch, fits)
    assert 0.93 <= coverage(made.model, fits.theta, limits, made.truth) <= 0.97


def test_limits_widen_with_the_scatter() -> None:
    width = []
    for scatter in (0.002, 0.02):
        made = make("film_with_pores", 20, np.random.default_rng(25), scatter=scatter)
        batch = Batch(made.frequency_hz, made.impedance, np.ones(made.impedance.shape, dtype=bool))
        limits = parameter_limits(
            made.model, batch, settle(made.model, batch, search(made.model, batch).theta)
        )
        width.append(np.median(limits.high - limits.low))
    assert width[1] == pytest.approx(10.0 * width[0], rel=0.25)


def test_what_the_data_do_not_hold_is_a_bound() -> None:
    """Films whose leak is far beyond what the slowest point shows, pinned to have pores: at most
    one in twenty may seem to have a leak of its own (two-sided 95 % limits miss to both sides)."""
    model = catalogue()["film_with_pores"]
    theta = np.tile(model.natural(np.array([[50.0, 8e-10, 0.97, 1e14]])), (100, 1))
    clean = model.impedance(theta, FREQUENCY_HZ)
    random = np.random.default_rng(26)
    noise = random.standard_normal(clean.shape) + 1j * random.standard_normal(clean.shape)
    fits = fits_of(clean + 0.005 * np.abs(clean) * noise, pinned=["film_with_pores"] * 100)
    leaks = [fit.parameter("R_po") for fit in fits if fit]
    bounds = [leak for leak in leaks if leak and leak.bound is Bound.AT_LEAST]
    assert len(bounds) >= 92
    for leak in bounds:
        assert leak.high is None
        assert leak.low is not None
        assert leak.low > 1e10
    assert sum(leak.low < 1e14 for leak in bounds if leak.low) >= 95 * len(bounds) // 100


def test_a_row_at_the_end_of_its_search_says_so() -> None:
    model = catalogue()["closed_film"]
    clean = model.impedance(model.natural(np.array([[50.0, 8e-10, 0.97]])), FREQUENCY_HZ)
    (fit,) = fits_of(clean, pinned=["pores_reacting_interface"])
    assert fit is not None
    assert "the end of the search" in fit.message


def test_scatter_is_read_from_repeated_sweeps() -> None:
    model = catalogue()["pores_reacting_interface"]
    made = make(model.model_id, 1, np.random.default_rng(27), scatter=0.0)
    random = np.random.default_rng(28)
    true = np.where(FREQUENCY_HZ < 1.0, 0.02, 0.002)
    sweeps = [
        made.impedance[0]
        * (1.0 + 0.01 * k * np.log(FREQUENCY_HZ) / 10.0)  # the panel changes meanwhile
        * (1.0 + true * (random.standard_normal(57) + 1j * random.standard_normal(57)))
        for k in range(4)
    ]
    used = [np.ones(57, dtype=bool)] * 4
    deviation = scatter_of_repeats(FREQUENCY_HZ, sweeps, used)
    assert deviation is not None
    assert np.mean(deviation**2) == pytest.approx(1.0)
    slow, fast = deviation[FREQUENCY_HZ < 0.5], deviation[FREQUENCY_HZ > 3.0]
    assert 6.0 <= np.median(slow) / np.median(fast) <= 14.0
    assert scatter_of_repeats(FREQUENCY_HZ, sweeps[:1], used[:1]) is None
    assert scatter_of_repeats(FREQUENCY_HZ, [sweeps[0]] * 2, used[:2]) is None


def test_measured_weights_make_better_estimates() -> None:
    model = catalogue()["film_with_pores"]
    made = make(model.model_id, 60, np.random.default_rng(29), scatter=0.0)
    random = np.random.default_rng(30)
    true = np.where(FREQUENCY_HZ < 1.0, 0.05, 0.002)
    shape = made.impedance.shape
    noise = random.standard_normal(shape) + 1j * random.standard_normal(shape)
    impedance = made.impedance * (1.0 + true * noise)
    used = np.ones(shape, dtype=bool)
    error = []
    for deviation in (None, np.tile(true / np.sqrt(np.mean(true**2)), (60, 1))):
        batch = Batch(FREQUENCY_HZ, impedance, used, deviation)
        theta = settle(model, batch, search(model, batch).theta).theta
        error.append(np.median(np.abs(theta - made.truth), axis=0)[model.index("Q_c")])
    assert error[1] < 0.5 * error[0]


@pytest.mark.parametrize("model", list(catalogue().values()), ids=list(catalogue()))
def test_the_catalogues_parameters_can_be_told_apart(model: CoatingModel) -> None:
    assert tied_by_the_circuit(model) == ()


def test_two_capacitors_in_a_row_cannot_be_told_apart() -> None:
    film = Layer("film", "capacitor", next_layer="behind_layer")
    model = build_model("own", "Own", (film, Layer("interface", "capacitor")))
    assert tied_by_the_circuit(model) == ("C_c", "C_dl")


@pytest.mark.parametrize(
    ("more", "said"),
    [
        ({"fixed": {"R_x": 1.0}}, "no parameter R_x"),
        ({"fixed": {"R_s": -1.0}}, "must lie between"),
        ({"tied": [["R_s", "Q_c"]]}, "differ in kind"),
        ({"fixed": {"R_s": 1.0}, "tied": [["R_s", "R_po"]]}, "twice"),
    ],
)
def test_a_model_that_makes_no_sense_is_refused(more: dict[str, object], said: str) -> None:
    data = {"id": "own", "name": "Own", "layer": [{"role": "film", "ionic": "resistor"}]}
    with pytest.raises(ModelError, match=said):
        model_from_data(data | more)


@pytest.mark.parametrize(
    ("area_cm2", "name"), [(10.0, "layer_reacting"), (None, "layer_reacting"), (1e4, None)]
)
def test_two_arcs_of_metal_are_not_called_a_film(area_cm2: float | None, name: str | None) -> None:
    """An outer capacitance of 5e-6 F is a film's only on a panel of a square metre."""
    model = catalogue()["pores_reacting_interface"]
    values = {"R_s": 20, "Q_c": 5e-6, "n_c": 0.9, "R_po": 400, "Q_dl": 1e-4, "n_dl": 0.8}
    theta = model.natural(np.array([[*values.values(), 9e3]], dtype=float))
    clean = model.impedance(theta, FREQUENCY_HZ)[0]
    random = np.random.default_rng(33)
    noise = random.standard_normal(57) + 1j * random.standard_normal(57)
    (fit,) = fit_spectra(
        [Spectrum(FREQUENCY_HZ, clean * (1.0 + 0.003 * noise))],
        [np.ones(57, dtype=bool)],
        area_cm2=[area_cm2],
        series=["p"],
        exposure_h=[0.0],
        pinned=[""],
    )
    assert fit is not None
    assert fit.model == (name or "pores_reacting_interface")
    assert (fit.parameter("R_L") is None) is (name is None)
