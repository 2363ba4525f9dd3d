"""Exposure regimes and electrolytes as presets, from `resources/` and from a campaign's settings. A
panel keeps its own text and temperature; a preset only fills them in."""

from __future__ import annotations

import re
from functools import cache
from typing import Any

from coatgui.assessment.rules import table
from coatgui.records import Electrolyte, Regime, Settings


def electrolytes(settings: Settings) -> tuple[Electrolyte, ...]:
    """The program's electrolytes, each replaced by the campaign's of the same id, and then the
    campaign's further ones."""
    own = {e.electrolyte_id: e for e in settings.electrolytes}
    known = _shipped_electrolytes()
    further = own.keys() - {e.electrolyte_id for e in known}
    return (
        *(own.get(e.electrolyte_id, e) for e in known),
        *(e for e in settings.electrolytes if e.electrolyte_id in further),
    )


def regimes(settings: Settings) -> tuple[Regime, ...]:
    """The exposure regimes, as `electrolytes` gives electrolytes."""
    own = {r.regime_id: r for r in settings.regimes}
    known = _shipped_regimes()
    further = own.keys() - {r.regime_id for r in known}
    return (
        *(own.get(r.regime_id, r) for r in known),
        *(r for r in settings.regimes if r.regime_id in further),
    )


def filled_in(regime: Regime, settings: Settings) -> dict[str, Any]:
    """The fields of a `Panel` that a regime fills in; what it says nothing of is left away. An
    electrolyte that is not known by its id is taken for a text of its own."""
    fields: dict[str, Any] = {"regime": regime.name}
    if regime.electrolyte_id:
        names = {e.electrolyte_id: e.name for e in electrolytes(settings)}
        fields["electrolyte"] = names.get(regime.electrolyte_id, regime.electrolyte_id)
    if regime.temperature_c is not None:
        fields["temperature_c"] = regime.temperature_c
    return fields


@cache
def recognised(text: str, own: tuple[Electrolyte, ...] = ()) -> Electrolyte | None:
    """The electrolyte that a panel's text means: the one of this name or id, else the first of
    which the text holds the words. A campaign's own come first."""
    known = electrolytes(Settings(electrolytes=own))
    ordered = (*own, *(e for e in known if e not in own))
    wanted = text.strip().casefold()
    for electrolyte in ordered:
        if wanted in (electrolyte.name.casefold(), electrolyte.electrolyte_id.casefold()):
            return electrolyte
    words = _words(text)
    for electrolyte in ordered:
        if any(words.issuperset(_words(" ".join(needed))) for needed in electrolyte.known_by):
            return electrolyte
    return None


def _words(text: str) -> set[str]:
    return set(re.findall(r"[0-9.]+|[^\W\d_]+", text.casefold().replace(",", ".")))


@cache
def _shipped_electrolytes() -> tuple[Electrolyte, ...]:
    return tuple(
        Electrolyte(
            e["id"],
            e["name"],
            e.get("resistivity_ohm_cm"),
            e["source"],
            tuple(tuple(words) for words in e["known_by"]),
        )
        for e in table("electrolytes")["electrolyte"]
    )


@cache
def _shipped_regimes() -> tuple[Regime, ...]:
    return tuple(
        Regime(
            r["id"],
            r["name"],
            r["conditions"],
            r.get("electrolyte", ""),
            r.get("temperature_c"),
            r.get("cycle_h"),
            (r["duration_h"][0], r["duration_h"][1]) if "duration_h" in r else None,
            r["source"],
        )
        for r in table("regimes")["regime"]
    )
