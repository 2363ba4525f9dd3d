"""Thresholds are data with a source each, all of them are used, and a campaign can set each."""

from __future__ import annotations

import re
import tomllib
from pathlib import Path

import pytest

import coatgui
from coatgui.quality import thresholds
from coatgui.records import Settings
from coatgui.shipped import resource

DATA = tomllib.loads(resource("checks.toml").read_text(encoding="utf-8"))


@pytest.mark.parametrize("name", sorted(DATA))
def test_a_threshold_has_a_value_and_a_source_and_can_be_set(name: str) -> None:
    assert set(DATA[name]) == {"value", "source"}
    source = DATA[name]["source"]
    assert source.startswith("Own choice") or "no source" in source or re.search(r"\d{4}", source)
    assert source.endswith(".")
    own = thresholds(Settings(thresholds=((name, 123.0),)))
    assert own[name] == 123.0
    others = thresholds(Settings())
    assert {k: v for k, v in own.items() if k != name} == {
        k: v for k, v in others.items() if k != name
    }


def test_no_threshold_is_idle() -> None:
    """Some names are put together from a word and its ending."""
    rooms = Path(coatgui.__file__).parent
    text = "\n".join(
        path.read_text(encoding="utf-8")
        for room in ("quality", "assessment")
        for path in (rooms / room).glob("*.py")
    )
    put_together = {
        f"{what}{kind}_{end}"
        for what in ("", "fit_")
        for kind in ("wild_point", "step", "drift", "inductance")
        for end in ("sigma", "percent")
    }
    assert {name for name in DATA if f'"{name}"' not in text} <= put_together
