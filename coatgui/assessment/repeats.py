"""Sweeps repeated on one panel at one exposure time: their scatter weighs the points of a fit."""

from __future__ import annotations

from collections.abc import Sequence

from coatgui.assessment.drawn import Drawn
from coatgui.fitting import scatter_of_repeats
from coatgui.records import Finding, FloatArray, Severity


def deviations(drawn: Sequence[Drawn]) -> list[FloatArray | None]:
    """Relative standard deviations (N,) of each reading's points up to a factor, where the panel
    was swept more than once at that time on the same frequencies; None elsewhere. Such readings
    get a note that says so."""
    together: dict[tuple[str, float, bytes], list[int]] = {}
    for place, d in enumerate(drawn):
        if d.counts:
            grid = d.reading.spectrum.frequency_hz.tobytes()
            key = (d.reading.panel_id, d.reading.exposure_h, grid)
            together.setdefault(key, []).append(place)
    found: list[FloatArray | None] = [None] * len(drawn)
    for places in together.values():
        if len(places) < 2:
            continue
        scatter = scatter_of_repeats(
            drawn[places[0]].reading.spectrum.frequency_hz,
            [drawn[i].reading.spectrum.impedance_ohm for i in places],
            [drawn[i].used for i in places],
        )
        for i in places if scatter is not None else ():
            found[i] = scatter
            drawn[i].findings.append(
                Finding(
                    "weights_from_repeats",
                    Severity.NOTE,
                    f"The panel was swept {len(places)} times at this exposure time; the scatter "
                    "between the sweeps weighs the points of the fit.",
                )
            )
    return found
