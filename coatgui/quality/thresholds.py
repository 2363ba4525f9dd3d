"""Thresholds of the checks: `resources/checks.toml`, overridden by a campaign's settings."""

from __future__ import annotations

import tomllib
from functools import cache

from coatgui.records import Settings
from coatgui.shipped import resource


@cache
def shipped_thresholds() -> dict[str, float]:
    data = tomllib.loads(resource("checks.toml").read_text(encoding="utf-8"))
    return {name: float(entry["value"]) for name, entry in data.items()}


def thresholds(settings: Settings) -> dict[str, float]:
    """Every threshold by name."""
    return {**shipped_thresholds(), **dict(settings.thresholds)}
