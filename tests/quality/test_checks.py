"""Single readings with a known fault: the finding, its words, its evidence, its points."""

from __future__ import annotations

import numpy as np
import pytest

from coatgui.circuits import catalogue
from coatgui.progress import Cancelled, Progress
from coatgui.quality import check_spectra, hertz, leads_admittance
from coatgui.records import Check, Finding, Settings, Severity, Spectrum

FREQUENCY = np.logspace(5, -2, 71)
OMEGA = 2 * np.pi * FREQUENCY


def panel(name: str, *values: float, frequency_hz: np.ndarray = FREQUENCY) -> np.ndarray:
    model = catalogue()[name]
    return model.impedance(model.natural(np.array([values])), frequency_hz)[0]


def pores(frequency_hz: np.ndarray = FREQUENCY) -> np.ndarray:
    values = (50.0, 1e-9, 0.95, 1e5, 1e-6, 0.85, 1e6)
    return panel("pores_reacting_interface", *values, frequency_hz=frequency_hz)


def noisy(z: np.ndarray, seed: int = 1, share: float = 0.003) -> np.ndarray:
    rng = np.random.default_rng(seed)
    return z * (1 + share * (rng.standard_normal(z.size) + 1j * rng.standard_normal(z.size)))


def check(
    z: np.ndarray,
    open_lead: Spectrum | None = None,
    frequency_hz: np.ndarray = FREQUENCY,
    settings: Settings | None = None,
    **more: float,
) -> Check:
    spectrum = Spectrum(frequency_hz, z)
    return check_spectra(
        [spectrum], settings=settings or Settings(), area_cm2=[10.0], open_lead=open_lead, **more
    )[0]


def finding(found: Check, code: str) -> Finding:
    (only,) = [f for f in found.findings if f.code == code]
    return only


def codes(found: Check) -> set[str]:
    return {f.code for f in found.findings}


def test_a_clean_reading_has_nothing_to_say() -> None:
    assert check(noisy(pores())) == Check()


@pytest.mark.parametrize("places", [(20,), (69,), (70,), (0,), (37, 38), (69, 70), (10, 39, 50)])
def test_wild_points_are_all_suggested_out_and_no_others(places: tuple[int, ...]) -> None:
    z = noisy(pores())
    for i, place in enumerate(places):
        z[place] *= np.exp(0.25 * np.exp(2j * i + 1j))
    found = check(z)
    assert set(dict(found.suggested)) == set(places)
    assert codes(found) == {"wild_point"}
    assert not found.rejected
    for f in found.findings:
        assert hertz(float(FREQUENCY[f.points[0]])) in f.text
        assert dict(f.evidence)["percent_off"] == pytest.approx(25, abs=5)


@pytest.mark.parametrize("start", [10, 40, 65])
def test_a_burst_of_scatter_is_named_up_to_the_last_point(start: int) -> None:
    z = noisy(pores())
    z[start : start + 6] = noisy(z[start : start + 6], 2, 0.1)
    found = check(z)
    scatter = finding(found, "scatter")
    assert len(set(scatter.points) & set(range(start, start + 6))) >= 4
    assert set(scatter.points) <= set(range(start - 2, start + 8))
    assert set(dict(found.suggested)) <= set(range(start - 1, start + 7))
    assert hertz(float(FREQUENCY[scatter.points[-1]])) in scatter.text


@pytest.mark.parametrize(("mains_hz", "at_hz"), [(50.0, 50.0), (50.0, 100.0), (60.0, 125.9)])
def test_mains_are_told_from_other_wild_points(mains_hz: float, at_hz: float) -> None:
    place = int(np.abs(FREQUENCY - at_hz).argmin())
    z = noisy(pores())
    z[place] *= 1.15
    found = check(z, settings=Settings(mains_hz=mains_hz))
    heard = abs(FREQUENCY[place] / mains_hz - round(FREQUENCY[place] / mains_hz)) < 0.03
    assert codes(found) == ({"mains_pick_up"} if heard else {"wild_point"})
    assert heard == (mains_hz == 50.0)
    assert dict(found.suggested).keys() == {place}


@pytest.mark.parametrize("decay", [0.0, 0.3])
def test_a_step_is_named_between_its_two_points(decay: float) -> None:
    z = noisy(pores())
    z[55:] *= np.exp(0.08 * np.exp(-decay * np.arange(z.size - 55)))
    found = check(z)
    assert codes(found) == {"step"}
    step = finding(found, "step")
    assert step.points == (54, 55)
    assert dict(step.evidence)["percent"] == pytest.approx(8.3, abs=1.5)
    assert "steps up" in step.text
    assert not found.suggested


