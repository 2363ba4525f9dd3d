"""A spectrum as a table: what its plots show, for a spreadsheet or a screen reader."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from coatgui.fitting.views import FitBand, Part
from coatgui.window.spectrum_plots import Drawn

_HEADINGS = (
    "frequency_hz", "real_ohm", "imaginary_ohm", "modulus_ohm", "phase_degrees", "used",
    "model_real_ohm", "model_imaginary_ohm",
)  # fmt: skip


def spectrum_rows(shown: Drawn, band: FitBand | None, parts: Sequence[Part]) -> list[list[object]]:
    """A row for each point, the headings first; band and parts at the same frequencies, where
    there are any."""
    z = shown.spectrum.impedance_ohm
    model = shown.fit.modelled_ohm if shown.fit else [None] * z.size
    beside = _columns(band, parts)
    rows: list[list[object]] = [[*_HEADINGS, *beside]]
    for place, (f, measured, fitted, used) in enumerate(
        zip(shown.spectrum.frequency_hz, z, model, shown.used, strict=True)
    ):
        rows.append(
            [
                float(f), float(measured.real), float(measured.imag), float(abs(measured)),
                float(np.degrees(np.angle(measured))), "yes" if used else "no",
                None if fitted is None else float(fitted.real),
                None if fitted is None else float(fitted.imag),
                *(float(column[place]) for column in beside.values()),
            ]
        )  # fmt: skip
    return rows


def _columns(band: FitBand | None, parts: Sequence[Part]) -> dict[str, np.ndarray]:
    """Band and parts as columns, by their headings."""
    found: dict[str, np.ndarray] = {}
    if band is not None:
        found["model_modulus_low_ohm"] = band.modulus_low_ohm
        found["model_modulus_high_ohm"] = band.modulus_high_ohm
        found["model_phase_low_degrees"] = band.phase_low_deg
        found["model_phase_high_degrees"] = band.phase_high_deg
    for part in parts:
        if part.impedance_ohm is not None:
            found[f"{part.name}: real_ohm"] = part.impedance_ohm.real
            found[f"{part.name}: imaginary_ohm"] = part.impedance_ohm.imag
    return found
