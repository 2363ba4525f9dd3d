"""How the panels were measured, topic by topic: what the campaign holds, or that it holds nothing.

The topics are those of `resources/report.toml`; one that the campaign has no place for is named all
the same, so that the laboratory states it.
"""

from __future__ import annotations

from collections import Counter
from collections.abc import Callable, Iterable, Sequence

from coatgui.assessment.rules import table
from coatgui.assessment.words import counted
from coatgui.output.document import Table
from coatgui.output.shown import number
from coatgui.records import Assessment, Campaign

_NOT_RECORDED = "Not recorded in the campaign; to be stated by the laboratory."


def topics(assessment: Assessment, campaign: Campaign) -> Table:
    """Each topic with what the campaign says about it."""
    rows = tuple(
        (str(topic["name"]), _FACTS[str(topic["fact"])](assessment, campaign) or _NOT_RECORDED)
        for topic in table("report")["topic"]
    )
    return Table(
        "What is known of the measurements, by the topics in which coated panels are often "
        "measured wrongly (after ISO/TR 5602 and ASTM G3).",
        ("topic", "what the campaign says"),
        rows,
        (1.2, 3),
    )


def _range(values: Sequence[float | None], unit: str, whole: int, noun: str) -> str:
    """ "12.6 to 14.6 cm² (10 of 12 panels)"; empty where there is no value."""
    known = [v for v in values if v is not None]
    if not known:
        return ""
    low, high = f"{min(known):g}", f"{max(known):g}"
    text = f"{low} {unit}" if low == high else f"{low} to {high} {unit}"
    missing = whole - len(known)
    return f"{text}; not recorded for {counted(missing, noun)}" if missing else text


def _named(texts: Iterable[str]) -> str:
    """Each text with how many panels it holds for; empty where none has one."""
    count = Counter(text.strip() for text in texts)
    known = [(text, times) for text, times in count.items() if text]
    if not known:
        return ""
    said = [f"{text} ({counted(times, 'panel')})" for text, times in known]
    if count[""]:
        said.append(f"not recorded for {counted(count[''], 'panel')}")
    return "; ".join(said)


def _area(assessment: Assessment, campaign: Campaign) -> str:
    panels = assessment.panels
    known = _range([p.area_cm2 for p in panels], "cm²", len(panels), "panel")
    return known and f"{known}. How the area was sealed is not recorded."


def _thickness(assessment: Assessment, campaign: Campaign) -> str:
    panels = assessment.panels
    return _range([p.thickness_um for p in panels], "µm", len(panels), "panel")


def _temperature(assessment: Assessment, campaign: Campaign) -> str:
    panels = {panel.panel_id: panel for panel in campaign.panels}
    own = [
        panels[r.panel_id].temperature_c if r.temperature_c is None else r.temperature_c
        for r in campaign.readings
        if r.panel_id in panels
    ]
    missing = sum(t is None for t in own)
    text = _range(own, "°C", len(own), "reading")
    if missing:
        assumed = f"{campaign.settings.temperature_c:g} °C is assumed where none is recorded"
        text = f"{text}; {assumed}" if text else f"Not recorded; {assumed}"
    return text


def _exposure(assessment: Assessment, campaign: Campaign) -> str:
    times = [reading.exposure_h for reading in assessment.readings]
    if not times:
        return ""
    return f"{counted(len(times), 'reading')}, from {min(times):g} to {max(times):g} h"


def _frequencies(assessment: Assessment, campaign: Campaign) -> str:
    spectra = [reading.spectrum for reading in campaign.readings]
    if not spectra:
        return ""
    high = max(float(s.frequency_hz[0]) for s in spectra)
    low = min(float(s.frequency_hz[-1]) for s in spectra)
    points = sorted(len(s) for s in spectra)
    count = f"{points[0]}" if points[0] == points[-1] else f"{points[0]} to {points[-1]}"
    return f"{number(high)} to {number(low)} Hz; {count} points a reading"


def _amplitude(assessment: Assessment, campaign: Campaign) -> str:
    readings = campaign.readings
    return _range([r.amplitude_mv for r in readings], "mV", len(readings), "reading")


def _potential(assessment: Assessment, campaign: Campaign) -> str:
    readings = campaign.readings
    return _range([r.potential_mv for r in readings], "mV", len(readings), "reading")


def _open_lead(assessment: Assessment, campaign: Campaign) -> str:
    settings = campaign.settings
    if campaign.open_lead is not None:
        source = campaign.open_lead_source
        text = f"An open-lead run was made{f' ({source.file})' if source else ''}; "
    elif settings.input_resistance_ohm is not None or settings.input_capacitance_f is not None:
        text = "No open-lead run; the instrument's input as its maker states it was used; "
    else:
        return "No open-lead run: how high the set-up can see is not known."
    taken = "was taken away from" if settings.take_leads_away else "was left in"
    return f"{text}the leads' share {taken} the spectra. Cage and cables are not recorded."


def _mains(assessment: Assessment, campaign: Campaign) -> str:
    found = sum(f.code == "mains_pick_up" for r in assessment.readings for f in r.findings)
    hit = f"pick-up found in {counted(found, 'reading')}" if found else "no pick-up found"
    return f"{campaign.settings.mains_hz:g} Hz and its multiples were watched: {hit}."


def _repetition(assessment: Assessment, campaign: Campaign) -> str:
    said = [f"{f.formulation}: {counted(f.panels, 'panel')}" for f in assessment.formulations]
    return "; ".join(said)


def _swelling(assessment: Assessment, campaign: Campaign) -> str:
    wet = sum("wet_thickness_um" in dict(panel.notes) for panel in campaign.panels)
    dried = sum(f.code == "capacitance_dropped" for r in assessment.readings for f in r.findings)
    said = (
        f"A wet thickness is recorded for {counted(wet, 'panel')}."
        if wet
        else "No wet thickness is recorded: the film is taken as not swollen."
    )
    if dried:
        said += f" Drying out is suspected in {counted(dried, 'reading')}."
    return said


_FACTS: dict[str, Callable[[Assessment, Campaign], str]] = {
    "": lambda a, c: "",
    "convention": lambda a, c: (
        "exp(+jωt): the imaginary part of a capacitor is negative. |Z| is per cm² where the panel "
        "has an area."
    ),
    "area": _area,
    "thickness": _thickness,
    "substrate": lambda a, c: _named(panel.substrate for panel in c.panels),
    "electrolyte": lambda a, c: _named(panel.electrolyte for panel in c.panels),
    "regime": lambda a, c: _named(panel.regime for panel in c.panels),
    "temperature": _temperature,
    "exposure": _exposure,
    "frequencies": _frequencies,
    "amplitude": _amplitude,
    "potential": _potential,
    "open_lead": _open_lead,
    "mains": _mains,
    "repetition": _repetition,
    "swelling": _swelling,
}
