"""Events and limit crossings: always an interval between two inspections."""

from __future__ import annotations

from collections.abc import Callable, Sequence

import numpy as np
import pytest

from coatgui.assessment.amounts import from_logarithm
from coatgui.assessment.events import (
    drying,
    fall_event,
    rebound_event,
    replicate_noise,
    sorption_events,
    stage_events,
)
from coatgui.assessment.fick import fickian_uptake
from coatgui.assessment.limits import limit_crossing
from coatgui.assessment.sorption import dry_capacitance
from coatgui.records import Bound, Criterion, Fit, Modulus, ModulusStatus, Quantity, Spectrum

Made = Callable[..., tuple[Spectrum, Fit]]
LIMIT = Criterion("Barrier limit", 0.1, 1e7, "")
HOURS = (1.0, 24.0, 168.0, 336.0, 672.0)
PORES = {"R_s": 50.0, "Q_c": 1e-9, "n_c": 0.97, "R_po": 1e6}
INTERFACE = {"Q_dl": 1e-6, "n_dl": 0.85, "R_ct": 1e7}


def _moduli(
    values: Sequence[float | None], bounds: dict[int, Bound] | None = None
) -> list[Modulus]:
    found = []
    for place, value in enumerate(values):
        bound = (bounds or {}).get(place, Bound.TWO_SIDED)
        if value is None:
            found.append(Modulus(0.1, ModulusStatus.NOT_REACHED, None))
            continue
        high = None if bound is Bound.AT_LEAST else value * 1.02
        quantity = Quantity(value, value / 1.02, high, bound, "Ω cm²")
        found.append(Modulus(0.1, ModulusStatus.MEASURED, quantity))
    return found


def _film(*values: float, percent: float = 0.3) -> list[Quantity | None]:
    return [from_logarithm(v * 1e-10, percent / 100, "F/cm²", "") for v in values]


def test_crossing_lies_between_two_inspections() -> None:
    crossing = limit_crossing(LIMIT, HOURS, _moduli([1e9, 1e8, 3e6, 1e6, 1e5]))
    assert (crossing.after_h, crossing.by_h) == (24.0, 168.0)
    assert crossing.text == "Below 10⁷ Ω cm² at 0.1 Hz between 24 h and 168 h."


def test_crossing_skips_what_was_not_reached() -> None:
    crossing = limit_crossing(LIMIT, HOURS, _moduli([1e9, None, None, 1e6, 1e5]))
    assert (crossing.after_h, crossing.by_h) == (1.0, 336.0)


def test_below_from_the_start() -> None:
    crossing = limit_crossing(LIMIT, HOURS, _moduli([1e6] * 5))
    assert (crossing.after_h, crossing.by_h) == (None, 1.0)
    assert "before the first reading, 1 h" in crossing.text


def test_never_below() -> None:
    crossing = limit_crossing(LIMIT, HOURS, _moduli([1e9] * 5))
    assert (crossing.after_h, crossing.by_h) == (None, None)
    assert "up to 672 h" in crossing.text


def test_bounds_below_the_limit_say_nothing_and_above_it_they_do() -> None:
    low = limit_crossing(
        LIMIT, HOURS[:2], _moduli([1e6, 1e6], dict.fromkeys((0, 1), Bound.AT_LEAST))
    )
    assert (low.after_h, low.by_h) == (None, None)
    assert "Nothing can be said" in low.text
    high = limit_crossing(LIMIT, HOURS[:2], _moduli([1e10, 1e6], {0: Bound.AT_LEAST}))
    assert (high.after_h, high.by_h) == (1.0, 24.0)


def test_reading_that_holds_the_limit_between_its_limits_does_not_tell() -> None:
    """The truth may lie on either side, so the interval reaches over it."""
    crossing = limit_crossing(LIMIT, HOURS[:4], _moduli([1e9, 1e8, 0.99e7, 1e6]))
    assert (crossing.after_h, crossing.by_h) == (24.0, 336.0)
    last = limit_crossing(LIMIT, HOURS[:3], _moduli([1e9, 1e8, 0.99e7]))
    assert (last.after_h, last.by_h, last.watched_h) == (None, None, 24.0)
    assert "The reading at 168 h lies on it within its limits." in last.text


