"""`assess`: from a campaign to everything that is concluded from it. The one computation behind the
window, the command line, the files and the tests.

In order: the checks of every reading, the points that are used, the circuits (fitted panel by
panel, or taken from the cache), what each reading says by itself, what each panel's readings say
together, the formulations, their comparison.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import replace

import numpy as np

from coatgui.assessment.amounts import parameters_per_area
from coatgui.assessment.cache import ResultCache, fits_from_bytes, fits_to_bytes, series_key
from coatgui.assessment.capacitance import (
    interface_capacitance,
    measured_capacitance,
    small_exponent_finding,
)
from coatgui.assessment.cautions import cautions
from coatgui.assessment.courses import courses, inspections
from coatgui.assessment.modulus import moduli
from coatgui.assessment.pores import pore_resistance
from coatgui.assessment.ranking import ranking
from coatgui.assessment.rules import default_criteria, rule
from coatgui.assessment.series import Drawn, SeriesResult, draw_series
from coatgui.assessment.words import counted, hours, power_of_ten
from coatgui.fitting import fit_spectra
from coatgui.progress import Progress, Spread, one_after_another
from coatgui.quality import check_spectra
from coatgui.records import (
    Assessment,
    BoolArray,
    Campaign,
    Check,
    Criterion,
    Finding,
    Fit,
    FormulationAssessment,
    LeftOutPoint,
    Panel,
    PanelAssessment,
    Parameter,
    Quantity,
    Reading,
    ReadingAssessment,
    Severity,
)

_NO_FORMULATION = "Unassigned"


def assess(
    campaign: Campaign,
    *,
    progress: Progress | None = None,
    spread: Spread = one_after_another,
    cache: ResultCache | None = None,
) -> Assessment:
    """All that is concluded from a campaign.

    Raises Cancelled at a step of `progress` where the result is no longer wanted; nothing is kept
    then. With a `cache`, fits of panels in which nothing changed are taken from it.
    """
    progress = progress or Progress()
    settings = campaign.settings
    criteria = settings.criteria or default_criteria()
    panels = {panel.panel_id: panel for panel in campaign.panels}
    names = {f.formulation_id: f.name for f in campaign.formulations}
    readings = sorted(
        (r for r in campaign.readings if r.panel_id in panels),
        key=lambda r: (r.panel_id, r.exposure_h),
    )
    areas = [panels[r.panel_id].area_cm2 for r in readings]

    progress.at("Checking readings", 0, len(readings))
    checks = check_spectra(
        [r.spectrum for r in readings],
        settings=settings,
        area_cm2=areas,
        open_lead=campaign.open_lead,
        progress=progress,
    )
    drawn = [
        _start(reading, panels[reading.panel_id], check, settings.temperature_c)
        for reading, check in zip(readings, checks, strict=True)
    ]
    for d, fit in zip(drawn, _fits(drawn, campaign, progress, spread, cache), strict=True):
        d.fit = fit
    progress.at("Drawing conclusions", 0, 1)
    _draw_readings(drawn, campaign, criteria)
    series = _draw_panels(drawn, campaign, criteria)
    assessed = {
        d.reading.reading_id: _reading_assessment(
            d,
            check,
            panels[d.reading.panel_id],
            names,
            settings.modulus_frequencies_hz,
        )
        for d, check in zip(drawn, checks, strict=True)
    }
    in_order = tuple(
        assessed[r.reading_id] for r in campaign.readings if r.reading_id in assessed
    )
    panel_results = tuple(
        _panel_assessment(panel, names, series.get(panel.panel_id), drawn)
        for panel in campaign.panels
    )
    formulations = tuple(
        _formulation_assessment(f.formulation_id, f.name, campaign, in_order)
        for f in campaign.formulations
        if any(panel.formulation_id == f.formulation_id for panel in campaign.panels)
    )
    by_formulation = {
        f.formulation: [r for r in in_order if r.formulation == f.formulation]
        for f in formulations
    }
    compared = ranking(
        {name: those for name, those in by_formulation.items() if any(r.counts for r in those)},
        settings.modulus_frequencies_hz[0] if settings.modulus_frequencies_hz else 0.1,
    )
    progress.at("Drawing conclusions", 1, 1)
    findings = _campaign_findings(campaign)
    return Assessment(
        title=campaign.title,
        readings=in_order,
        panels=panel_results,
        formulations=formulations,
        ranking=compared.ranks,
        ranking_text=compared.text,
        refused=campaign.refused,
        findings=findings,
        cautions=cautions(),
        headline=_headline(in_order, panel_results, findings),
    )


# ---------------------------------------------------------------------------------------------
# Readings


def _start(reading: Reading, panel: Panel, check: Check, settings_temperature_c: float) -> Drawn:
    """A reading with its mask: all points, less those the checks suggest and the person did not
    keep in, less those the person left out."""
    used = np.ones(len(reading.spectrum), dtype=np.bool_)
    used[sorted(_left_out(reading, check))] = False
    findings = list(check.findings)
    counts = True
    if check.rejected:
        counts = bool(reading.overruled_because)
        findings.append(
            Finding(
                "rejection_overruled",
                Severity.DOUBT,
                "The checks reject this reading; it is used all the same, because: "
                f"{reading.overruled_because}",
            )
            if counts
            else Finding(
                "not_counted",
                Severity.NOTE,
                "Because the checks reject this reading, no circuit is fitted to it and it is kept "
                "out of trends and comparisons. It can be used by overruling the rejection with a "
                "reason.",
            )
        )
    if panel.area_cm2 is None:
        findings.append(
            Finding(
                "no_area",
                Severity.NOTE,
                f"Panel {panel.name} has no area, so values are per specimen.",
            )
        )
    temperature = next(
        (t for t in (reading.temperature_c, panel.temperature_c) if t is not None),
        settings_temperature_c,
    )
    return Drawn(reading, used, counts, temperature, panel.area_cm2, findings)


def _left_out(reading: Reading, check: Check) -> dict[int, str]:
    """Places of the points left out, with the reason; the person's decision comes first."""
    kept = set(reading.kept_in)
    out = {place: reason for place, reason in check.suggested if place not in kept}
    out.update(dict(reading.left_out))
    return {place: why for place, why in out.items() if 0 <= place < len(reading.spectrum)}


