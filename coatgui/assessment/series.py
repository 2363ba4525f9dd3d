"""One panel's readings together: what a single reading cannot say.

The dry film and with it the water uptake, events, and when a limit was crossed. Only readings that
count take part.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

from coatgui.assessment.capacitance import turning_frequency
from coatgui.assessment.events import (
    Drying,
    drying,
    limit_crossing,
    rebound_event,
    stage_events,
)
from coatgui.assessment.sorption import Sorption, diffusion_coefficient, dry_capacitance
from coatgui.assessment.water import (
    apparent_uptake,
    dry_out_finding,
    temperature_finding,
    uptake_finding,
)
from coatgui.records import (
    BoolArray,
    Bound,
    Criterion,
    Event,
    Finding,
    Fit,
    LimitCrossing,
    Modulus,
    Parameter,
    Quantity,
    Reading,
    Severity,
    WaterUptake,
)


@dataclass(slots=True)
class Drawn:
    """What has been drawn from one reading so far; `assess` fills it step by step. `left_out` maps
    the place of each point left out to the reason."""

    reading: Reading
    used: BoolArray
    left_out: Mapping[int, str]
    counts: bool
    temperature_c: float
    area_cm2: float | None
    findings: list[Finding]
    fit: Fit | None = None
    moduli: tuple[Modulus, ...] = ()
    parameters: tuple[Parameter, ...] = ()
    coating_capacitance: Quantity | None = None
    measured_capacitance: Quantity | None = None
    pore_resistance: Quantity | None = None
    water_uptake: WaterUptake | None = None

    def modulus_at(self, frequency_hz: float) -> Modulus | None:
        return next((m for m in self.moduli if m.frequency_hz == frequency_hz), None)


@dataclass(frozen=True, slots=True)
class SeriesResult:
    """What a panel's series says; the readings' own part is written into their `Drawn`."""

    dry_capacitance: Quantity | None
    diffusion_coefficient: Quantity | None
    events: tuple[Event, ...]
    limit_crossings: tuple[LimitCrossing, ...]
    findings: tuple[Finding, ...]


def uptake_basis(series: Sequence[Drawn], frequency_hz: float) -> tuple[list[Quantity | None], str]:
    """The capacitances that the water uptake rests on, all on one footing, and its name.

    The fitted film's at the high frequency; readings whose model has no film stay without. Only
    where more than half of the readings are so, the measured parallel capacitance serves for all.
    """
    fitted = [d.coating_capacitance for d in series]
    if 2 * sum(q is not None for q in fitted) >= len(series):
        return fitted, f"fitted film at {frequency_hz:g} Hz"
    return (
        [d.measured_capacitance for d in series],
        f"measured parallel capacitance at {frequency_hz:g} Hz",
    )


def draw_series(
    series: Sequence[Drawn],
    thickness_um: float | None,
    capacitance_frequency_hz: float,
    modulus_frequency_hz: float,
    criteria: Sequence[Criterion],
) -> SeriesResult:
    """Work out one panel from its readings, sorted by exposure time; fills in their water uptake
    and the findings that follow from it."""
    counting = [d for d in series if d.counts]
    if not counting:
        return SeriesResult(None, None, (), (), ())
    exposure_h = [d.reading.exposure_h for d in counting]
    basis, basis_name = uptake_basis(counting, capacitance_frequency_hz)
    dry_out = drying(exposure_h, basis)
    sorption = _sorption(exposure_h, basis, basis_name, dry_out)
    _water(counting, basis, sorption, dry_out)
    moduli = [d.modulus_at(modulus_frequency_hz) for d in counting]
    rebound = rebound_event(exposure_h, moduli)
    events = [
        *stage_events(exposure_h, [d.fit for d in counting], [_pores_conduct(d) for d in counting]),
        *dry_out.events,
        *([rebound] if rebound else []),
    ]
    crossings = [
        limit_crossing(c, exposure_h, [d.modulus_at(c.frequency_hz) for d in counting])
        for c in (criteria if counting[0].area_cm2 is not None else ())
    ]
    return SeriesResult(
        None if sorption is None else sorption.dry_capacitance,
        None if sorption is None else diffusion_coefficient(sorption, thickness_um),
        tuple(sorted(events, key=lambda event: event.by_h or 0.0)),
        tuple(crossings),
        () if sorption is None else (_sorption_finding(sorption),),
    )


def _pores_conduct(d: Drawn) -> bool:
    """Whether the pores carry more than the film's capacitance at the low end of the window, and by
    a resistance that the data hold from both sides, leads included."""
    return (
        d.fit is not None
        and d.pore_resistance is not None
        and d.pore_resistance.bound is Bound.TWO_SIDED
        and turning_frequency(d.fit, d.reading.spectrum) is not None
    )


def _sorption_finding(sorption: Sorption) -> Finding:
    followed = sorption.misfit is not None
    return Finding(
        "sorption_fickian" if followed else "dry_capacitance_taken",
        Severity.NOTE,
        sorption.text,
        evidence=(("misfit", sorption.misfit),) if sorption.misfit is not None else (),
    )


def _sorption(
    exposure_h: Sequence[float],
    basis: Sequence[Quantity | None],
    basis_name: str,
    dry_out: Drying,
) -> Sorption | None:
    before = [
        (time, quantity)
        for time, quantity in zip(exposure_h[: dry_out.first], basis[: dry_out.first], strict=True)
        if quantity is not None
    ]
    return dry_capacitance([t for t, _ in before], [q for _, q in before], basis_name)


def _water(
    counting: Sequence[Drawn],
    basis: Sequence[Quantity | None],
    sorption: Sorption | None,
    dry_out: Drying,
) -> None:
    for d, quantity, fallen in zip(counting, basis, dry_out.fallen_percent, strict=True):
        if fallen is not None:
            d.findings.append(dry_out_finding(fallen))
        if quantity is None or sorption is None:
            continue
        uptake = apparent_uptake(quantity, sorption.dry_capacitance, d.temperature_c)
        if uptake is None:
            d.findings.append(temperature_finding(d.temperature_c))
            continue
        d.water_uptake = WaterUptake(uptake, sorption.reference_h)
        finding = uptake_finding(uptake)
        if finding is not None:
            d.findings.append(finding)