def test_return_above_the_limit_is_said() -> None:
    crossing = limit_crossing(LIMIT, HOURS[:3], _moduli([1e9, 1e6, 1e8]))
    assert (crossing.after_h, crossing.by_h) == (1.0, 24.0)
    assert "above it again later" in crossing.text


def _pores(*values: float, at_least: bool = False) -> list[Quantity | None]:
    if at_least:
        return [Quantity(v, v, None, Bound.AT_LEAST, "Ω cm²") for v in values]
    return [from_logarithm(v, 0.01, "Ω cm²", "") for v in values]


def test_stages_begin_at_the_first_reading_that_shows_them(made: Made) -> None:
    fits = [made(PORES)[1], made(PORES)[1], *(made(PORES | INTERFACE)[1] for _ in range(2))]
    resistance = _pores(1e10, at_least=True) + _pores(1e8, 1e7, 1e6)
    found = stage_events(HOURS[:4], fits, resistance, [False, True, True, True])
    events = {e.code: e for e in found}
    assert (events["pores_conducting"].after_h, events["pores_conducting"].by_h) == (1.0, 24.0)
    assert events["pores_conducting"].confirmed
    assert (events["interface_reacting"].after_h, events["interface_reacting"].by_h) == (
        24.0,
        168.0,
    )
    assert "diffusion_control" not in events
    assert stage_events(HOURS[:1], [None], [None], [False]) == []


def test_first_reading_cannot_date_an_onset(made: Made) -> None:
    """A film that leaks from the start: before the first reading, never at it."""
    fits = [made(PORES)[1]] * 3
    (event,) = stage_events(HOURS[:3], fits, _pores(1e8, 1e7, 1e6), [True] * 3)
    assert (event.after_h, event.by_h) == (None, 1.0)
    assert event.text == "The pores conduct, before the first reading, 1 h."


def test_bound_below_the_first_seen_resistance_cannot_tell(made: Made) -> None:
    """At least 1e7 at 1 h is no evidence against the 1e8 that is seen at 24 h."""
    fits = [made(PORES)[1]] * 3
    resistance = _pores(1e7, at_least=True) + _pores(1e8, 9e7)
    (event,) = stage_events(HOURS[:3], fits, resistance, [False, True, True])
    assert (event.after_h, event.by_h) == (None, 24.0)
    assert "the readings before it cannot tell" in event.text


def test_lone_evidence_is_no_onset_and_the_last_reading_is_unconfirmed(made: Made) -> None:
    plain, reacting = made(PORES)[1], made(PORES | INTERFACE)[1]
    closed = [False] * 4
    none = [None] * 4
    assert stage_events(HOURS[:4], [plain, reacting, plain, plain], none, closed) == []
    (event,) = stage_events(HOURS[:4], [plain, plain, plain, reacting], none, closed)
    assert (event.after_h, event.by_h, event.confirmed) == (168.0, 336.0, False)
    assert "only the last reading shows it" in event.text


def test_charge_transfer_that_the_data_leave_open_is_no_reaction(made: Made) -> None:
    fit = made(PORES | INTERFACE, bounds={"R_ct": Bound.AT_LEAST})[1]
    assert stage_events(HOURS[:1], [fit], [None], [False]) == []


def test_diffusion_controls_where_its_tail_is_held(made: Made) -> None:
    plain, tail = made(PORES | INTERFACE)[1], made(PORES | INTERFACE | {"σ": 1e5})[1]
    found = stage_events(HOURS[:3], [plain, tail, tail], [None] * 3, [False] * 3)
    event = next(e for e in found if e.code == "diffusion_control")
    assert (event.after_h, event.by_h) == (1.0, 24.0)