def _fits(
    drawn: Sequence[Drawn],
    campaign: Campaign,
    progress: Progress,
    spread: Spread,
    cache: ResultCache | None,
) -> list[Fit | None]:
    """Fits of the readings that count, in the order of `drawn`; None for the others."""
    by_panel: dict[str, list[int]] = {}
    for place, d in enumerate(drawn):
        if d.counts:
            by_panel.setdefault(d.reading.panel_id, []).append(place)
    keys = {
        panel_id: series_key(
            [drawn[i].reading.spectrum for i in places],
            [drawn[i].used for i in places],
            drawn[places[0]].area_cm2,
            [drawn[i].reading.exposure_h for i in places],
            [drawn[i].reading.pinned_model for i in places],
            campaign.open_lead,
        )
        for panel_id, places in by_panel.items()
    }
    fits: list[Fit | None] = [None] * len(drawn)
    kept = cache.cached_results(list(keys.values())) if cache is not None else {}
    missing: list[str] = []
    for panel_id, places in by_panel.items():
        content = kept.get(keys[panel_id])
        known = None if content is None else fits_from_bytes(content, len(places))
        if known is None:
            missing.append(panel_id)
            continue
        for place, fit in zip(places, known, strict=True):
            fits[place] = fit
    places = [place for panel_id in missing for place in by_panel[panel_id]]
    if not places:
        return fits
    progress.at("Fitting circuits", 0, len(places))
    fresh = fit_spectra(
        [drawn[i].reading.spectrum for i in places],
        [drawn[i].used for i in places],
        area_cm2=[drawn[i].area_cm2 for i in places],
        series=[drawn[i].reading.panel_id for i in places],
        exposure_h=[drawn[i].reading.exposure_h for i in places],
        pinned=[drawn[i].reading.pinned_model for i in places],
        open_lead=campaign.open_lead,
        progress=progress,
        spread=spread,
    )
    for place, fit in zip(places, fresh, strict=True):
        fits[place] = fit
    if cache is not None:
        cache.keep_results(
            {
                keys[panel_id]: fits_to_bytes([fits[i] for i in by_panel[panel_id]])
                for panel_id in missing
            }
        )
    return fits


