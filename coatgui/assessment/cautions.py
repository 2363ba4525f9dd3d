"""The cautions that go with every assessment, read from `resources/cautions.toml`."""

from __future__ import annotations

from coatgui.assessment.rules import table


def cautions() -> tuple[str, ...]:
    """The cautions in the order in which they are printed, each a paragraph in plain words."""
    return tuple(str(entry["text"]) for entry in table("cautions")["caution"])


def caution_sources() -> tuple[str, ...]:
    """Where each of `cautions()` comes from, in the same order."""
    return tuple(str(entry["source"]) for entry in table("cautions")["caution"])
