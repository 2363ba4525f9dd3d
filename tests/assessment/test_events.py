"""Events and limit crossings: always an interval between two inspections."""

from __future__ import annotations

from collections.abc import Callable, Sequence

import pytest

from coatgui.assessment.amounts import from_logarithm
from coatgui.assessment.events import drying, limit_crossing, rebound_event, stage_events
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
    assert "already at the first reading" in crossing.text


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


def test_crossing_within_the_limits_and_a_return_are_said() -> None:
    crossing = limit_crossing(LIMIT, HOURS[:3], _moduli([1e9, 0.99e7, 1e8]))
    assert "may still have been above" in crossing.text
    assert "above it again later" in crossing.text


def test_stages_begin_at_the_first_reading_that_shows_them(made: Made) -> None:
    fits = [made(PORES)[1], made(PORES)[1], made(PORES | INTERFACE)[1]]
    events = {e.code: e for e in stage_events(HOURS[:3], fits, [False, True, True])}
    assert (events["pores_conducting"].after_h, events["pores_conducting"].by_h) == (1.0, 24.0)
    assert (events["interface_reacting"].after_h, events["interface_reacting"].by_h) == (
        24.0,
        168.0,
    )
    assert stage_events(HOURS[:1], [None], [False]) == []


def test_charge_transfer_that_the_data_leave_open_is_no_reaction(made: Made) -> None:
    fit = made(PORES | INTERFACE, bounds={"R_ct": Bound.AT_LEAST})[1]
    assert stage_events(HOURS[:1], [fit], [False]) == []


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
