"""Suspicions that a spectrum alone cannot raise: they rest on the panel's facts, on its other
readings, or on what was drawn from the fit. Called once, when everything else is known."""

from __future__ import annotations

import statistics
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import replace

import numpy as np

from coatgui.assessment.neighbours import course_findings
from coatgui.assessment.rules import rule
from coatgui.assessment.words import hertz, hours, power_of_ten
from coatgui.quality import thresholds
from coatgui.records import (
    BoolArray,
    Campaign,
    Finding,
    Panel,
    PanelAssessment,
    Quantity,
    Reading,
    ReadingAssessment,
    Severity,
)

_VACUUM_F_PER_CM = 8.8541878128e-14
_CM_PER_UM = 1e-4
_TAFEL_MV = 120.0  # per decade
_FEWEST_OTHERS = 2  # readings of a panel that one is held against
_FEWEST_PANELS = 3
_ByReading = Iterator[tuple[str, Finding]]


def with_suspicions(
    campaign: Campaign,
    readings: Sequence[ReadingAssessment],
    panels: Sequence[PanelAssessment],
) -> tuple[tuple[ReadingAssessment, ...], list[PanelAssessment]]:
    """The readings and panels with what is suspicious about them added to their findings."""
    limits = thresholds(campaign.settings)
    raised: dict[str, list[Finding]] = {}
    counting = [r.reading_id for r in readings if r.counts]
    sources = (
        _same_numbers(campaign),
        _conditions(campaign, limits),
        _odd_times(campaign),
        course_findings(campaign, counting, limits),
        _results(campaign, readings, limits),
    )
    for source in sources:
        for reading_id, finding in source:
            raised.setdefault(reading_id, []).append(finding)
    facts = {panel.panel_id: panel for panel in campaign.panels}
    capacitances: dict[str, Quantity] = {}
    for r in readings:
        if r.counts and r.coating_capacitance is not None and r.coating_capacitance.value:
            capacitances.setdefault(r.panel_id, r.coating_capacitance)
    return (
        tuple(
            replace(r, findings=(*r.findings, *raised[r.reading_id]))
            if r.reading_id in raised
            else r
            for r in readings
        ),
        [
            replace(p, findings=(*p.findings, *found))
            if (found := tuple(_film(p, facts[p.panel_id], capacitances.get(p.panel_id), limits)))
            else p
            for p in panels
        ],
    )


def _same_numbers(campaign: Campaign) -> _ByReading:
    names = {panel.panel_id: panel.name for panel in campaign.panels}
    first: dict[str, Reading] = {}
    for reading in campaign.readings:
        if reading.panel_id not in names:
            continue
        before = first.setdefault(reading.spectrum.content_key(), reading)
        if before is not reading:
            yield (
                reading.reading_id,
                Finding(
                    "same_numbers",
                    Severity.DOUBT,
                    f"The numbers are the same, one by one, as those of panel "
                    f"{names[before.panel_id]} at {hours(before.exposure_h)} "
                    f"({before.source.file}): no two measurements are. One of the two files is "
                    "in the wrong place.",
                ),
            )


def _by_panel(campaign: Campaign) -> dict[str, list[Reading]]:
    series: dict[str, list[Reading]] = {panel.panel_id: [] for panel in campaign.panels}
    for reading in campaign.readings:
        if reading.panel_id in series:
            series[reading.panel_id].append(reading)
    return series


def _conditions(campaign: Campaign, limits: Mapping[str, float]) -> _ByReading:
    """Temperature and potential far from those of the panel's other readings, or changing within
    the sweep."""
    areas = {panel.panel_id: panel.area_cm2 for panel in campaign.panels}
    for reading in campaign.readings:
        for finding in _within_sweep(reading, areas.get(reading.panel_id), limits):
            yield reading.reading_id, finding
    for series in _by_panel(campaign).values():
        warm = [(r, r.temperature_c) for r in series if r.temperature_c is not None]
        for reading, value, usual in _apart(warm, limits["temperature_apart_c"]):
            yield (
                reading.reading_id,
                Finding(
                    "temperature_apart",
                    Severity.DOUBT,
                    f"This reading was taken at {value:g} °C, the panel's others at about "
                    f"{usual:g} °C: capacitance and resistance change with temperature as they do "
                    "with water. Check the temperature, or measure again.",
                    evidence=(("temperature_c", value), ("usual_c", usual)),
                ),
            )
        charged = [(r, r.potential_mv) for r in series if r.potential_mv is not None]
        for reading, value, usual in _apart(charged, limits["potential_apart_mv"]):
            yield (
                reading.reading_id,
                Finding(
                    "potential_apart",
                    Severity.NOTE,
                    f"The potential was {value:g} mV, in the panel's other readings about "
                    f"{usual:g} mV: the surface changed, or the reference electrode did.",
                    evidence=(("potential_mv", value), ("usual_mv", usual)),
                ),
            )