def _draw_readings(
    drawn: Sequence[Drawn], campaign: Campaign, criteria: Sequence[Criterion]
) -> None:
    """What each reading says by itself."""
    settings = campaign.settings
    wanted = tuple(
        dict.fromkeys((*settings.modulus_frequencies_hz, *(c.frequency_hz for c in criteria)))
    )
    at_frequencies = moduli(
        [d.reading.spectrum for d in drawn],
        [d.used for d in drawn],
        [d.fit for d in drawn],
        [d.area_cm2 for d in drawn],
        wanted,
        campaign.open_lead,
    )
    for d, at in zip(drawn, at_frequencies, strict=True):
        d.moduli = at
        spectrum = d.reading.spectrum
        d.measured_capacitance, note = measured_capacitance(
            spectrum,
            d.used,
            d.fit,
            settings.capacitance_frequency_hz,
            d.area_cm2,
            campaign.open_lead,
        )
        if d.fit is not None:
            d.pore_resistance = pore_resistance(d.fit, spectrum, d.area_cm2, campaign.open_lead)
            d.findings.extend(
                f for f in (note, small_exponent_finding(d.fit), *_fit_findings(d.fit)) if f
            )
        elif d.counts:
            d.findings.append(
                Finding(
                    "no_fit",
                    Severity.DOUBT,
                    "No circuit could be laid on this reading: too few points are left.",
                )
            )


def _fit_findings(fit: Fit) -> list[Finding]:
    found = []
    if not fit.converged:
        found.append(Finding("fit_not_converged", Severity.DOUBT, fit.message))
    if fit.residual_rms_percent > rule("fit.poor_percent"):
        found.append(
            Finding(
                "fit_poor",
                Severity.DOUBT,
                f"The circuit “{fit.model_name}” misses the points by "
                f"{fit.residual_rms_percent:.1f} percent on average: it does not describe this "
                "reading, and its parameters are to be taken with care.",
                evidence=(("residual_rms_percent", fit.residual_rms_percent),),
            )
        )
    return found


def _reading_assessment(
    d: Drawn,
    check: Check,
    panel: Panel,
    names: Mapping[str, str],
    modulus_frequencies_hz: Sequence[float],
) -> ReadingAssessment:
    reading = d.reading
    left_out = _left_out(reading, check)
    return ReadingAssessment(
        reading_id=reading.reading_id,
        panel_id=panel.panel_id,
        panel=panel.name,
        formulation=names.get(panel.formulation_id, _NO_FORMULATION),
        exposure_h=reading.exposure_h,
        file=reading.source.file,
        sha256=reading.source.sha256,
        points_read=len(reading.spectrum),
        points_used=int(d.used.sum()),
        left_out=tuple(
            LeftOutPoint(float(reading.spectrum.frequency_hz[place]), left_out[place])
            for place in sorted(left_out)
        ),
        findings=tuple(d.findings),
        counts=d.counts,
        modulus=tuple(m for m in d.moduli if m.frequency_hz in modulus_frequencies_hz),
        fit=d.fit,
        parameters=_parameters(d.fit, d.area_cm2),
        coating_capacitance=d.coating_capacitance,
        capacitance_at_high_frequency=d.measured_capacitance,
        pore_resistance=d.pore_resistance,
        water_uptake=d.water_uptake,
    )


