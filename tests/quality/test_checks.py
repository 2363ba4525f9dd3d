"""Faults put into clean spectra are found; clean spectra of every model are left in peace."""

from __future__ import annotations

import numpy as np
import pytest

from coatgui.circuits import catalogue
from coatgui.quality import check_spectra, hertz, leads_admittance
from coatgui.records import Check, Settings, Severity, Spectrum

FREQUENCY = np.logspace(5, -2, 57)
RANGES = {
    "R_s": (1, 2.5), "Q_c": (-10, -8.5), "R_po": (5, 9), "Q_dl": (-8, -6), "R_ct": (6, 10),
    "Q_1": (-10, -9), "R_1": (4, 7), "Q_2": (-9, -7), "R_2": (6, 9), "σ": (4, 7),
}  # fmt: skip
BARE = {"Q_dl": (-5, -4), "R_ct": (2, 5), "σ": (1, 3)}


def clean(rng: np.random.Generator, name: str) -> np.ndarray:
    model = catalogue()[name]
    values = []
    for symbol in model.symbols:
        if symbol.startswith("n_"):
            values.append(rng.uniform(0.8, 0.99))
            continue
        ranges = {**RANGES, **(BARE if name.startswith("bare") else {})}
        values.append(10 ** rng.uniform(*ranges[symbol]))
    return model.impedance(model.natural(np.array([values])), FREQUENCY)[0]


def noisy(rng: np.random.Generator, z: np.ndarray, share: float) -> np.ndarray:
    return z * (1 + share * (rng.standard_normal(z.size) + 1j * rng.standard_normal(z.size)))


def check(z: np.ndarray, open_lead: Spectrum | None = None) -> Check:
    spectrum = Spectrum(FREQUENCY, z)
    return check_spectra([spectrum], settings=Settings(), area_cm2=[10.0], open_lead=open_lead)[0]


def codes(found: Check) -> set[str]:
    return {finding.code for finding in found.findings}


def test_clean_spectra_raise_few_doubts_and_no_rejects() -> None:
    rng = np.random.default_rng(11)
    doubts = rejects = number = 0
    for name in catalogue():
        for _ in range(40):
            found = check(noisy(rng, clean(rng, name), 10 ** rng.uniform(-2.7, -1.7)))
            severities = {finding.severity for finding in found.findings}
            doubts += Severity.DOUBT in severities
            rejects += Severity.REJECT in severities
            number += 1
    assert doubts <= 0.02 * number
    assert rejects == 0


@pytest.mark.parametrize("name", ["film_with_pores", "pores_reacting_interface", "closed_film"])
def test_a_wild_point_is_found_and_suggested_out(name: str) -> None:
    rng = np.random.default_rng(12)
    hits = 0
    for _ in range(25):
        z = noisy(rng, clean(rng, name), 0.003)
        place = int(rng.integers(5, 52))
        z[place] *= 1.2
        found = check(z)
        hits += place in dict(found.suggested) and "wild_point" in (
            codes(found) | {"wild_point" if "mains_pick_up" in codes(found) else ""}
        )
        assert not found.rejected
    assert hits >= 24


def test_a_step_of_a_range_change_is_named() -> None:
    rng = np.random.default_rng(14)
    hits = 0
    for _ in range(20):
        z = noisy(rng, clean(rng, "film_with_pores"), 0.002)
        z[50:] *= 1.12
        hits += bool(codes(check(z)) & {"step", "drift", "scatter", "kramers_kronig"})
    assert hits >= 19


def test_a_turned_sign_and_a_positive_fast_end() -> None:
    rng = np.random.default_rng(15)
    z = noisy(rng, clean(rng, "pores_reacting_interface"), 0.003)
    turned = check(z.conj())
    assert turned.rejected
    assert codes(turned) == {"wrong_sign"}
    fast = z.copy()
    fast[:6] = fast[:6].conj()
    found = check(fast)
    assert "positive_imaginary_part" in codes(found)
    assert set(range(6)) <= set(dict(found.suggested))


def test_useless_readings_are_rejected() -> None:
    rng = np.random.default_rng(16)
    z = clean(rng, "pores_reacting_interface")
    assert check(noisy(rng, z, 0.3)).rejected
    assert "too_few_points" in codes(
        check_spectra([Spectrum(FREQUENCY[:5], z[:5])], settings=Settings(), area_cm2=[None])[0]
    )


def test_the_open_lead_sets_the_measuring_limit() -> None:
    omega = 2 * np.pi * FREQUENCY
    admittance = 1 / 5e11 + 1j * omega * 5e-12
    lead = Spectrum(FREQUENCY, 1 / admittance)
    assert leads_admittance(lead, FREQUENCY) == pytest.approx(admittance, rel=1e-9)
    model = catalogue()["film_with_pores"]
    z = model.impedance(model.natural(np.array([[50.0, 2e-11, 0.98, 5e12]])), FREQUENCY)[0]
    seen = 1 / (1 / z + admittance)
    assert "measuring_limit" in codes(check(seen, lead))
    low = model.impedance(model.natural(np.array([[50.0, 5e-10, 0.98, 1e7]])), FREQUENCY)[0]
    assert "measuring_limit" not in codes(check(low, lead))


def test_thresholds_can_be_set_for_a_campaign() -> None:
    rng = np.random.default_rng(17)
    z = noisy(rng, clean(rng, "film_with_pores"), 0.003)
    z[20] *= 1.2
    settings = Settings(thresholds=(("wild_point_percent", 50.0),))
    found = check_spectra([Spectrum(FREQUENCY, z)], settings=settings, area_cm2=[1.0])[0]
    assert not found.suggested


def test_frequencies_are_said_as_people_say_them() -> None:
    assert [hertz(f) for f in (6310.0, 0.631, 0.0126, 50.0)] == [
        "6.31 kHz", "0.631 Hz", "12.6 mHz", "50 Hz"
    ]  # fmt: skip