def test_a_small_step_is_a_note_where_ranges_are_known_to_differ() -> None:
    tolerant = Settings(thresholds=(("step_doubt_percent", 2.5),))
    z = noisy(pores(), share=0.001)
    z[55:] *= 1.02
    assert finding(check(z), "step").severity is Severity.DOUBT
    assert finding(check(z, settings=tolerant), "step").severity is Severity.NOTE
    z[55:] *= 1.02
    assert finding(check(z, settings=tolerant), "step").severity is Severity.DOUBT


def test_a_lag_that_passes_the_right_angle_at_the_fast_end_only_is_named() -> None:
    """Where few points show it, their mean is asked for less than a point anywhere."""
    film = 1 / (2j * np.pi * FREQUENCY * 1e-9) ** 0.98
    lag = np.exp(-0.08j * FREQUENCY / FREQUENCY[0])
    found = [{f.code for f in check(noisy(film * lag, seed, 0.015)).findings} for seed in range(40)]
    assert sum("negative_real_part" in codes for codes in found) >= 30
    quiet = [{f.code for f in check(noisy(film, seed, 0.015)).findings} for seed in range(200)]
    assert sum("negative_real_part" in codes for codes in quiet) <= 2


def test_drift_is_told_from_scatter() -> None:
    elapsed = np.cumsum(1 / FREQUENCY) / np.sum(1 / FREQUENCY)
    drifting = check(noisy(pores() * (1 - 0.2 * elapsed)))
    drift = finding(drifting, "drift")
    assert "below" in drift.text
    assert "changed during the sweep" in drift.text
    assert drift.points[-1] == 70
    z = noisy(pores())
    z[60:] = noisy(z[60:], 3, 0.03)
    assert "drift" not in codes(check(z))
    assert "scatter" in codes(check(z))


def test_scatter_all_over_is_a_doubt_and_then_a_rejection() -> None:
    assert finding(check(noisy(pores(), 4, 0.05)), "kramers_kronig").severity is Severity.DOUBT
    assert finding(check(noisy(pores(), 4, 0.3)), "kramers_kronig").severity is Severity.REJECT


def test_a_turned_sign_is_rejected_and_nothing_else_is_said() -> None:
    found = check(noisy(pores()).conj())
    assert found.rejected
    assert codes(found) == {"wrong_sign"}


@pytest.mark.parametrize(
    ("change", "code"),
    [(np.radians, "phase_in_radians"), (np.degrees, "phase_in_degrees")],
)
def test_a_phase_in_the_wrong_unit_is_rejected(change: np.ufunc, code: str) -> None:
    z = noisy(pores())
    found = check(np.abs(z) * np.exp(1j * change(np.angle(z))))
    assert codes(found) == {code}
    assert found.rejected


def test_an_inductive_tail_is_told_from_other_artefacts() -> None:
    z = panel("bare_metal", 20.0, 3e-5, 0.9, 1e4)
    tail = check(noisy(z + 5e-5j * OMEGA))
    inductive = finding(tail, "positive_imaginary_part")
    assert "an inductance of about 5" in inductive.text
    assert dict(inductive.evidence)["inductance_h"] == pytest.approx(5e-5, rel=0.1)
    assert set(dict(tail.suggested)) == set(inductive.points)
    assert inductive.points == tuple(range(len(inductive.points)))
    other = noisy(z)
    other[:6] += 0.1j * np.abs(other[:6])
    assert "inductance" not in finding(check(other), "positive_imaginary_part").text


def test_a_phase_beyond_a_capacitor_is_named() -> None:
    z = panel("closed_film", 10.0, 1e-9, 0.99)
    turned = noisy(z * np.exp(-0.1j * FREQUENCY / FREQUENCY[0]))
    found = check(turned)
    named = finding(found, "negative_real_part")
    assert named.points[0] == 0
    assert set(named.points) == set(dict(found.suggested))


def test_zero_is_a_finding_and_no_crash() -> None:
    z = noisy(pores())
    z[[12, 70]] = 0
    found = check(z)
    assert finding(found, "zero_impedance").points == (12, 70)
    assert set(dict(found.suggested)) == {12, 70}
    assert codes(found) == {"zero_impedance"}
    assert codes(check(np.zeros(71, dtype=complex))) == {"too_few_points"}


def test_too_little_to_judge_is_rejected() -> None:
    few = check(pores()[:5], frequency_hz=FREQUENCY[:5])
    assert codes(few) == {"too_few_points"}
    assert few.rejected
    same = check(np.full(20, 1e5 - 1e4j), frequency_hz=np.full(20, 1e3))
    assert same.rejected
    assert "one frequency" in same.findings[0].text


def test_faults_together_make_a_reading_useless() -> None:
    z = noisy(panel("bare_metal", 20.0, 3e-5, 0.9, 1e4))
    z[:13] += 0.2j * np.abs(z[:13])
    z[40] *= 3
    found = check(z)
    useless = finding(found, "useless")
    assert useless.severity is Severity.REJECT
    assert hertz(float(FREQUENCY[40])) in useless.text
    assert hertz(float(FREQUENCY[12])) in useless.text


