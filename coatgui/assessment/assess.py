"""`assess`: from a campaign to everything that is concluded from it. The one computation behind the
window, the command line, the files and the tests.

In order: the checks of every reading, the points that are used, the circuits (fitted panel by
panel, or taken from the cache), what each reading says by itself, what each panel's readings say
together, the formulations, their comparison.
"""

from __future__ import annotations

import gc
import math
import threading
from collections.abc import Iterator, Mapping, Sequence
from contextlib import contextmanager

import numpy as np

from coatgui.assessment.cache import ResultCache, fits_from_bytes, fits_to_bytes, series_key
from coatgui.assessment.cautions import cautions
from coatgui.assessment.courses import inspections
from coatgui.assessment.decide import by_formulation, decide
from coatgui.assessment.drawn import Drawn
from coatgui.assessment.events import replicate_noise
from coatgui.assessment.film import film_facts
from coatgui.assessment.leads import leads_of, put_back, take_away
from coatgui.assessment.own_models import known_pins, own_models
from coatgui.assessment.planning import next_inspection
from coatgui.assessment.readings import draw_readings, reading_assessment, start_reading
from coatgui.assessment.repeats import deviations
from coatgui.assessment.rules import default_criteria
from coatgui.assessment.series import draw_series
from coatgui.assessment.summary import (
    campaign_findings,
    formulation_assessment,
    headline,
    panel_assessment,
)
from coatgui.assessment.suspicion import with_suspicions
from coatgui.fitting import fit_spectra
from coatgui.progress import Progress, Spread, one_after_another
from coatgui.quality import check_spectra, circuit_residuals
from coatgui.records import Assessment, Campaign, Fit

_USUAL_FREQUENCY_HZ = 0.1
_CHANGED_MEANWHILE = frozenset({"step", "drift", "departure", "repeat_differs"})
_AT_ONCE = 1000  # readings drawn as one array, between two reports of progress


def assess(
    campaign: Campaign,
    *,
    progress: Progress | None = None,
    spread: Spread = one_after_another,
    cache: ResultCache | None = None,
) -> Assessment:
    """All that is concluded from a campaign, and the answers to what its settings ask.

    Raises Cancelled at a step of `progress` where the result is no longer wanted; nothing is kept
    then. With a `cache`, fits of panels in which nothing changed are taken from it.
    """
    progress = progress or Progress()
    settings = campaign.settings
    panels = {panel.panel_id: panel for panel in campaign.panels}
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
        input_resistance_ohm=settings.input_resistance_ohm,
        input_capacitance_f=settings.input_capacitance_f,
        progress=progress,
    )
    drawn = [
        start_reading(reading, panels[reading.panel_id], check, settings.temperature_c)
        for reading, check in zip(readings, checks, strict=True)
    ]
    take_away(drawn, leads_of(campaign))
    for d, fit in zip(drawn, _fits(drawn, campaign, progress, spread, cache), strict=True):
        d.fit = fit
    _look_at_residuals(drawn, campaign)
    return conclude(campaign, drawn, progress)


class _Collection:
    """Whether the interpreter searches for unreachable cycles; `off` may be entered by several
    threads at once."""

    def __init__(self) -> None:
        self._lock = threading.Lock()
        self._inside = 0
        self._was_on = False

    @contextmanager
    def off(self) -> Iterator[None]:
        with self._lock:
            if self._inside == 0:
                self._was_on = gc.isenabled()
                gc.disable()
            self._inside += 1
        try:
            yield
        finally:
            with self._lock:
                self._inside -= 1
                if self._inside == 0 and self._was_on:
                    gc.enable()


# The conclusions are some hundred thousand small records that all stay and form no cycles, and
# each search goes through all of them and the spectra again: that took a third of the time. Cycles
# that other threads make meanwhile wait for a second or two; what is in no cycle goes at once, as
# always.
_collection = _Collection()


