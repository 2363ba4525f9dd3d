"""What one reading says by itself, and the record of it.

A reading the checks reject is not fitted and does not count, unless a person overruled the
rejection and said why. The mask is all points, less those the checks suggest leaving out and the
person did not keep in, less those the person left out.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence

import numpy as np

from coatgui.assessment.amounts import parameters_per_area
from coatgui.assessment.capacitance import Capacitances
from coatgui.assessment.drawn import Drawn
from coatgui.assessment.interface import phase_crossings
from coatgui.assessment.leads import Leads
from coatgui.assessment.measured_capacitance import measured_capacitances
from coatgui.assessment.modulus import grids, moduli
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
    on = grids([d.reading.spectrum for d in drawn], [d.used for d in drawn], [d.fit for d in drawn])
    areas = [d.area_cm2 for d in drawn]
    frequency_hz = settings.capacitance_frequency_hz
    at_frequencies = moduli(on, areas, wanted, leads.limit)
    measured = measured_capacitances(on, frequency_hz, areas, leads.parallel)
    crossings = phase_crossings(on, len(drawn))
    for d, at, (capacitance, note), crossing_hz in zip(
        drawn, at_frequencies, measured, crossings, strict=True
    ):
        d.moduli, d.crossing_hz = at, crossing_hz
        d.measured_capacitance = capacitance
        if d.fit is not None:
            d.findings.extend([note] if note else [])
        elif d.counts:
            d.findings.append(
                Finding(
                    "no_fit",
                    Severity.DOUBT,
                    "No circuit could be laid on this reading: too few points are left.",
                )
            )
    _draw_fits([d for d in drawn if d.fit is not None], frequency_hz, leads)


def _draw_fits(fitted: Sequence[Drawn], frequency_hz: float, leads: Leads) -> None:
    """What the circuits say, of readings that have one."""
    fits = [d.fit for d in fitted if d.fit is not None]
    found = Capacitances(
        fits,
        [d.reading.spectrum for d in fitted],
        [d.area_cm2 for d in fitted],
        leads.parallel,
    )
    for d, fit, film, small, interface, own_turning, turning_hz in zip(
        fitted,
        fits,
        found.film(frequency_hz),
        found.small_exponents(),
        found.interface(),
        found.hsu_mansfeld(),
        found.turning_hz(),
        strict=True,
    ):
        d.coating_capacitance = film
        d.interface_capacitance = interface
        d.parameters = _parameters(fit, d.area_cm2, own_turning, interface)
        d.pore_resistance = pore_resistance(fit, d.reading.spectrum, d.area_cm2, leads.limit)
        d.conducts = (
            d.pore_resistance is not None
            and d.pore_resistance.bound is Bound.TWO_SIDED
            and turning_hz is not None
        )
        d.findings.extend([small] if small else [])
        d.findings.extend(_fit_findings(fit))


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
        points_used=int(np.count_nonzero(d.used)),
        left_out=tuple(
            LeftOutPoint(float(reading.spectrum.frequency_hz[place]), d.left_out[place])
            for place in sorted(d.left_out)
        ),
        findings=tuple(d.findings),
        counts=d.counts,
        modulus=tuple([m for m in d.moduli if m.frequency_hz in modulus_frequencies_hz]),
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
    fit: Fit, area_cm2: float | None, film: Quantity | None, interface: Quantity | None
) -> tuple[Parameter, ...]:
    """The fit's parameters per area, and the capacitances that follow from them by the laws of film
    (Hsu and Mansfeld) and interface (Brug)."""
    parameters = parameters_per_area(fit.parameters, area_cm2)
    layers = {p.symbol: p.layer for p in parameters}
    derived = (
        ("C_c", "Q_c", "capacitance of the film, from Q_c, n_c and R_po", film),
        ("C_dl", "Q_dl", "capacitance of the interface, from Q_dl and n_dl", interface),
    )
    return parameters + tuple(
        Parameter(symbol, meaning, layers[origin], quantity)
        for symbol, origin, meaning, quantity in derived
        if quantity is not None and symbol not in layers and origin in layers
    )