def test_a_point_measured_twice_shows_what_changed_meanwhile() -> None:
    frequency = np.sort(np.append(FREQUENCY, FREQUENCY[30]))[::-1]
    steady = noisy(pores(frequency), 5)
    assert check(steady, frequency_hz=frequency) == Check()
    steady[31] *= 1.1
    found = check(steady, frequency_hz=frequency)
    repeat = finding(found, "repeat_differs")
    assert repeat.points == (30, 31)
    assert dict(repeat.evidence)["percent"] == pytest.approx(10, abs=2)
    assert "wild_point" not in codes(found)


def test_what_the_sweep_does_not_cover_is_said() -> None:
    sparse = np.logspace(5, -2, 29)
    density = finding(check(noisy(pores(sparse)), frequency_hz=sparse), "few_points")
    assert dict(density.evidence)["points_per_decade"] == pytest.approx(4)
    short = np.logspace(5, -1, 61)
    ends = finding(check(noisy(pores(short)), frequency_hz=short), "range")
    assert "100 mHz" in ends.text or "0.1 Hz" in ends.text
    assert "10 mHz" in ends.text
    slow = np.logspace(2.5, -2, 46)
    z = panel("bare_metal", 20.0, 2e-5, 0.9, 1e5, frequency_hz=slow)
    assert "no_plateau" in codes(check(noisy(z), frequency_hz=slow))


def test_points_too_far_apart_are_not_judged_but_the_sign_is() -> None:
    sparse = np.logspace(5, -2, 12)
    z = noisy(pores(sparse))
    z[5] *= 1.5
    assert codes(check(z, frequency_hz=sparse)) == {"kramers_kronig_not_tested", "few_points"}
    assert codes(check(noisy(pores(sparse)).conj(), frequency_hz=sparse)) == {"wrong_sign"}


LEADS = 1 / 5e11 + 1j * OMEGA * 5e-12


def test_the_open_lead_sets_the_measuring_limit() -> None:
    lead = Spectrum(FREQUENCY, 1 / LEADS)
    assert leads_admittance(lead, FREQUENCY) == pytest.approx(LEADS, rel=1e-9)
    near = 1 / (1 / panel("film_with_pores", 50.0, 2e-11, 0.98, 2e11) + LEADS)
    assert finding(check(noisy(near), lead), "measuring_limit").severity is Severity.NOTE
    over = 1 / (1 / panel("film_with_pores", 50.0, 2e-12, 0.98, 5e12) + LEADS)
    theirs = finding(check(noisy(over), lead), "measuring_limit")
    assert theirs.severity is Severity.DOUBT
    assert "the leads" in theirs.text
    low = panel("film_with_pores", 50.0, 5e-10, 0.98, 1e7)
    assert check(noisy(low), lead) == Check()


def test_beyond_the_open_lead_run_no_limit_is_known() -> None:
    inside = FREQUENCY > 1.0
    lead = Spectrum(FREQUENCY[inside], 1 / LEADS[inside])
    near = 1 / (1 / panel("film_with_pores", 50.0, 2e-11, 0.98, 2e11) + LEADS)
    found = check(noisy(near), lead)
    beyond = finding(found, "open_lead_range")
    assert set(beyond.points) == set(np.nonzero(~inside)[0].tolist())
    limit = [f for f in found.findings if f.code == "measuring_limit"]
    assert all(inside[list(f.points)].all() for f in limit)


def test_the_instruments_input_stands_in_for_an_open_lead_run() -> None:
    near = 1 / (1 / panel("film_with_pores", 50.0, 2e-11, 0.98, 2e11) + LEADS)
    given = check(noisy(near), input_resistance_ohm=5e11, input_capacitance_f=5e-12)
    assert "input" in finding(given, "measuring_limit").text
    assert finding(check(noisy(near)), "no_open_lead").severity is Severity.NOTE


def test_thresholds_can_be_set_for_a_campaign() -> None:
    z = noisy(pores())
    z[20] *= 1.2
    assert check(z).suggested
    lenient = Settings(thresholds=(("wild_point_percent", 50.0), ("scatter_percent", 50.0)))
    assert not check(z, settings=lenient).suggested


def test_checking_can_be_cancelled() -> None:
    progress = Progress(cancelled=lambda: True)
    with pytest.raises(Cancelled):
        check_spectra(
            [Spectrum(FREQUENCY, pores())],
            settings=Settings(),
            area_cm2=[None],
            progress=progress,
        )


def test_frequencies_are_said_as_people_say_them() -> None:
    assert [hertz(f) for f in (6310.0, 0.631, 0.0126, 50.0)] == [
        "6.31 kHz", "0.631 Hz", "12.6 mHz", "50 Hz"
    ]  # fmt: skip