def _within_sweep(
    reading: Reading, area_cm2: float | None, limits: Mapping[str, float]
) -> Iterator[Finding]:
    """What the file says point by point: a temperature or a potential that ran while the sweep was
    taken. Where the film is a barrier, the metal's potential is not what the spectrum shows."""
    if reading.temperature_span_c is not None:
        low, high = reading.temperature_span_c
        if high - low > limits["temperature_within_c"]:
            yield Finding(
                "temperature_drift",
                Severity.DOUBT,
                f"The temperature lay between {low:.3g} and {high:.3g} °C while the sweep was "
                "taken: its fast and its slow end are not of one panel. Let the cell come to rest "
                "and measure again.",
                evidence=(("low_c", low), ("high_c", high)),
            )
    if reading.potential_span_mv is not None:
        low, high = reading.potential_span_mv
        shown = float(np.abs(reading.spectrum.impedance_ohm[-1])) * (area_cm2 or 1.0)
        barrier = shown > limits["barrier_above_ohm_cm2"]
        if high - low > limits["potential_within_mv"]:
            yield Finding(
                "potential_drift",
                Severity.NOTE if barrier else Severity.DOUBT,
                f"The potential lay between {low:.4g} and {high:.4g} mV while the sweep was taken"
                + (
                    ", which an intact barrier hardly shows."
                    if barrier
                    else ": the metal was not at rest. Wait until it is, and measure again."
                ),
                evidence=(("low_mv", low), ("high_mv", high)),
            )


def _apart(
    values: Sequence[tuple[Reading, float]], most: float
) -> Iterator[tuple[Reading, float, float]]:
    """Readings whose value is further than `most` from the median of the others'."""
    if len(values) <= _FEWEST_OTHERS:
        return
    for place, (reading, value) in enumerate(values):
        usual = statistics.median(v for i, (_, v) in enumerate(values) if i != place)
        if abs(value - usual) > most:
            yield reading, value, usual


def _odd_times(campaign: Campaign) -> _ByReading:
    """Two readings of a panel at one time; a time that no other panel has, in a panel that lacks
    one all others have."""
    series = _by_panel(campaign)
    there = [panel_id for panel_id, own in series.items() if own]
    times = sorted({r.exposure_h for own in series.values() for r in own})
    column = {time: place for place, time in enumerate(times)}
    seen = np.array(
        [_near(times, sorted({r.exposure_h for r in series[panel_id]})) for panel_id in there]
    )
    having = seen.sum(axis=0) if there else np.empty(0)
    for own in series.values():
        first: dict[float, Reading] = {}
        for reading in own:
            before = first.setdefault(reading.exposure_h, reading)
            if before is not reading:
                yield (
                    reading.reading_id,
                    Finding(
                        "same_time",
                        Severity.NOTE,
                        f"The panel has another reading at {hours(reading.exposure_h)} "
                        f"({before.source.file}): a repeat, or a wrong exposure time.",
                    ),
                )
    if len(there) <= _FEWEST_PANELS:
        return
    for place, panel_id in enumerate(there):
        # What all others have stands, too, in the first of them.
        example = {r.exposure_h for r in series[there[0 if place else 1]]}
        others = having - seen[place]
        lacking = [
            times[i]
            for i in np.flatnonzero((others == len(there) - 1) & ~seen[place])
            if times[i] in example
        ]
        alone = [r for r in series[panel_id] if not others[column[r.exposure_h]]]
        if lacking and len(alone) == 1:
            wanted = min(lacking, key=lambda t: abs(np.log(t / max(alone[0].exposure_h, 1e-3))))
            yield (
                alone[0].reading_id,
                Finding(
                    "exposure_time_suspected",
                    Severity.DOUBT,
                    f"No other panel was read at {hours(alone[0].exposure_h)}, and this one lacks "
                    f"the reading at {hours(wanted)} that all others have: check the exposure "
                    "time.",
                    evidence=(("exposure_h", alone[0].exposure_h), ("usual_h", wanted)),
                ),
            )


def _near(times: Sequence[float], own: Sequence[float]) -> BoolArray:
    """Which of some exposure times (n,) a panel's own, ascending, have within one inspection."""
    same = 1 + rule("inspection.same_within")
    wanted, mine = np.asarray(times), np.asarray(own)
    place = np.searchsorted(mine * same, wanted)
    nearest = mine[np.minimum(place, mine.size - 1)]
    return np.asarray((place < mine.size) & (nearest <= same * wanted), dtype=np.bool_)