def _parameters(fit: Fit | None, area_cm2: float | None) -> tuple[Parameter, ...]:
    """The fit's parameters per area, and the interface's capacitance that follows from them."""
    if fit is None:
        return ()
    parameters = parameters_per_area(fit.parameters, area_cm2)
    interface = interface_capacitance(fit, area_cm2)
    if interface is None or any(p.symbol == "C_dl" for p in parameters):
        return parameters
    layer = next(p.layer for p in parameters if p.symbol == "Q_dl")
    meaning = "capacitance of the interface, from Q_dl and n_dl"
    return (*parameters, Parameter("C_dl", meaning, layer, interface))


# ---------------------------------------------------------------------------------------------
# Panels, formulations, the whole


def _draw_panels(
    drawn: Sequence[Drawn], campaign: Campaign, criteria: Sequence[Criterion]
) -> dict[str, SeriesResult]:
    settings = campaign.settings
    thickness = {panel.panel_id: panel.thickness_um for panel in campaign.panels}
    by_panel: dict[str, list[Drawn]] = {}
    for d in drawn:  # sorted by exposure time within a panel
        by_panel.setdefault(d.reading.panel_id, []).append(d)
    lowest = settings.modulus_frequencies_hz[0] if settings.modulus_frequencies_hz else 0.1
    return {
        panel_id: draw_series(
            series, thickness[panel_id], settings.capacitance_frequency_hz, lowest, criteria
        )
        for panel_id, series in by_panel.items()
    }


def _panel_assessment(
    panel: Panel,
    names: Mapping[str, str],
    series: SeriesResult | None,
    drawn: Sequence[Drawn],
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
    own = [d for d in drawn if d.reading.panel_id == panel.panel_id]
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
    result = PanelAssessment(
        panel.panel_id,
        panel.name,
        names.get(panel.formulation_id, _NO_FORMULATION),
        panel.area_cm2,
        panel.thickness_um,
        None,
        None,
        tuple(findings),
    )
    if series is None:
        return result
    return replace(
        result,
        dry_capacitance=series.dry_capacitance,
        diffusion_coefficient=series.diffusion_coefficient,
        findings=tuple(findings) + series.findings,
        events=series.events,
        limit_crossings=series.limit_crossings,
    )


def _formulation_assessment(
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
    return FormulationAssessment(formulation_id, name, len(panel_ids), found, text + ".")


def _shown(quantity: Quantity) -> str:
    sign = {"at_least": "≥ ", "at_most": "≤ "}.get(quantity.bound, "")
    return f"{sign}{power_of_ten(quantity.value or 0.0)} {quantity.unit}"


def _campaign_findings(campaign: Campaign) -> tuple[Finding, ...]:
    found = []
    if campaign.readings and campaign.open_lead is None:
        found.append(
            Finding(
                "no_open_lead",
                Severity.NOTE,
                "There is no open-lead run, so how high the measuring set-up can see is not known: "
                "a very high |Z| may be that of the leads.",
            )
        )
    if not campaign.settings.criteria and campaign.readings:
        found.append(
            Finding(
                "default_criterion",
                Severity.NOTE,
                "The campaign names no limits of its own, so the usual ones are used: "
                + "; ".join(
                    f"{power_of_ten(c.ohm_cm2)} Ω cm² at {c.frequency_hz:g} Hz"
                    for c in default_criteria()
                )
                + ". No standard fixes them.",
            )
        )
    return tuple(found)


def _headline(
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
        limit = f"{power_of_ten(criterion.ohm_cm2)} Ω cm² at {criterion.frequency_hz:g} Hz"
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


def used_points(reading: Reading, check: Check) -> BoolArray:
    """Which points of a reading are used, (N,), as `assess` takes them."""
    used = np.ones(len(reading.spectrum), dtype=np.bool_)
    used[sorted(_left_out(reading, check))] = False
    return used
