"""The band and the parts of a fit: what a plot draws beside the curve."""

from __future__ import annotations

import numpy as np
import pytest
from synthetic import FREQUENCY_HZ, make

from coatgui.circuits import build_model, catalogue
from coatgui.circuits.layers import Layer
from coatgui.fitting import fit_spectra
from coatgui.fitting.views import FitBand, fit_band, fit_parts
from coatgui.records import Bound, Fit, Spectrum


def fits_of(impedance: np.ndarray, model_id: str, **more: object) -> list[Fit]:
    count = len(impedance)
    found = fit_spectra(
        [Spectrum(FREQUENCY_HZ, z) for z in impedance],
        [np.ones(FREQUENCY_HZ.size, dtype=bool)] * count,
        area_cm2=[10.0] * count,
        series=[str(i) for i in range(count)],
        exposure_h=[0.0] * count,
        pinned=[model_id] * count,
        **more,  # type: ignore[arg-type]
    )
    return [fit for fit in found if fit is not None]


def scattered(model_id: str, values: list[float], count: int) -> tuple[np.ndarray, np.ndarray]:
    """Clean impedance (N,) and `count` spectra with 0.5 % scatter."""
    model = catalogue()[model_id]
    clean = model.impedance(model.natural(np.array([values])), FREQUENCY_HZ)[0]
    random = np.random.default_rng(41)
    noise = random.standard_normal((count, 57)) + 1j * random.standard_normal((count, 57))
    return clean, clean * (1.0 + 0.005 * noise)


def holding(band: FitBand, clean: np.ndarray) -> np.ndarray:
    """Whether the truth lies within, (4, N): modulus, phase, real and imaginary part."""
    phase = np.degrees(np.angle(clean))
    return np.array(
        [
            (low <= true) & (true <= high)
            for low, true, high in (
                (band.modulus_low_ohm, np.abs(clean), band.modulus_high_ohm),
                (band.phase_low_deg, phase, band.phase_high_deg),
                (band.real_low_ohm, clean.real, band.real_high_ohm),
                (band.imaginary_low_ohm, clean.imag, band.imaginary_high_ohm),
            )
        ]
    )


@pytest.mark.parametrize("model_id", [m.model_id for m in catalogue().values() if m.automatic])
def test_the_band_holds_the_true_curve_as_often_as_it_says(model_id: str) -> None:
    made = make(model_id, 250, np.random.default_rng(42))
    clean = made.model.impedance(made.truth, FREQUENCY_HZ)
    hits, reliable = [], []
    for fit, true in zip(fits_of(made.impedance, model_id), clean, strict=True):
        band = fit_band(fit, catalogue()[fit.model], FREQUENCY_HZ)
        assert band is not None
        np.testing.assert_allclose(band.impedance_ohm, fit.modelled_ohm, rtol=1e-9)
        hits.append(holding(band, true)[:, band.holds].mean(axis=1))
        reliable.append(band.holds.mean())
        assert (band.text == "") == bool(
            band.holds.all() and (np.diag(fit.log_covariance) > 0).all()
        )
    # A spectrum's own share varies by 0.14: over 250 of them three standard deviations are 0.027.
    assert np.all(np.abs(np.nanmean(hits, axis=0) - 0.95) < 0.03)
    assert np.mean(reliable) > 0.9


def test_the_band_says_where_it_does_not_hold_and_what_it_takes_as_known() -> None:
    """A leak beyond what the slowest point shows: the fit ran to the end of its search, or its
    limits are so wide that the circuit is no straight line within them."""
    clean, noisy = scattered("film_with_pores", [50, 8e-10, 0.97, 1e14], 60)
    known = bent = 0
    hits = []
    for fit in fits_of(noisy, "film_with_pores"):
        leak = fit.parameter("R_po")
        assert leak is not None
        band = fit_band(fit, catalogue()[fit.model], FREQUENCY_HZ)
        assert band is not None
        hits.append(holding(band, clean).mean(axis=1))
        if "takes R_po as known" in band.text:
            known += 1
        elif "only a rough guide" in band.text:
            # The doubt is about the slow end, where the leak would show first.
            assert leak.bound is not Bound.TWO_SIDED
            assert not band.holds[-1]
            assert band.holds.mean() > 0.5
            bent += 1
    assert known > 10
    assert bent > 10
    assert np.all(np.abs(np.mean(hits, axis=0) - 0.95) < 0.04)


def test_the_band_agrees_with_fits_to_data_scattered_anew() -> None:
    clean, noisy = scattered("pores_reacting_interface", [80, 1e-9, 0.95, 1e6, 1e-7, 0.9, 1e7], 300)
    curves, widths = [], []
    for fit in fits_of(noisy, "pores_reacting_interface"):
        band = fit_band(fit, catalogue()[fit.model], FREQUENCY_HZ)
        assert band is not None
        curves.append(np.log(fit.modelled_ohm / clean))
        half = 0.5 * np.log(band.modulus_high_ohm / band.modulus_low_ohm)
        widths.append([half, np.radians(0.5 * (band.phase_high_deg - band.phase_low_deg))])
    seen = np.array([np.std(np.real(curves), axis=0), np.std(np.imag(curves), axis=0)])
    # 300 fits give a standard deviation to 4 %; three of those, and Student's t of 107.
    np.testing.assert_allclose(np.median(widths, axis=0), 1.982 * seen, rtol=0.15)


