"""`assess`: from a campaign to everything that is concluded from it. The one computation behind the
window, the command line, the files and the tests.

In order: the checks of every reading, the points that are used, the circuits (fitted panel by
panel, or taken from the cache), what each reading says by itself, what each panel's readings say
together, the formulations, their comparison.
"""

from __future__ import annotations

from collections.abc import Sequence

from coatgui.assessment.cache import ResultCache, fits_from_bytes, fits_to_bytes, series_key
from coatgui.assessment.cautions import cautions
from coatgui.assessment.ranking import ranking
from coatgui.assessment.readings import draw_readings, reading_assessment, start_reading
from coatgui.assessment.rules import default_criteria
from coatgui.assessment.series import Drawn, draw_series
from coatgui.assessment.summary import (
    campaign_findings,
    formulation_assessment,
    headline,
    panel_assessment,
)
from coatgui.assessment.suspicion import with_suspicions
from coatgui.fitting import fit_spectra
from coatgui.progress import Progress, Spread, one_after_another
from coatgui.quality import check_spectra
from coatgui.records import Assessment, Campaign, Fit

_USUAL_FREQUENCY_HZ = 0.1


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
    watched_hz = (*settings.modulus_frequencies_hz, _USUAL_FREQUENCY_HZ)[0]
    panels = {panel.panel_id: panel for panel in campaign.panels}
    names = {f.formulation_id: f.name for f in campaign.formulations}
    place = {panel.panel_id: i for i, panel in enumerate(campaign.panels)}
    readings = sorted(
        (r for r in campaign.readings if r.panel_id in panels),
        key=lambda r: (place[r.panel_id], r.exposure_h),
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
        start_reading(reading, panels[reading.panel_id], check, settings.temperature_c)
        for reading, check in zip(readings, checks, strict=True)
    ]
    for d, fit in zip(drawn, _fits(drawn, campaign, progress, spread, cache), strict=True):
        d.fit = fit
    by_panel: dict[str, list[Drawn]] = {panel_id: [] for panel_id in panels}
    for d in drawn:  # sorted by exposure time within a panel
        by_panel[d.reading.panel_id].append(d)
    panel_results = []
    for done, panel in enumerate(campaign.panels):
        progress.at("Drawing conclusions", done, len(campaign.panels))
        own = by_panel[panel.panel_id]
        draw_readings(own, campaign, criteria)
        series = draw_series(
            own,
            panel.thickness_um,
            settings.capacitance_frequency_hz,
            watched_hz,
            criteria,
        )
        panel_results.append(panel_assessment(panel, names, series, own))
    in_order = tuple(
        reading_assessment(d, panels[d.reading.panel_id], names, settings.modulus_frequencies_hz)
        for d in drawn
    )
    in_order, panel_results = with_suspicions(campaign, in_order, panel_results)
    formulations = tuple(
        formulation_assessment(f.formulation_id, f.name, campaign, in_order)
        for f in campaign.formulations
        if any(panel.formulation_id == f.formulation_id for panel in campaign.panels)
    )
    by_formulation = {
        f.formulation: [r for r in in_order if r.formulation == f.formulation] for f in formulations
    }
    compared = ranking(
        {name: those for name, those in by_formulation.items() if any(r.counts for r in those)},
        watched_hz,
    )
    progress.at("Drawing conclusions", len(panels), len(panels))
    findings = campaign_findings(campaign)
    return Assessment(
        title=campaign.title,
        readings=in_order,
        panels=tuple(panel_results),
        formulations=formulations,
        ranking=compared.ranks,
        ranking_text=compared.text,
        refused=campaign.refused,
        findings=findings,
        cautions=cautions(),
        headline=headline(in_order, panel_results, findings),
    )


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