def test_fall_is_dated_from_the_last_reading_at_the_level() -> None:
    event = fall_event(HOURS, _moduli([1e9, 0.98e9, 0.7e9, 1e8, 1e7]), 0.02)
    assert event is not None
    assert (event.after_h, event.by_h) == (24.0, 336.0)
    assert fall_event(HOURS, _moduli([1e9, 1e9, 1e8, 1e9, 1e9]), 0.02) is None  # a lone wobble
    assert fall_event(HOURS, _moduli([1e9, 1e9, 2e8, 2e8, 2e8]), 0.3) is None  # within the noise


def test_replicate_noise_leaves_out_what_the_panels_share() -> None:
    random = np.random.default_rng(4)
    shared = np.array([9.0, 9.0, 8.0, 7.0, 7.5, 6.0] * 5)
    own = shared + random.uniform(-0.5, 0.5, (4, 1)) + 0.05 * random.standard_normal((4, 30))
    noise = replicate_noise(own)
    assert noise == pytest.approx(0.05, rel=0.25)
    assert replicate_noise(own[:1]) is None
    own[0, :] = np.nan
    assert replicate_noise(own) == pytest.approx(0.05, rel=0.35)


def _soak(rate_per_h: float, hours: Sequence[float]) -> list[Quantity | None]:
    share = fickian_uptake(rate_per_h * np.asarray(hours))
    return [from_logarithm(float(c), 0.001, "F/cm²", "") for c in 1e-10 * np.exp(0.13 * share)]


def test_saturation_lies_between_two_inspections() -> None:
    hours = (1.0, 2.0, 4.0, 8.0, 24.0, 72.0, 168.0)
    rate = 1.1 / 20  # 95 percent is reached after 20.6 h
    capacitance = _soak(rate, hours)
    sorption = dry_capacitance(hours, [q for q in capacitance if q], "")
    (event,) = sorption_events(hours, sorption, capacitance)
    assert event.code == "film_saturated"
    assert (event.after_h, event.by_h) == (8.0, 24.0)
    early = dry_capacitance(hours[:4], [q for q in capacitance[:4] if q], "")
    assert sorption_events(hours[:4], early, capacitance[:4]) == []


def test_film_that_no_longer_rises_was_saturated_before_its_first_reading() -> None:
    hours = (72.0, 168.0, 336.0)
    capacitance = _soak(0.5, hours)
    sorption = dry_capacitance(hours, [q for q in capacitance if q], "")
    (event,) = sorption_events(hours, sorption, capacitance)
    assert (event.after_h, event.by_h) == (None, 72.0)
    assert sorption_events(hours, None, capacitance) == []


def test_drying_and_wetting_again() -> None:
    found = drying(HOURS, _film(1.0, 1.12, 1.02, 1.03, 1.13))
    assert [e.code for e in found.events] == ["dried_out", "wetted_again"]
    assert (found.events[0].after_h, found.events[0].by_h) == (24.0, 168.0)
    assert (found.events[1].after_h, found.events[1].by_h) == (336.0, 672.0)
    assert found.first == 2
    assert found.fallen_percent[2] == pytest.approx(100 * (1 - 1.02 / 1.12))
    assert found.fallen_percent[4] is None


def test_drop_within_the_limits_is_no_drying() -> None:
    assert drying(HOURS[:2], _film(1.1, 1.05, percent=3.0)).events == ()
    assert drying(HOURS[:2], _film(1.1, 1.08)).events == ()
    gaps: list[Quantity | None] = [None, *_film(1.1), None]
    assert drying(HOURS[:3], gaps).first == 3


def test_rebound_needs_a_fall_before_it() -> None:
    assert rebound_event(HOURS, _moduli([1e6, 1e7, 1e8, 1e9, 1e10])) is None
    event = rebound_event(HOURS, _moduli([1e9, 1e6, 1e6, 2e7, 1e7]))
    assert event is not None
    assert (event.after_h, event.by_h) == (168.0, 336.0)
    assert rebound_event(HOURS, _moduli([1e9, 1e6, 2e6, 1e6, None])) is None
