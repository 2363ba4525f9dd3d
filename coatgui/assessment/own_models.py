"""Coating models of a person's own, kept in the campaign's settings."""

from __future__ import annotations

import json
from collections.abc import Sequence

from coatgui.assessment.drawn import Drawn
from coatgui.circuits import (
    CoatingModel,
    ModelError,
    catalogue,
    model_from_data,
    tied_by_the_circuit,
)
from coatgui.records import Campaign, Finding, Severity


def own_model(text: str) -> CoatingModel:
    """The model that a JSON text describes, in the form of a table of `resources/models.toml`.

    Raises ModelError where it makes no circuit, takes a catalogue model's id, or has parameters
    that no spectrum could tell apart.
    """
    try:
        data = json.loads(text)
    except ValueError as error:
        raise ModelError(f"A coating model must be a JSON object: {error}.") from error
    if not isinstance(data, dict):
        raise ModelError("A coating model must be a JSON object with an id, a name and its layers.")
    model = model_from_data(data)
    if model.model_id in catalogue():
        raise ModelError(
            f"There is a coating model '{model.model_id}' in the catalogue: choose another id."
        )
    tied = tied_by_the_circuit(model)
    if tied:
        raise ModelError(
            f"Coating model '{model.model_id}': no spectrum could tell {' and '.join(tied)} apart; "
            "leave one away, fix it, or tie them."
        )
    return model


def own_models(campaign: Campaign) -> tuple[list[CoatingModel], tuple[Finding, ...]]:
    """The campaign's own models, and a finding on each that cannot be used."""
    models, findings = [], []
    for text in campaign.settings.own_models:
        try:
            models.append(own_model(text))
        except ModelError as error:
            findings.append(Finding("own_model_unusable", Severity.DOUBT, str(error)))
    return models, tuple(findings)


def known_pins(drawn: Sequence[Drawn], models: Sequence[CoatingModel]) -> list[str]:
    """The pinned model of each reading; none, with a finding, where there is no such model."""
    known = {*catalogue(), *(model.model_id for model in models)}
    pins = []
    for d in drawn:
        name = d.reading.pinned_model
        if name and name not in known:
            d.findings.append(
                Finding(
                    "pinned_model_missing",
                    Severity.DOUBT,
                    f"The coating model “{name}” that was chosen for this reading is not there any "
                    "more; the program chose one itself.",
                )
            )
            name = ""
        pins.append(name)
    return pins
