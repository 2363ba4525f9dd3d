"""The numbers by which quantities are drawn, read from `resources/assessment.toml`."""

from __future__ import annotations

import tomllib
from functools import cache
from typing import Any

from coatgui.records import Criterion
from coatgui.shipped import resource


@cache
def table(name: str) -> dict[str, Any]:
    """The TOML file `resources/<name>.toml` as it stands. Do not change what is handed out."""
    return tomllib.loads(resource(f"{name}.toml").read_text(encoding="utf-8"))


@cache
def rule(name: str) -> float:
    """The value of an entry of `resources/assessment.toml`, such as "leads.factor"."""
    group, entry = name.split(".")
    return float(table("assessment")[group][entry]["value"])


def default_criteria() -> tuple[Criterion, ...]:
    """The criteria a campaign is held against when it names none of its own."""
    return tuple(
        Criterion(
            name=str(entry["name"]),
            frequency_hz=float(entry["frequency_hz"]),
            ohm_cm2=float(entry["ohm_cm2"]),
            source=str(entry["source"]),
        )
        for entry in table("criteria")["criterion"]
    )
