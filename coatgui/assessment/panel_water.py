"""The water in one panel's film: which capacitances it rests on, the dry film, every reading's
uptake with the bracket of the mixing laws, the uptake at saturation."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

import numpy as np

from coatgui.assessment.amounts import scaled
from coatgui.assessment.drawn import Drawn
from coatgui.assessment.events import Drying
from coatgui.assessment.film import FilmFacts, permittivity_finding
from coatgui.assessment.mixing import bracket, mass_percent
from coatgui.assessment.sorption import Sorption, dry_capacitance
from coatgui.assessment.water import (
    apparent_uptake,
    dry_out_finding,
    temperature_finding,
    uptake_finding,
    uptake_of_rise,
    water_permittivity,
)
from coatgui.assessment.words import hertz
from coatgui.records import Finding, FloatArray, Panel, Quantity, Severity, WaterUptake


def uptake_basis(
    series: Sequence[Drawn], frequency_hz: float, measured: bool = False
) -> tuple[list[Quantity | None], str]:
    """The capacitances that the water uptake rests on, all on one footing, and its name.

    The fitted film's at the high frequency; readings whose model has no film stay without. Where
    most fits show no film, there is no film that could take up water. Where most readings have no
    fit at all, or a person wants the `measured` one, the measured parallel capacitance serves for
    all.
    """
    fitted = [d.coating_capacitance for d in series]
    films, fits = sum(q is not None for q in fitted), sum(d.fit is not None for d in series)
    if not measured and 2 * films >= len(series):
        return fitted, f"fitted film at {hertz(frequency_hz)}"
    if not measured and 2 * (fits - films) > len(series):
        return [None] * len(series), "no film shows"
    return (
        [d.measured_capacitance for d in series],
        f"measured parallel capacitance at {hertz(frequency_hz)}",
    )


def sorption_finding(sorption: Sorption) -> Finding:
    followed = sorption.misfit is not None
    return Finding(
        "sorption_fickian" if followed else "dry_capacitance_taken",
        Severity.NOTE,
        sorption.text,
        evidence=(("misfit", sorption.misfit),) if sorption.misfit is not None else (),
    )


def panel_sorption(
    exposure_h: Sequence[float],
    basis: Sequence[Quantity | None],
    basis_name: str,
    dry_out: Drying,
    measured: Quantity | None,
) -> Sorption | None:
    before = [
        (time, quantity)
        for time, quantity in zip(exposure_h[: dry_out.first], basis[: dry_out.first], strict=True)
        if quantity is not None
    ]
    if measured is not None and any(q.unit != measured.unit for _, q in before):
        measured = None
    return dry_capacitance([t for t, _ in before], [q for _, q in before], basis_name, measured)


def saturation_uptake(
    counting: Sequence[Drawn],
    sorption: Sorption | None,
    panel: Panel,
    facts: FilmFacts,
    dry_permittivity: Quantity | None,
) -> WaterUptake | None:
    """The water at saturation, from the joint fit of the dry and the saturated film; swelling in
    thickness counted where the panel list gives the wet thickness."""
    if sorption is None or sorption.log_rise is None:
        return None
    temperature_c = float(np.median([d.temperature_c for d in counting]))
    swelling = 1.0
    if facts.wet_thickness_um is not None and panel.thickness_um is not None:
        swelling = facts.wet_thickness_um / panel.thickness_um
    uptake = uptake_of_rise(sorption.log_rise, temperature_c, swelling)
    if uptake is None or sorption.log_rise.value is None:
        return None
    ratio = np.array([np.exp(sorption.log_rise.value)])
    return _bracketed([uptake], ratio, [temperature_c], 0.0, dry_permittivity, swelling)[0]


def in_mass(saturation: WaterUptake | None, facts: FilmFacts) -> Quantity | None:
    if saturation is None or facts.density_g_cm3 is None:
        return None
    mass = scaled(saturation.quantity, mass_percent(1.0, facts.density_g_cm3), "g/100 g dry film")
    return mass


def _bracketed(
    uptakes: Sequence[Quantity],
    ratio: FloatArray,
    temperature_c: Sequence[float],
    reference_h: float,
    dry_permittivity: Quantity | None,
    swelling: float = 1.0,
) -> list[WaterUptake]:
    """Each uptake with what the other laws make of it. A dry permittivity that no film has is not
    used; the usual range stands in."""
    known = None
    if dry_permittivity is not None and permittivity_finding(dry_permittivity) is None:
        known = dry_permittivity.value
    laws = bracket(ratio, water_permittivity(temperature_c), known, swelling)
    each, lows, highs = (_listed(part) for part in (laws.volume_percent.T, laws.low, laws.high))
    return [
        WaterUptake(uptake, reference_h, low, high, laws.names, tuple(values))
        for uptake, values, low, high in zip(uptakes, each, lows, highs, strict=True)
    ]


def _listed(values: FloatArray) -> list[Any]:
    """As nested lists, with None for what is not a number."""
    if np.isfinite(values).all():
        plain: list[Any] = values.tolist()
        return plain
    holed = values.astype(object)
    holed[~np.isfinite(values)] = None
    listed: list[Any] = holed.tolist()
    return listed


def draw_water(
    counting: Sequence[Drawn],
    basis: Sequence[Quantity | None],
    sorption: Sorption | None,
    dry_out: Drying,
    dry_permittivity: Quantity | None,
) -> None:
    with_water: list[tuple[Drawn, Quantity, float]] = []
    for d, quantity, fallen in zip(counting, basis, dry_out.fallen_percent, strict=True):
        if fallen is not None:
            d.findings.append(dry_out_finding(fallen))
        if quantity is None or sorption is None:
            continue
        uptake = apparent_uptake(quantity, sorption.dry_capacitance, d.temperature_c)
        if uptake is None:
            d.findings.append(temperature_finding(d.temperature_c))
            continue
        ratio = (quantity.value or 0.0) / (sorption.dry_capacitance.value or 1.0)
        with_water.append((d, uptake, ratio))
        finding = uptake_finding(uptake)
        if finding is not None:
            d.findings.append(finding)
    if sorption is None or not with_water:
        return
    found = _bracketed(
        [uptake for _, uptake, _ in with_water],
        np.array([ratio for _, _, ratio in with_water]),
        [d.temperature_c for d, _, _ in with_water],
        sorption.reference_h,
        dry_permittivity,
    )
    for (d, _, _), water in zip(with_water, found, strict=True):
        d.water_uptake = water
