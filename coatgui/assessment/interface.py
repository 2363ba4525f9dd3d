"""Breakpoint and minimum-phase frequency, and the active area under a film by three routes.

For R_s + [C_c ∥ (R_po + [C_dl ∥ R_ct])] with r = C_c/C_dl, R_ct → ∞ and R_s → 0 (from memory of the
papers below, checked by calculation):

    f_b = 1/(2π R_po C_c)                     phase −45° for small r
    f_min = √((1+r)/r) / (2π R_po C_dl)       where the phase is least,  tan|φ| = 2√(r(1+r))
    f_b/f_min ≈ √(C_dl/C_c)

The phase passes −45° only for r ≤ (√2−1)/2 = 0.207; beyond, the numbers mean nothing and are left
away. Well below it the measured crossing still lies under f_b, by 1 % at r = 0.01 and 13 % at 0.1,
and an area from (f_b/f_min)² is 3 % and 31 % too small.

Delaminated or active share of the area:

* breakpoint: f_b/f_b⁰ with f_b⁰ = 1/(2π ε_r ε₀ ρ), f_b as measured (Haruyama, Asari and Tsuru 1987;
  Hack and Scully, J. Electrochem. Soc. 138 (1991) 33; Mansfeld and Tsai, Corrosion 47 (1991) 958)
* double layer: C_dl/C_dl⁰ with 20–60 µF/cm² for bare metal
* pores: ρ L/R_po

ρ is the resistivity of the solution in the pores. The routes were challenged (Kendig et al., ASTM
STP, 1993) and can differ by decades, so their ends are given as a bracket.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from functools import cache, lru_cache

import numpy as np

from coatgui.assessment.mixing import VACUUM_F_PER_CM
from coatgui.assessment.modulus import Grid
from coatgui.assessment.presets import recognised
from coatgui.assessment.rules import table
from coatgui.assessment.words import counted, hertz, power_of_ten
from coatgui.records import ActiveArea, Bound, Breakpoint, Electrolyte, Quantity

_CM_PER_UM = 1e-4


def breakpoint_figures(
    measured_hz: float | None,
    pore_resistance: Quantity | None,
    film_capacitance: Quantity | None,
    interface_capacitance: Quantity | None,
) -> Breakpoint | None:
    """Breakpoint and minimum phase of a reading; None where its pores do not conduct. `measured_hz`
    is where its own phase passes −45°, see `phase_crossings`. The quantities on one footing: all
    per area or all per specimen."""
    resistance, film = _held(pore_resistance), _held(film_capacitance)
    if resistance is None or film is None:
        return None
    from_fit = 1 / (2 * math.pi * resistance * film)
    interface = _held(interface_capacitance)
    if interface is None:
        said = "The capacitance of the interface is not known, so neither is how far f_b holds."
        return Breakpoint(measured_hz, from_fit, None, None, None, None, said)
    ratio = film / interface
    largest = float(table("interface")["largest_ratio"]["value"])
    if ratio > largest:
        said = (
            f"C_c/C_dl is {power_of_ten(ratio)}, above {largest:g}: the phase never passes −45°, "
            "so there is no breakpoint and no area can be had from it."
        )
        return Breakpoint(measured_hz, None, None, None, ratio, False, said)
    least_hz = math.sqrt((1 + ratio) / ratio) / (2 * math.pi * resistance * interface)
    least_deg = math.degrees(math.atan(2 * math.sqrt(ratio * (1 + ratio))))
    said = f"C_c/C_dl is {power_of_ten(ratio)}, within the limit of {largest:g}."
    if ratio > 0.01:
        said += " Above 0.01 an area from f_b and f_min is too small, by 3 percent and more."
    return Breakpoint(measured_hz, from_fit, least_hz, -least_deg, ratio, True, said)


def _held(quantity: Quantity | None) -> float | None:
    two_sided = quantity is not None and quantity.bound in (Bound.TWO_SIDED, Bound.FIXED)
    return quantity.value or None if two_sided and quantity is not None else None


def phase_crossings(on: Sequence[Grid], count: int) -> list[float | None]:
    """Highest frequency at which the used points' phase passes −45° from a capacitive stretch above
    it, Hz, for the `count` readings on the grids; interpolated on log f."""
    found: list[float | None] = [None] * count
    for grid in on:
        # The phase is above −45° where the real part outweighs the imaginary one.
        above = grid.impedance.real + grid.impedance.imag >= 0
        passes = above[:, :-1] & ~above[:, 1:]
        rows = np.flatnonzero(passes.any(axis=1))
        if not rows.size:
            continue
        low = passes.shape[1] - 1 - np.argmax(passes[rows, ::-1], axis=1)
        stop, start = np.log(np.array(grid.frequency))[[low, low + 1]]
        after, before = np.angle(grid.impedance[rows, [low, low + 1]]) + math.pi / 4
        crossing = np.exp(start + before / (before - after) * (stop - start))
        for row, frequency_hz in zip(rows.tolist(), crossing.tolist(), strict=True):
            found[grid.places[row]] = frequency_hz
    return found


@cache
def _bare_metal() -> tuple[float, float]:
    """Between which the double layer of bare metal lies, F/cm²."""
    data = table("interface")
    low, high = (data[f"bare_metal_capacitance_{end}"] for end in ("low", "high"))
    return float(low["value"]), float(high["value"])


@cache
def pore_resistivity(
    electrolyte: str, own: tuple[Electrolyte, ...] = ()
) -> tuple[float | None, str]:
    """Resistivity of the panel's electrolyte in Ω cm and its name; None where it is known that
    there is none to use. An electrolyte that neither the campaign nor the program recognises gets
    the usual one."""
    known = recognised(electrolyte, own)
    if known is not None:
        return known.resistivity_ohm_cm, known.name
    usual = float(table("interface")["default_resistivity"]["value"])
    return usual, f"{usual:g} Ω cm assumed"


def active_area(
    pore_resistance: Quantity | None,
    interface_capacitance: Quantity | None,
    found: Breakpoint | None,
    thickness_um: float | None,
    permittivity: float | None,
    electrolyte: str,
    own: tuple[Electrolyte, ...] = (),
) -> ActiveArea | None:
    """Active share of the area. Quantities per cm²; routes that lack what they need are left out,
    and None where none is left. Shares are between 0 and 1; a route that gives more than the whole
    area has failed and is said so. `own` are the campaign's electrolytes."""
    resistivity, named = pore_resistivity(electrolyte, own)
    routes: list[tuple[str, Quantity]] = []
    measured = None if found is None or found.valid is False else found.measured_hz
    if measured is not None and permittivity and resistivity:
        whole_hz, how = _breakpoint_of_all(permittivity, resistivity, named)
        share = measured / whole_hz
        routes.append(("breakpoint", Quantity(share, share, share, Bound.TWO_SIDED, "", how)))
    if interface_capacitance is not None and (value := _held(interface_capacitance)):
        low, high = _bare_metal()
        routes.append(
            (
                "double layer",
                Quantity(
                    value / math.sqrt(low * high),
                    (interface_capacitance.low or value) / high,
                    (interface_capacitance.high or value) / low,
                    Bound.TWO_SIDED,
                    "",
                    f"C_dl/C_dl⁰ with {low * 1e6:g}–{high * 1e6:g} µF/cm² for bare metal",
                ),
            )
        )
    if (
        thickness_um
        and resistivity
        and pore_resistance is not None
        and (value := _held(pore_resistance))
    ):
        path = resistivity * thickness_um * _CM_PER_UM
        routes.append(
            (
                "pores",
                Quantity(
                    path / value,
                    path / (pore_resistance.high or value),
                    path / (pore_resistance.low or value),
                    Bound.TWO_SIDED,
                    "",
                    f"ρL/R_po, {named}",
                ),
            )
        )
    return _bracketed(routes) if routes else None


