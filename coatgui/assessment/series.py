"""One panel's readings together: what a single reading cannot say.

The dry film and with it the water uptake, events, and when a limit was crossed. Only readings that
count take part.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from coatgui.assessment.drawn import Drawn
from coatgui.assessment.events import (
    Drying,
    drying,
    fall_event,
    rebound_event,
    sorption_events,
    stage_events,
)
from coatgui.assessment.film import (
    FilmFacts,
    film_resistivity,
    measured_dry,
    permittivity_finding,
    relative_permittivity,
    thickness_deviation,
    widened,
)
from coatgui.assessment.interface import active_area, breakpoint_figures
from coatgui.assessment.limits import limit_crossing
from coatgui.assessment.panel_water import (
    draw_water,
    in_mass,
    panel_sorption,
    saturation_uptake,
    sorption_finding,
    uptake_basis,
)
from coatgui.assessment.sorption import Sorption, diffusion_coefficient
from coatgui.records import (
    Criterion,
    Electrolyte,
    Event,
    Finding,
    LimitCrossing,
    Panel,
    Quantity,
    Settings,
    WaterUptake,
)


@dataclass(frozen=True, slots=True)
class SeriesResult:
    """What a panel's series says; the readings' own part is written into their `Drawn`."""

    dry_capacitance: Quantity | None = None
    diffusion_coefficient: Quantity | None = None
    dry_permittivity: Quantity | None = None
    saturation_uptake: WaterUptake | None = None
    saturation_mass_percent: Quantity | None = None
    events: tuple[Event, ...] = ()
    limit_crossings: tuple[LimitCrossing, ...] = ()
    findings: tuple[Finding, ...] = ()


def draw_series(
    series: Sequence[Drawn],
    panel: Panel,
    facts: FilmFacts,
    settings: Settings,
    modulus_frequency_hz: float,
    criteria: Sequence[Criterion],
    noise: float | None = None,
) -> SeriesResult:
    """Work out one panel from its readings, sorted by exposure time; fills in their water uptake,
    film and pore figures and the findings that follow from them. `noise` is the scatter of
    log₁₀|Z| against the sister panels."""
    counting = [d for d in series if d.counts]
    if not counting:
        return SeriesResult()
    exposure_h = [d.reading.exposure_h for d in counting]
    basis, basis_name = uptake_basis(
        counting, settings.capacitance_frequency_hz, settings.uptake_from_high_frequency
    )
    dry_out = drying(exposure_h, basis)
    sorption = panel_sorption(exposure_h, basis, basis_name, dry_out, measured_dry(facts))
    dry = None if sorption is None else sorption.dry_capacitance
    uncertain = thickness_deviation(facts, panel.thickness_um)
    dry_epsilon = None if dry is None else relative_permittivity(dry, panel.thickness_um)
    if dry_epsilon is not None:
        dry_epsilon = widened(dry_epsilon, uncertain)
    draw_water(counting, basis, sorption, dry_out, dry_epsilon)
    _film_and_pores(counting, panel, uncertain, dry_epsilon, settings.electrolytes)
    diffusion = None if sorption is None else diffusion_coefficient(sorption, panel.thickness_um)
    if diffusion is not None:
        diffusion = widened(diffusion, 2 * uncertain)
    saturation = saturation_uptake(counting, sorption, panel, facts, dry_epsilon)
    findings = [] if sorption is None else [sorption_finding(sorption)]
    if dry_epsilon is not None and (strange := permittivity_finding(dry_epsilon)) is not None:
        findings.append(strange)
    return SeriesResult(
        dry,
        diffusion,
        dry_epsilon,
        saturation,
        in_mass(saturation, facts),
        _events(counting, exposure_h, basis, sorption, dry_out, modulus_frequency_hz, noise),
        tuple(
            limit_crossing(c, exposure_h, [d.modulus_at(c.frequency_hz) for d in counting])
            for c in (criteria if panel.area_cm2 is not None else ())
        ),
        tuple(findings),
    )


def _events(
    counting: Sequence[Drawn],
    exposure_h: Sequence[float],
    basis: Sequence[Quantity | None],
    sorption: Sorption | None,
    dry_out: Drying,
    modulus_frequency_hz: float,
    noise: float | None,
) -> tuple[Event, ...]:
    moduli = [d.modulus_at(modulus_frequency_hz) for d in counting]
    fall = fall_event(exposure_h, moduli, noise)
    rebound = rebound_event(exposure_h, moduli, noise)
    events = [
        *sorption_events(exposure_h, sorption, basis),
        *stage_events(
            exposure_h,
            [d.fit for d in counting],
            [d.pore_resistance for d in counting],
            [d.conducts for d in counting],
        ),
        *([fall] if fall else []),
        *dry_out.events,
        *([rebound] if rebound else []),
    ]
    return tuple(sorted(events, key=lambda event: event.by_h or 0.0))


def _film_and_pores(
    counting: Sequence[Drawn],
    panel: Panel,
    uncertain: float,
    dry_permittivity: Quantity | None,
    electrolytes: tuple[Electrolyte, ...],
) -> None:
    """Effective permittivity and resistivity of each reading, breakpoint and active area."""
    value = None if dry_permittivity is None else dry_permittivity.value
    for d in counting:
        if d.coating_capacitance is not None:
            film = relative_permittivity(d.coating_capacitance, panel.thickness_um)
            d.relative_permittivity = None if film is None else widened(film, uncertain)
        if d.pore_resistance is None:
            continue
        resistivity = film_resistivity(d.pore_resistance, panel.thickness_um)
        d.film_resistivity = None if resistivity is None else widened(resistivity, uncertain)
        if not d.conducts:
            continue
        d.breakpoint = breakpoint_figures(
            d.crossing_hz,
            d.pore_resistance,
            d.coating_capacitance,
            d.interface_capacitance,
        )
        if panel.area_cm2 is not None:
            d.active_area = active_area(
                d.pore_resistance,
                d.interface_capacitance,
                d.breakpoint,
                panel.thickness_um,
                value,
                panel.electrolyte,
                electrolytes,
            )
