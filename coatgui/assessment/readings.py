"""What one reading says by itself, and the record of it.

A reading the checks reject is not fitted and does not count, unless a person overruled the
rejection and said why. The mask is all points, less those the checks suggest leaving out and the
person did not keep in, less those the person left out.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence

import numpy as np

from coatgui.assessment.amounts import parameters_per_area
from coatgui.assessment.capacitance import (
    film_capacitance,
    hsu_mansfeld_capacitance,
    interface_capacitance,
    small_exponent_finding,
    turning_frequency,
)
from coatgui.assessment.drawn import Drawn
from coatgui.assessment.leads import Leads
from coatgui.assessment.measured_capacitance import measured_capacitance
from coatgui.assessment.modulus import Scatter, moduli
from coatgui.assessment.pores import pore_resistance
from coatgui.assessment.rules import rule
from coatgui.records import (
    Bound,
    Campaign,
    Check,
    Criterion,
    Finding,
    Fit,
    LeftOutPoint,
    Panel,
    Parameter,
    Quantity,
    Reading,
    ReadingAssessment,
    Severity,
    Spectrum,
)

NO_FORMULATION = "Unassigned"


def start_reading(
    reading: Reading, panel: Panel, check: Check, settings_temperature_c: float
) -> Drawn:
    """A reading with its mask: all points, less those the checks suggest and the person did not
    keep in, less those the person left out."""
    used = np.ones(len(reading.spectrum), dtype=np.bool_)
    left_out = _left_out(reading, check)
    used[sorted(left_out)] = False
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
    return Drawn(reading, used, left_out, counts, temperature, panel.area_cm2, findings)


def _left_out(reading: Reading, check: Check) -> dict[int, str]:
    """Places of the points left out, with the reason; the person's decision comes first."""
    kept = set(reading.kept_in)
    out = {place: reason for place, reason in check.suggested if place not in kept}
    out.update(dict(reading.left_out))
    return {place: why for place, why in out.items() if 0 <= place < len(reading.spectrum)}


def draw_readings(
    drawn: Sequence[Drawn], campaign: Campaign, leads: Leads, criteria: Sequence[Criterion]
) -> None:
    """What each reading says by itself."""
    settings = campaign.settings
    wanted = tuple(
        dict.fromkeys((*settings.modulus_frequencies_hz, *(c.frequency_hz for c in criteria)))
    )
    scatters = [Scatter(d.reading.spectrum, d.used, d.fit) for d in drawn]
    at_frequencies = moduli(
        [d.reading.spectrum for d in drawn],
        [d.used for d in drawn],
        [d.fit for d in drawn],
        [d.area_cm2 for d in drawn],
        wanted,
        leads.limit,
        scatters,
    )
    for d, at, scatter in zip(drawn, at_frequencies, scatters, strict=True):
        d.moduli = at
        spectrum = d.reading.spectrum
        d.measured_capacitance, note = measured_capacitance(
            spectrum,
            d.used,
            d.fit,
            settings.capacitance_frequency_hz,
            d.area_cm2,
            leads.parallel,
            scatter,
        )
        if d.fit is not None:
            d.coating_capacitance = film_capacitance(
                d.fit,
                spectrum,
                settings.capacitance_frequency_hz,
                d.area_cm2,
                leads.parallel,
            )
            d.interface_capacitance = interface_capacitance(d.fit, d.area_cm2)
            d.parameters = _parameters(
                d.fit, spectrum, d.area_cm2, leads.parallel, d.interface_capacitance
            )
            d.pore_resistance = pore_resistance(d.fit, spectrum, d.area_cm2, leads.limit)
            d.conducts = (
                d.pore_resistance is not None
                and d.pore_resistance.bound is Bound.TWO_SIDED
                and turning_frequency(d.fit, spectrum) is not None
            )
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


def reading_assessment(
    d: Drawn,
    panel: Panel,
    names: Mapping[str, str],
    modulus_frequencies_hz: Sequence[float],
) -> ReadingAssessment:
    reading = d.reading
    return ReadingAssessment(
        reading_id=reading.reading_id,
        panel_id=panel.panel_id,
        panel=panel.name,
        formulation=names.get(panel.formulation_id, NO_FORMULATION),
        exposure_h=reading.exposure_h,
        file=reading.source.file,
        sha256=reading.source.sha256,
        points_read=len(reading.spectrum),
        points_used=int(d.used.sum()),
        left_out=tuple(
            LeftOutPoint(float(reading.spectrum.frequency_hz[place]), d.left_out[place])
            for place in sorted(d.left_out)
        ),
        findings=tuple(d.findings),
        counts=d.counts,
        modulus=tuple(m for m in d.moduli if m.frequency_hz in modulus_frequencies_hz),
        fit=d.fit,
        parameters=d.parameters,
        coating_capacitance=d.coating_capacitance,
        capacitance_at_high_frequency=d.measured_capacitance,
        pore_resistance=d.pore_resistance,
        water_uptake=d.water_uptake,
        relative_permittivity=d.relative_permittivity,
        film_resistivity=d.film_resistivity,
        breakpoint=d.breakpoint,
        active_area=d.active_area,
    )


def _parameters(
    fit: Fit,
    spectrum: Spectrum,
    area_cm2: float | None,
    open_lead: Spectrum | None,
    interface: Quantity | None,
) -> tuple[Parameter, ...]:
    """The fit's parameters per area, and the capacitances that follow from them by the laws of film
    and interface."""
    parameters = parameters_per_area(fit.parameters, area_cm2)
    layers = {p.symbol: p.layer for p in parameters}
    derived = (
        (
            "C_c",
            "Q_c",
            "capacitance of the film, from Q_c, n_c and R_po",
            hsu_mansfeld_capacitance(fit, spectrum, area_cm2, open_lead),
        ),
        (
            "C_dl",
            "Q_dl",
            "capacitance of the interface, from Q_dl and n_dl",
            interface,
        ),
    )
    return parameters + tuple(
        Parameter(symbol, meaning, layers[origin], quantity)
        for symbol, origin, meaning, quantity in derived
        if quantity is not None and symbol not in layers and origin in layers
    )
