"""Settings of the fit, from `resources/fitting.toml`."""

from __future__ import annotations

import tomllib
from functools import cache

from coatgui.shipped import resource


@cache
def _rules() -> dict[str, float]:
    data = tomllib.loads(resource("fitting.toml").read_text(encoding="utf-8"))
    return {name: float(entry["value"]) for name, entry in data.items()}


def rule(name: str) -> float:
    """The value of one setting; its source stands beside it in the file."""
    return _rules()[name]
