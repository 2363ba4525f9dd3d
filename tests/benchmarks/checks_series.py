"""How often a reading in the wrong panel or unit is found, in the sample campaign.

Run `python tests/benchmarks/checks_series.py`. Every reading is exchanged with that of every panel
of another formulation at the same time, and rewritten in kΩ and per area, one fault at a time:
those between two others of their panel, and the first and the last of each.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import replace

from coatgui.assessment.neighbours import course_findings
from coatgui.campaign import campaign_from_found
from coatgui.intake import read_folder
from coatgui.quality import check_spectra, thresholds
from coatgui.records import Campaign, Finding, Reading, Spectrum
from coatgui.shipped import sample_panels


def sample() -> tuple[Campaign, list[str]]:
    """The sample campaign, and the ids of its readings that the checks do not reject."""
    campaign = campaign_from_found(read_folder(sample_panels()), "Sample")
    checks = check_spectra(
        [r.spectrum for r in campaign.readings],
        settings=campaign.settings,
        area_cm2=[None] * len(campaign.readings),
        open_lead=campaign.open_lead,
    )
    pairs = zip(campaign.readings, checks, strict=True)
    return campaign, [r.reading_id for r, check in pairs if not check.rejected]


def with_spectra(campaign: Campaign, changed: dict[str, Spectrum]) -> Campaign:
    return replace(
        campaign,
        readings=tuple(
            replace(r, spectrum=changed.get(r.reading_id, r.spectrum)) for r in campaign.readings
        ),
    )


def times(reading: Reading, factor: float) -> Spectrum:
    return Spectrum(reading.spectrum.frequency_hz, factor * reading.spectrum.impedance_ohm)


def found(campaign: Campaign, counting: list[str]) -> dict[str, Finding]:
    return dict(course_findings(campaign, counting, thresholds(campaign.settings)))


def chosen(campaign: Campaign, counting: list[str], ends: bool) -> list[Reading]:
    """Readings with one before and one after them, or the first and last of each panel."""
    result = []
    for panel in campaign.panels:
        own = [
            r for r in campaign.readings
            if r.panel_id == panel.panel_id and r.reading_id in counting
        ]  # fmt: skip
        own.sort(key=lambda r: r.exposure_h)
        result += [own[0], own[-1]] if ends else own[1:-1]
    return result


def exchanges(campaign: Campaign, those: list[Reading]) -> Iterator[tuple[Reading, Reading]]:
    """Pairs of readings of different formulations at one time."""
    formulation = {p.panel_id: p.formulation_id for p in campaign.panels}
    for place, first in enumerate(those):
        for second in those[place + 1 :]:
            apart = formulation[first.panel_id] != formulation[second.panel_id]
            if apart and first.exposure_h == second.exposure_h:
                yield first, second


def main() -> None:
    campaign, counting = sample()
    quiet = found(campaign, counting)
    print(f"{'as it is':34} {len(quiet)} of {len(counting)} readings suspected")
    for ends in (False, True):
        print("first and last readings" if ends else "readings between two others")
        table(campaign, counting, chosen(campaign, counting, ends))


def table(campaign: Campaign, counting: list[str], those: list[Reading]) -> None:
    areas = {p.panel_id: p.area_cm2 or 1.0 for p in campaign.panels}
    hits = total = 0
    for first, second in exchanges(campaign, those):
        swapped = {first.reading_id: second.spectrum, second.reading_id: first.spectrum}
        codes = found(with_spectra(campaign, swapped), counting)
        total += 1
        hits += any(
            i in codes and codes[i].code == "panel_suspected"
            for i in (first.reading_id, second.reading_id)
        )
    print(f"{'panels exchanged':34} {100 * hits / total:5.1f} % of {total}")
    for name in ("kΩ read as Ω", "area applied already", "area divided out"):
        hits = total = 0
        for reading in those:
            area = areas[reading.panel_id]
            factor = {"kΩ read as Ω": 1e-3, "area applied already": area}.get(name, 1 / area)
            changed = {reading.reading_id: times(reading, factor)}
            codes = found(with_spectra(campaign, changed), counting)
            total += 1
            finding = codes.get(reading.reading_id)
            hits += finding is not None and finding.code == "unit_suspected"
        print(f"{name:34} {100 * hits / total:5.1f} % of {total}")


if __name__ == "__main__":
    main()