def test_leads_in_parallel_are_drawn_with_the_curve() -> None:
    clean, noisy = scattered("film_with_pores", [50, 8e-10, 0.97, 1e8], 1)
    (fit,) = fits_of(noisy, "film_with_pores")
    leads = np.full(FREQUENCY_HZ.size, 1e-8 + 0j)
    model = catalogue()[fit.model]
    alone = fit_band(fit, model, FREQUENCY_HZ)
    band = fit_band(fit, model, FREQUENCY_HZ, parallel_s=leads)
    assert alone is not None
    assert band is not None
    np.testing.assert_allclose(1 / band.impedance_ohm, 1 / fit.modelled_ohm + leads)
    assert holding(band, 1 / (1 / clean + leads)).mean() > 0.8
    # The leads take half of the current at the slow end, and with it half of the doubt.
    width = [np.log(b.modulus_high_ohm / b.modulus_low_ohm)[-1] for b in (alone, band)]
    assert width[1] == pytest.approx(0.5 * width[0], rel=0.1)


def test_the_parts_are_those_of_the_circuit() -> None:
    values = {"R_s": 80, "Q_c": 1e-9, "n_c": 0.95, "R_po": 1e6, "Q_dl": 1e-7, "n_dl": 0.9}
    clean, _ = scattered("pores_diffusion_tail", [*values.values(), 1e7, 1e5], 1)
    (fit,) = fits_of(clean[None, :], "pores_diffusion_tail")
    parts = {part.name: part for part in fit_parts(fit, catalogue()[fit.model], FREQUENCY_HZ)}
    assert list(parts) == [
        "solution",
        "film as a capacitor",
        "pores of the film",
        "interface as a capacitor",
        "reaction of the metal",
        "diffusion",
        "interface as a whole",
        "pores and all that lies behind them",
    ]
    assert [part.layer for part in parts.values()] == [0, 1, 1, 2, 2, 2, 2, 1]
    assert parts["interface as a whole"].symbols == ("Q_dl", "n_dl", "R_ct", "σ")
    z = {name: part.impedance_ohm for name, part in parts.items()}
    assert all(curve is not None and curve.shape == FREQUENCY_HZ.shape for curve in z.values())
    omega = 2 * np.pi * FREQUENCY_HZ
    np.testing.assert_allclose(z["film as a capacitor"], 1e9 * (1j * omega) ** -0.95, rtol=1e-4)
    reaction = z["reaction of the metal"] + z["diffusion"]
    interface = 1 / (1 / z["interface as a capacitor"] + 1 / reaction)
    np.testing.assert_allclose(z["interface as a whole"], interface)
    behind = z["pores of the film"] + interface
    np.testing.assert_allclose(z["pores and all that lies behind them"], behind)
    whole = z["solution"] + 1 / (1 / z["film as a capacitor"] + 1 / behind)
    np.testing.assert_allclose(whole, fit.modelled_ohm)


def test_a_part_of_which_only_a_bound_is_known_is_drawn_at_the_bound() -> None:
    _, noisy = scattered("film_with_pores", [50, 8e-10, 0.97, 1e14], 12)
    fits = fits_of(noisy, "film_with_pores")
    fit = next(f for f in fits if f.parameter("R_po").bound is Bound.AT_LEAST)  # type: ignore[union-attr]
    part = next(
        p
        for p in fit_parts(fit, catalogue()[fit.model], FREQUENCY_HZ)
        if p.name.startswith("pores")
    )
    leak = fit.parameter("R_po")
    assert leak is not None
    assert part.bounds == ("R_po",)
    assert part.impedance_ohm is not None
    assert part.impedance_ohm == pytest.approx(np.full(57, leak.low))


def test_parts_and_band_of_ones_own_model_and_of_the_wrong_one() -> None:
    own = build_model(
        "own", "Own",
        (Layer("film_1", ionic="resistor", next_layer="behind_layer"),
         Layer("film_2", ionic="resistor")),
        inductance=True, fixed={"L": 1e-6},
    )  # fmt: skip
    made = make("pores_reacting_interface", 1, np.random.default_rng(43))
    (fit,) = fits_of(made.impedance, "own", own_models=[own])
    names = [part.name for part in fit_parts(fit, own, FREQUENCY_HZ)]
    assert names == [
        "leads",
        "solution",
        "outer film as a capacitor",
        "leakage of the outer film",
        "outer film as a whole",
        "inner film as a capacitor",
        "leakage of the inner film",
        "inner film as a whole",
    ]
    band = fit_band(fit, own, FREQUENCY_HZ)
    assert band is not None
    np.testing.assert_allclose(band.impedance_ohm, fit.modelled_ohm)
    for ask in (fit_parts, fit_band):
        with pytest.raises(ValueError, match="does not belong"):
            ask(fit, catalogue()["closed_film"], FREQUENCY_HZ)
