"""Records that fill their slots directly are records like all others."""

from __future__ import annotations

import inspect
import pickle
from dataclasses import FrozenInstanceError, dataclass, fields, replace

import pytest

from coatgui.records import Bound, Finding, Quantity, Severity, results


@dataclass(frozen=True, slots=True)
class Plain:
    value: float | None
    low: float | None
    high: float | None
    bound: Bound
    unit: str
    method: str = ""


def test_it_is_made_by_place_and_by_name_and_has_its_defaults() -> None:
    by_place = Quantity(1.0, 0.5, 2.0, Bound.TWO_SIDED, "Ω")
    by_name = Quantity(unit="Ω", bound=Bound.TWO_SIDED, high=2.0, low=0.5, value=1.0, method="")
    assert by_place == by_name
    assert hash(by_place) == hash(by_name)
    assert list(inspect.signature(Quantity).parameters) == [f.name for f in fields(Quantity)]
    assert repr(by_place) == repr(Plain(1.0, 0.5, 2.0, Bound.TWO_SIDED, "Ω")).replace(
        "Plain", "Quantity"
    )
    assert Finding("code", Severity.NOTE, "text").points == ()
    with pytest.raises(TypeError, match=r"Quantity.__init__\(\) missing 1 required"):
        Quantity(1.0, 0.5, 2.0, Bound.TWO_SIDED)  # type: ignore[call-arg]


def test_it_stays_frozen_and_travels() -> None:
    quantity = Quantity(1.0, 0.5, 2.0, Bound.TWO_SIDED, "Ω", "fitted")
    with pytest.raises(FrozenInstanceError):
        quantity.value = 2.0  # type: ignore[misc]
    assert replace(quantity, unit="F").unit == "F"
    assert pickle.loads(pickle.dumps(quantity)) == quantity


def test_every_field_reaches_its_slot() -> None:
    for name in ("Quantity", "Parameter", "Modulus", "Finding", "WaterUptake", "Breakpoint",
                 "ActiveArea", "CoursePoint", "ReadingAssessment"):  # fmt: skip
        record = getattr(results, name)
        values = {f.name: object() for f in fields(record)}
        made = record(**values)
        assert all(getattr(made, field) is value for field, value in values.items())
