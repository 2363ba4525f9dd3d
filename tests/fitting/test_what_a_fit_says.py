"""What the fitting stage says: kinds of bound, leads, reasons, courses in time, mixed batches."""

from __future__ import annotations

from collections import Counter
from itertools import pairwise

import numpy as np
import pytest
from synthetic import FREQUENCY_HZ, make

from coatgui.circuits import catalogue
from coatgui.fitting import fit_spectra
from coatgui.fitting.choice import evidence
from coatgui.fitting.relaxation import relaxation_outline
from coatgui.jobs import spread_over_processes
from coatgui.records import Bound, Fit, Spectrum

ORDER = [m.model_id for m in catalogue().values()]


def spectra_of(model_id: str, values: list[float], count: int, seed: int) -> np.ndarray:
    """`count` spectra of one panel with 0.5 % scatter."""
    model = catalogue()[model_id]
    clean = model.impedance(model.natural(np.array([values])), FREQUENCY_HZ)
    return clean * (1.0 + 0.005 * noise((count, clean.shape[1]), seed))


def noise(shape: tuple[int, ...], seed: int) -> np.ndarray:
    random = np.random.default_rng(seed)
    return random.standard_normal(shape) + 1j * random.standard_normal(shape)


def fits_of(impedance: np.ndarray, **more: object) -> list[Fit]:
    count = len(impedance)
    given: dict[str, object] = {
        "area_cm2": [10.0] * count,
        "series": [str(i) for i in range(count)],
        "exposure_h": [float(i) for i in range(count)],
        "pinned": [""] * count,
    }
    found = fit_spectra(
        [Spectrum(FREQUENCY_HZ, z) for z in impedance],
        [np.ones(FREQUENCY_HZ.size, dtype=bool)] * count,
        **(given | more),  # type: ignore[arg-type]
    )
    return [fit for fit in found if fit is not None]


def test_a_resistance_that_does_not_show_is_at_most_so_large() -> None:
    """0.1 Ω of solution before a film of 2 kΩ at the fastest point, scatter 10 Ω."""
    for fit in fits_of(spectra_of("film_with_pores", [0.1, 8e-10, 0.97, 1e8], 10, 51)):
        solution = fit.parameter("R_s")
        assert solution is not None
        assert solution.bound is Bound.AT_MOST
        assert solution.low is None
        assert solution.high is not None
        assert 0.1 < solution.high < 100.0


def test_what_cannot_be_determined_gets_no_number() -> None:
    """An interface asked for behind a film that lets nothing through."""
    impedance = spectra_of("closed_film", [50.0, 8e-10, 0.97], 20, 52)
    seen: Counter[Bound] = Counter()
    made_up = 0
    for fit in fits_of(impedance, pinned=["pores_reacting_interface"] * 20):
        for parameter in fit.parameters:
            quantity = parameter.quantity
            seen[quantity.bound] += 1
            if quantity.bound is Bound.UNDETERMINED:
                assert quantity.value is quantity.low is quantity.high is None
            if quantity.bound is Bound.AT_LEAST:
                assert quantity.value == quantity.low
                assert quantity.high is None
        reaction, exponent = fit.parameter("R_ct"), fit.parameter("n_c")
        assert reaction is not None
        assert exponent is not None
        assert exponent.bound is Bound.TWO_SIDED
        made_up += reaction.bound is Bound.TWO_SIDED
    assert seen[Bound.UNDETERMINED] >= 20
    assert made_up <= 2  # limits of 95 % miss one in twenty


@pytest.mark.parametrize(("leads_ohm", "held"), [(5e9, True), (9e9, True), (3e10, False)])
def test_a_resistance_within_ten_times_of_the_leads_is_the_leads(
    leads_ohm: float, held: bool
) -> None:
    leads = Spectrum(FREQUENCY_HZ, 1.0 / (1.0 / leads_ohm + 2j * np.pi * FREQUENCY_HZ * 1e-13))
    impedance = spectra_of("film_with_pores", [50.0, 8e-10, 0.97, 1e9], 5, 53)
    for alone, fit in zip(fits_of(impedance), fits_of(impedance, open_lead=leads), strict=True):
        leak, before = fit.parameter("R_po"), alone.parameter("R_po")
        assert leak is not None
        assert before is not None
        assert leak.low == pytest.approx(before.low)
        if held:
            assert leak.bound is Bound.AT_LEAST
            assert leak.high is None
            assert "open lead" in leak.method
        else:
            assert leak.bound is Bound.TWO_SIDED
            # What the leads may have carried beside it: a thirtieth.
            assert before.high is not None
            assert leak.high == pytest.approx(before.high / (1.0 - 1.0 / 30.0), rel=2e-3)


def test_the_reasons_name_every_model_that_was_tried() -> None:
    made = make("pores_to_metal", 10, np.random.default_rng(54))
    automatic = [m for m in catalogue().values() if m.automatic]
    for fit in fits_of(made.impedance):
        assert [t.model for t in fit.trials] == [m.model_id for m in automatic]
        assert [t.parameters for t in fit.trials] == [len(m.parameters) for m in automatic]
        taken = [t for t in fit.trials if t.remark == "taken"]
        assert [t.model for t in taken] == [fit.model]
        assert taken[0].residual_rms_percent == pytest.approx(fit.residual_rms_percent, rel=0.01)
        for trial in fit.trials:
            assert trial.aicc is not None
            assert taken[0].aicc is not None
            if trial.aicc > taken[0].aicc:
                behind = trial.aicc - taken[0].aicc
                assert trial.remark == f"explains the data less well (AICc {behind:.1f} higher)"
            elif trial is not taken[0]:
                assert "does not pay" in trial.remark


