"""Panels, formulations and the campaign in records and in sentences."""

from __future__ import annotations

from collections.abc import Mapping, Sequence

from coatgui.assessment.courses import courses, inspections
from coatgui.assessment.drawn import Drawn
from coatgui.assessment.leads import leads_of
from coatgui.assessment.readings import NO_FORMULATION
from coatgui.assessment.rules import default_criteria
from coatgui.assessment.series import SeriesResult
from coatgui.assessment.words import counted, hertz, hours, power_of_ten
from coatgui.records import (
    Bound,
    Campaign,
    Finding,
    FormulationAssessment,
    Panel,
    PanelAssessment,
    Quantity,
    ReadingAssessment,
    Severity,
)


def panel_assessment(
    panel: Panel,
    names: Mapping[str, str],
    series: SeriesResult,
    own: Sequence[Drawn],
) -> PanelAssessment:
    findings: list[Finding] = []
    if panel.area_cm2 is None:
        findings.append(
            Finding(
                "no_area",
                Severity.NOTE,
                "The panel has no area: its values are per specimen, and it is held against no "
                "limit. Enter its area to compare it.",
            )
        )
    if panel.thickness_um is None:
        findings.append(
            Finding(
                "no_thickness",
                Severity.NOTE,
                "The film's thickness is not known, so no diffusion coefficient is given.",
            )
        )
    if panel.temperature_c is None and any(d.reading.temperature_c is None for d in own):
        assumed = next(d.temperature_c for d in own if d.reading.temperature_c is None)
        findings.append(
            Finding(
                "temperature_assumed",
                Severity.NOTE,
                f"The temperature is not recorded for every reading; where it is missing, the "
                f"campaign's {assumed:g} °C is used for the permittivity of water.",
                evidence=(("temperature_c", assumed),),
            )
        )
    if not own:
        findings.append(Finding("no_readings", Severity.NOTE, "The panel has no readings yet."))
    return PanelAssessment(
        panel_id=panel.panel_id,
        panel=panel.name,
        formulation=names.get(panel.formulation_id, NO_FORMULATION),
        area_cm2=panel.area_cm2,
        thickness_um=panel.thickness_um,
        dry_capacitance=series.dry_capacitance,
        diffusion_coefficient=series.diffusion_coefficient,
        dry_permittivity=series.dry_permittivity,
        saturation_uptake=series.saturation_uptake,
        saturation_mass_percent=series.saturation_mass_percent,
        findings=(*findings, *series.findings),
        events=series.events,
        limit_crossings=series.limit_crossings,
    )


def formulation_assessment(
    formulation_id: str,
    name: str,
    campaign: Campaign,
    readings: Sequence[ReadingAssessment],
) -> FormulationAssessment:
    panel_ids = {p.panel_id for p in campaign.panels if p.formulation_id == formulation_id}
    found = courses(
        [r for r in readings if r.panel_id in panel_ids],
        campaign.settings.modulus_frequencies_hz,
    )
    text = counted(len(panel_ids), "panel")
    if found and found[0].code.startswith("modulus_"):
        last = found[0].points[-1]
        text += f"; {found[0].name} at {hours(last.exposure_h)}: {_shown(last.quantity)}"
        if last.censored:
            text += f", {last.censored} of {last.panels} only bounds"
        if last.doubtful:
            text += f", {last.doubtful} of {last.panels} from readings under doubt"
            if last.sound is not None:
                text += f" (without them {_shown(last.sound)})"
    return FormulationAssessment(formulation_id, name, len(panel_ids), found, text + ".")


def _shown(quantity: Quantity) -> str:
    sign = {Bound.AT_LEAST: "≥ ", Bound.AT_MOST: "≤ "}.get(quantity.bound, "")
    return f"{sign}{power_of_ten(quantity.value or 0.0)} {quantity.unit}"


def campaign_findings(campaign: Campaign) -> tuple[Finding, ...]:
    found = []
    if campaign.readings and leads_of(campaign).measured is None:
        found.append(
            Finding(
                "no_open_lead",
                Severity.NOTE,
                "There is no open-lead run, nor a statement of the instrument's input, so how high "
                "the measuring set-up can see is not known: a very high |Z| may be that of the "
                "leads.",
            )
        )
    if not campaign.settings.criteria and campaign.readings:
        found.append(
            Finding(
                "default_criterion",
                Severity.NOTE,
                "The campaign names no limits of its own, so the usual ones are used: "
                + "; ".join(
                    f"{power_of_ten(c.ohm_cm2)} Ω cm² at {hertz(c.frequency_hz)}"
                    for c in default_criteria()
                )
                + ". No standard fixes them.",
            )
        )
    return tuple(found)


def headline(
    readings: Sequence[ReadingAssessment],
    panels: Sequence[PanelAssessment],
    findings: Sequence[Finding],
) -> str:
    """The campaign in one sentence."""
    parts = [
        f"{counted(len(panels), 'panel')}, "
        f"{counted(len(inspections([r.exposure_h for r in readings])), 'inspection')}"
    ]
    criteria = dict.fromkeys(c.criterion for panel in panels for c in panel.limit_crossings)
    for criterion in criteria:
        fallen = sum(
            c.by_h is not None
            for panel in panels
            for c in panel.limit_crossings
            if c.criterion == criterion
        )
        limit = f"{power_of_ten(criterion.ohm_cm2)} Ω cm² at {hertz(criterion.frequency_hz)}"
        parts.append(f"{counted(fallen, 'panel') if fallen else 'none'} fell below {limit}")
    rejected = sum(not r.counts for r in readings)
    if rejected:
        parts.append(f"{counted(rejected, 'reading')} rejected")
    everything = [
        *findings,
        *(f for panel in panels for f in panel.findings),
        *(f for reading in readings if reading.counts for f in reading.findings),
    ]
    doubts = sum(f.severity is Severity.DOUBT for f in everything)
    parts.append(counted(doubts, "doubt") if doubts else "no doubts")
    return "; ".join(parts) + "."