@_collection.off()
def conclude(campaign: Campaign, drawn: Sequence[Drawn], progress: Progress) -> Assessment:
    """The conclusions from readings that are checked and fitted, sorted by panel in the campaign's
    order and exposure time."""
    settings = campaign.settings
    criteria = settings.criteria or default_criteria()
    watched_hz = (*settings.modulus_frequencies_hz, _USUAL_FREQUENCY_HZ)[0]
    panels = {panel.panel_id: panel for panel in campaign.panels}
    names = {f.formulation_id: f.name for f in campaign.formulations}
    leads = leads_of(campaign)
    by_panel: dict[str, list[Drawn]] = {panel_id: [] for panel_id in panels}
    for d in drawn:
        by_panel[d.reading.panel_id].append(d)
    for start in range(0, len(drawn), _AT_ONCE):
        progress.at("Drawing conclusions", start, len(drawn))
        draw_readings(drawn[start : start + _AT_ONCE], campaign, leads, criteria)
    noise = _noise(campaign, by_panel, watched_hz)
    panel_results = []
    for panel in campaign.panels:
        series = draw_series(
            by_panel[panel.panel_id],
            panel,
            film_facts(panel),
            settings,
            watched_hz,
            criteria,
            noise.get(panel.formulation_id),
        )
        panel_results.append(panel_assessment(panel, names, series, by_panel[panel.panel_id]))
    for d in drawn:
        if d.fit is not None:
            d.fit = put_back(d.fit, d.reading.spectrum.frequency_hz, leads)
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
    counting = by_formulation([f.formulation for f in formulations], in_order)
    decided = decide(campaign, counting, watched_hz, criteria, panel_results)
    progress.at("Drawing conclusions", len(drawn), len(drawn))
    findings = (*campaign_findings(campaign), *own_models(campaign)[1], *decided.findings)
    return Assessment(
        title=campaign.title,
        readings=in_order,
        panels=decided.panels,
        formulations=formulations,
        ranking=decided.comparison.ranks,
        ranking_text=decided.comparison.text,
        refused=campaign.refused,
        findings=findings,
        cautions=cautions(),
        headline=headline(in_order, panel_results, findings),
        limit_studies=decided.limit_studies,
        trends=decided.trends,
        comparison=decided.comparison,
        further_comparisons=decided.further_comparisons,
        projections=decided.projections,
        ratings=decided.ratings,
        rating_correlations=decided.rating_correlations,
        next_inspection=next_inspection(panel_results, in_order, criteria),
    )


def _look_at_residuals(drawn: Sequence[Drawn], campaign: Campaign) -> None:
    """A doubt for readings whose circuit leaves a step or a drift over, where the checks named
    neither."""
    fitted = [(d, d.fit) for d in drawn if d.fit is not None]
    doubts = circuit_residuals(
        [d.reading.spectrum for d, _ in fitted],
        [fit for _, fit in fitted],
        settings=campaign.settings,
        own_models=own_models(campaign)[0],
    )
    for (d, _), doubt in zip(fitted, doubts, strict=True):
        if doubt is not None and not any(f.code in _CHANGED_MEANWHILE for f in d.findings):
            d.findings.append(doubt)


def _noise(
    campaign: Campaign, by_panel: Mapping[str, Sequence[Drawn]], frequency_hz: float
) -> dict[str, float | None]:
    """The replicates' scatter of log₁₀|Z| for each formulation id."""
    found = {}
    for formulation_id in {panel.formulation_id for panel in campaign.panels}:
        own = [
            [d for d in by_panel[panel.panel_id] if d.counts]
            for panel in campaign.panels
            if panel.formulation_id == formulation_id
        ]
        groups = inspections([d.reading.exposure_h for series in own for d in series])
        column = {time: i for i, group in enumerate(groups) for time in group}
        table = np.full((len(own), len(groups)), np.nan)
        for row, series in enumerate(own):
            for d in series:
                at = d.modulus_at(frequency_hz)
                if at is not None and at.quantity is not None and at.quantity.value:
                    table[row, column[d.reading.exposure_h]] = math.log10(at.quantity.value)
        found[formulation_id] = replicate_noise(table)
    return found


def _fits(
    drawn: Sequence[Drawn],
    campaign: Campaign,
    progress: Progress,
    spread: Spread,
    cache: ResultCache | None,
) -> list[Fit | None]:
    """Fits of the readings that count, in the order of `drawn`; None for the others."""
    scatter = deviations(drawn)
    models, _ = own_models(campaign)
    pins = known_pins(drawn, models)
    limit = leads_of(campaign).limit
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
            [pins[i] for i in places],
            limit,
            [scatter[i] for i in places],
            campaign.settings.own_models,
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
        pinned=[pins[i] for i in places],
        open_lead=limit,
        deviation=[scatter[i] for i in places],
        own_models=models,
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