def _results(
    campaign: Campaign, readings: Sequence[ReadingAssessment], limits: Mapping[str, float]
) -> _ByReading:
    """The amplitude for what the spectrum shows; an interface with too large a capacitance."""
    given = {r.reading_id: r for r in campaign.readings}
    areas = {panel.panel_id: panel.area_cm2 for panel in campaign.panels}
    most = limits["interface_capacitance_f_per_cm2"]
    for result in readings:
        reading = given[result.reading_id]
        area = areas[reading.panel_id]
        if reading.amplitude_mv is not None and area is not None and result.counts:
            finding = _amplitude(reading, reading.amplitude_mv, area, limits)
            if finding is not None:
                yield result.reading_id, finding
        for parameter in result.parameters:
            q = parameter.quantity
            if parameter.symbol != "C_dl" or q.unit != "F/cm²" or q.value is None:
                continue
            if q.value > most and (q.low or 0.0) > most:
                yield (
                    result.reading_id,
                    Finding(
                        "interface_capacitance_unphysical",
                        Severity.DOUBT,
                        f"The interface's capacitance of {1e6 * q.value:.3g} µF/cm² is more than "
                        f"bare metal has ({1e6 * most:g} µF/cm²): a wrong area or unit, or a slow "
                        "process that the circuit takes for the interface.",
                        evidence=(("f_per_cm2", q.value), ("limit_f_per_cm2", most)),
                    ),
                )


def _amplitude(
    reading: Reading, amplitude_mv: float, area_cm2: float, limits: Mapping[str, float]
) -> Finding | None:
    modulus = np.abs(reading.spectrum.impedance_ohm)
    if not modulus[-1]:
        return None
    shown = float(modulus[-1]) * area_cm2
    what, name = "an intact barrier", "amplitude_barrier_mv"
    if shown < limits["metal_below_ohm_cm2"]:
        what, name = "metal that shows through the film", "amplitude_metal_mv"
    elif shown < limits["barrier_above_ohm_cm2"]:
        what, name = "a film with conducting pores", "amplitude_pores_mv"
    if amplitude_mv <= limits[name]:
        return None
    error = 100 * (np.log(10) * amplitude_mv / _TAFEL_MV) ** 2 / 8
    return Finding(
        "amplitude_large",
        Severity.DOUBT,
        f"The amplitude of {amplitude_mv:g} mV is large for {what} (|Z|·A is "
        f"{power_of_ten(shown)} Ω cm² at {hertz(float(reading.spectrum.frequency_hz[-1]))}; up to "
        f"{limits[name]:g} mV is usual): at an interface with 120 mV a decade the answer would be "
        f"off by {error:.2g} %. Measure with a smaller amplitude.",
        evidence=(("amplitude_mv", amplitude_mv), ("limit_mv", limits[name])),
    )


def _film(
    result: PanelAssessment,
    panel: Panel,
    first: Quantity | None,
    limits: Mapping[str, float],
) -> Iterator[Finding]:
    """A permittivity that no film has, from capacitance (dry, or that of the `first` reading that
    has one), area and thickness."""
    if panel.area_cm2 is None or panel.thickness_um is None:
        return
    dry = result.dry_capacitance
    capacitance = next((q.value for q in (dry, first) if q is not None and q.value), None)
    if capacitance is None:
        return
    permittivity = capacitance * panel.thickness_um * _CM_PER_UM / _VACUUM_F_PER_CM
    low, high = limits["permittivity_low"], limits["permittivity_high"]
    if low <= permittivity <= high:
        return
    causes = {
        panel.area_cm2: "the impedance had been multiplied by the area already",
        1 / panel.area_cm2: "the impedance had been divided by the area already",
        1e3: "Ω had been read as kΩ",
        1e-3: "kΩ had been read as Ω",
        25.4: "the thickness had been given in mil (1/1000 inch)",
    }
    likely = [words for factor, words in causes.items() if low <= permittivity * factor <= high]
    looks = f" It looks as if {', or '.join(likely)}." if likely else ""
    yield Finding(
        "permittivity_implausible",
        Severity.DOUBT,
        f"With its area and thickness the film's capacitance means a permittivity of "
        f"{permittivity:.3g}; organic films have {low:g} to {high:g}.{looks} Check area, thickness "
        "and units.",
        evidence=(("permittivity", permittivity), ("f_per_cm2", capacitance)),
    )