@lru_cache(maxsize=256)
def _breakpoint_of_all(permittivity: float, resistivity: float, named: str) -> tuple[float, str]:
    """f_b⁰ in Hz, and how a share follows from it: the same for all readings of a panel."""
    whole_hz = 1 / (2 * math.pi * permittivity * VACUUM_F_PER_CM * resistivity)
    whole = hertz(float(f"{whole_hz:.2g}"))
    return whole_hz, f"f_b/f_b⁰, f_b⁰ = {whole} with ε_r = {permittivity:.1f}, {named}"


def _bracketed(routes: list[tuple[str, Quantity]]) -> ActiveArea:
    failed, kept = [], []
    low, high = 1.0, 0.0
    for name, q in routes:
        value, least, most = q.value or 0.0, q.low or 0.0, min(q.high or 0.0, 1.0)
        if value > 1:
            failed.append(name)
        low, high = min(low, least), max(high, most)
        if most != q.high or value > 1:
            q = Quantity(min(value, 1.0), least, most, q.bound, q.unit, q.method)
        kept.append((name, q))
    count = len(kept)
    between = f"Between {power_of_ten(low)} and {power_of_ten(high)}"
    said = f"{between} of the area, by {counted(count, 'route')}."
    if high > 10 * low > 0:
        said += f" They differ by {math.log10(high / low):.1f} decades: only the order is known."
    if failed:
        said += f" By the {' and the '.join(failed)} it would be more than all: that route fails."
    return ActiveArea(tuple(kept), low, high, said)
