"""Records of a campaign by their ids. Each raises OperationRefused where there is none."""

from __future__ import annotations

from coatgui.campaign.errors import OperationRefused
from coatgui.records import Campaign, Formulation, Panel, Photograph, Rating, Reading


def formulation_of(campaign: Campaign, formulation_id: str) -> Formulation:
    for formulation in campaign.formulations:
        if formulation.formulation_id == formulation_id:
            return formulation
    raise _missing("formulation")


def panel_of(campaign: Campaign, panel_id: str) -> Panel:
    for panel in campaign.panels:
        if panel.panel_id == panel_id:
            return panel
    raise _missing("panel")


def reading_of(campaign: Campaign, reading_id: str) -> Reading:
    reading = campaign.reading(reading_id)
    if reading is None:
        raise _missing("reading")
    return reading


def rating_of(campaign: Campaign, rating_id: str) -> Rating:
    for rating in campaign.ratings:
        if rating.rating_id == rating_id:
            return rating
    raise _missing("rating")


def photograph_of(campaign: Campaign, photograph_id: str) -> Photograph:
    for photograph in campaign.photographs:
        if photograph.photograph_id == photograph_id:
            return photograph
    raise _missing("photograph")


def _missing(what: str) -> OperationRefused:
    return OperationRefused(f"This {what} is not in the campaign (any more).")
