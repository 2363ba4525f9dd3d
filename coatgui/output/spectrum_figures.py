"""The spectra of a panel as they were measured, over all its exposure times."""

from __future__ import annotations

import math
from collections.abc import Iterator, Sequence

from coatgui.assessment.words import counted
from coatgui.output.document import Figure
from coatgui.output.drawing import Drawing, Plot, span_of
from coatgui.output.figure_parts import WIDTH, between, shortened
from coatgui.records import Assessment, Campaign, ReadingAssessment, Spectrum

_MOST_SPECTRA = 24  # panels whose spectra are drawn
_FRESH, _LATE = (0xA9, 0xBD, 0xCE), (0x12, 0x2B, 0x42)


def spectrum_figures(assessment: Assessment, campaign: Campaign) -> Iterator[Figure]:
    """For each panel |Z| and phase against frequency at all its exposure times."""
    kept = {reading.reading_id: reading for reading in campaign.readings}
    for panel in assessment.panels[:_MOST_SPECTRA]:
        own = [
            r for r in assessment.readings if r.panel_id == panel.panel_id and r.reading_id in kept
        ]
        if own:
            spectra = [(r, kept[r.reading_id].spectrum) for r in own]
            yield _spectra(panel.panel, panel.area_cm2, spectra)


def _spectra(
    name: str, area_cm2: float | None, spectra: Sequence[tuple[ReadingAssessment, Spectrum]]
) -> Figure:
    area, unit = (1.0, "Ω") if area_cm2 is None else (area_cm2, "Ω cm²")
    frequencies = [float(f) for _, s in spectra for f in (s.frequency_hz[0], s.frequency_hz[-1])]
    moduli = [float(v) for _, s in spectra for v in abs(s.impedance_ohm) * area]
    x = span_of(frequencies, "log")
    y = span_of(moduli, "log") or (1.0, 10.0)
    assert x is not None
    drawing = Drawing(WIDTH, 218)
    modulus = Plot(
        drawing,
        (62.0, 8.0, 232.0, 180.0),
        (*x, "log"),
        (*y, "log"),
        ("Frequency (Hz)", f"|Z|{'·A' if area_cm2 else ''} ({unit})"),
    )
    phase = Plot(
        drawing,
        (290.0, 8.0, WIDTH - 8, 180.0),
        (*x, "log"),
        (
            -95.0,
            max(5.0, 10 + max(_phase(z) for _, s in spectra for z in s.impedance_ohm)),
            "linear",
        ),
        ("Frequency (Hz)", "Phase (°)"),
    )
    for i, (reading, spectrum) in enumerate(spectra):
        colour = between(_FRESH, _LATE, i / max(len(spectra) - 1, 1))
        dashes = "" if reading.counts else "2 3"
        for plot, values in (
            (modulus, abs(spectrum.impedance_ohm) * area),
            (phase, [_phase(z) for z in spectrum.impedance_ohm]),
        ):
            places = [
                plot.at(float(f), float(v))
                for f, v in zip(spectrum.frequency_hz, values, strict=True)
            ]
            within = [p for p in places if p is not None and 8.0 <= p[1] <= 180.0]
            drawing.line(within, colour, 0.9, dashes)
    times = f"{spectra[0][0].exposure_h:g} to {spectra[-1][0].exposure_h:g} h"
    rejected = sum(not r.counts for r, _ in spectra)
    caption = (
        f"Panel {shortened(name, 60)}: measured spectra from {times}, pale to dark with exposure."
        + (f" Broken lines: {counted(rejected, 'rejected reading')}." if rejected else "")
    )
    return Figure(
        f"spectra_{shortened(name, 40)}",
        drawing,
        caption,
        f"Two plots against frequency, modulus and phase: {counted(len(spectra), 'reading')} of "
        f"panel {name}.",
    )


def _phase(impedance: complex) -> float:
    return math.degrees(math.atan2(impedance.imag, impedance.real))