def test_the_model_does_not_go_back_and_forth_within_the_scatter() -> None:
    """A second arc that grows out of the scatter over 24 inspections, on 6 panels: one at a time
    the choice goes back and forth where the arc just shows, along the series it does not."""
    model = catalogue()["pores_reacting_interface"]
    share = np.geomspace(0.004, 0.03, 24)
    values = [[50.0, 8e-10, 0.97, 1e7, 3e-9 / s, 0.9, 1e7 * s] for s in share]
    clean = model.impedance(model.natural(np.array(values)), FREQUENCY_HZ)
    impedance = np.concatenate([clean * (1.0 + 0.005 * noise(clean.shape, k)) for k in range(6)])
    panels = [str(k) for k in range(6) for _ in share]

    def changes(fits: list[Fit]) -> int:
        return sum(
            one.model != other.model
            for k in range(6)
            for one, other in pairwise(fits[24 * k : 24 * (k + 1)])
        )

    alone, along = fits_of(impedance), fits_of(impedance, series=panels)
    assert changes(alone) > 3 * 6
    assert 6 <= changes(along) <= 2 * 6
    backward = sum(
        ORDER.index(other.model) < ORDER.index(one.model)
        for k in range(6)
        for one, other in pairwise(along[24 * k : 24 * (k + 1)])
    )
    assert backward <= 1
    for k in range(6):
        assert along[24 * k].model == "film_with_pores"
        assert along[24 * k + 23].model == "pores_reacting_interface"


def test_residuals_that_follow_one_another_do_not_buy_elements() -> None:
    """The same gain in the sum of squares counts for less where residuals are correlated; and
    spectra with such residuals seldom get a circuit of more elements than made them."""
    cost, points = np.array([1.0, 0.8]), np.array([57.0, 57.0])
    gains = []
    for rho in (0.0, 0.8):
        poor, rich = (
            evidence(cost[[k]], points[[k]], np.array([rho]), count)[0]
            for k, count in enumerate((4, 7))
        )
        gains.append(poor - rich)
    assert gains[0] > 10.0
    assert gains[1] < 0.0

    model = catalogue()["film_with_pores"]
    clean = model.impedance(model.natural(np.array([[50.0, 8e-10, 0.95, 1e7]])), FREQUENCY_HZ)
    white = noise((100, 57), 55)
    following = np.empty_like(white)
    following[:, 0] = white[:, 0]
    for k in range(1, 57):
        following[:, k] = 0.7 * following[:, k - 1] + np.sqrt(1.0 - 0.49) * white[:, k]
    names = [fit.model for fit in fits_of(clean * (1.0 + 0.005 * following))]
    assert names.count("film_with_pores") >= 85


def test_spectra_on_several_grids_come_back_in_their_order() -> None:
    random = np.random.default_rng(56)
    coarse = np.logspace(4, -1, 26)
    spectra, truth = [], []
    for k in range(12):
        made = make("film_with_pores", 1, random, frequency_hz=FREQUENCY_HZ if k % 3 else coarse)
        spectra.append(Spectrum(made.frequency_hz, made.impedance[0]))
        truth.append(made.model.physical(made.truth[0]))
    used = [np.ones(s.frequency_hz.size, dtype=bool) for s in spectra]
    used[4][5:] = False
    fits = fit_spectra(
        spectra, used, area_cm2=[10.0] * 12, series=["a", "b", "c"] * 4,
        exposure_h=list(range(12)), pinned=["film_with_pores"] * 12,
    )  # fmt: skip
    assert fits[4] is None
    for k, (fit, wanted) in enumerate(zip(fits, truth, strict=True)):
        if k != 4:
            assert fit is not None
            assert fit.modelled_ohm.size == spectra[k].frequency_hz.size
            capacitance = fit.parameter("Q_c")
            assert capacitance is not None
            assert capacitance.value == pytest.approx(wanted[1], rel=0.15)


def test_processes_give_what_one_process_gives() -> None:
    made = make("film_with_pores", 260, np.random.default_rng(57))
    here = fits_of(made.impedance)
    with spread_over_processes(2) as spread:
        there = fits_of(made.impedance, spread=spread)
    for one, other in zip(here, there, strict=True):
        assert one.model == other.model
        assert one.parameters == other.parameters


def test_cross_validation_smooths_more_where_the_scatter_is_larger() -> None:
    made = make("pores_reacting_interface", 8, np.random.default_rng(58), scatter=0.0)
    used = np.ones(57, dtype=bool)
    strength = []
    for scatter in (0.001, 0.03):
        outlines = [
            relaxation_outline(FREQUENCY_HZ, z * (1.0 + scatter * noise((57,), k)), used)
            for k, z in enumerate(made.impedance)
        ]
        strength.append(np.mean([np.log10(o.strength) for o in outlines if o is not None]))
    assert strength[1] > strength[0] + 0.3
