"""From columns with a meaning to impedance: which columns are used, and what is made of them.

Conventions for `values`: a capacitor has a negative imaginary part and phase of Z, a positive
imaginary part and phase of Y, and C* = C' − jC" with C" > 0 for a loss. A bridge's equivalent
circuits are Y = 1/R_p + jωC_p (or G + jωC_p) in parallel and Z = R_s + 1/(jωC_s) in series.
"""

from __future__ import annotations

from collections.abc import Collection, Mapping

import numpy as np

from coatgui.intake.errors import NoSpectrum, Unclear
from coatgui.records import ComplexArray, FloatArray

# Pairs of roles that give the impedance, the first that is complete is used.
WAYS = (
    ("real", "imaginary"),
    ("modulus", "phase"),
    ("log_modulus", "phase"),
    ("admittance_real", "admittance_imaginary"),
    ("admittance_modulus", "admittance_phase"),
    ("capacitance_real", "capacitance_imaginary"),
    ("parallel_resistance", "parallel_capacitance"),
    ("series_resistance", "series_capacitance"),
    ("admittance_real", "parallel_capacitance"),
)
FREQUENCY_ROLES = ("frequency", "angular_frequency", "log_frequency", "log_angular_frequency")
# Roles whose sign files disagree about, with the sign that a capacitive panel gives them.
CAPACITIVE_SIGN = {
    "imaginary": -1.0,
    "phase": -1.0,
    "admittance_imaginary": 1.0,
    "admittance_phase": 1.0,
    "capacitance_imaginary": 1.0,
}
ANGLES = ("phase", "admittance_phase")
_AGREE = 0.03


def way_of(roles: Collection[str]) -> tuple[str, str]:
    """The pair of roles to use. Raises NoSpectrum where none is complete."""
    if not any(role in roles for role in FREQUENCY_ROLES):
        raise NoSpectrum("No column is headed as a frequency: name one 'frequency'.")
    for way in WAYS:
        if all(role in roles for role in way):
            return way
    raise NoSpectrum(
        "The headings name neither real and imaginary part nor modulus and phase: name the two "
        "columns of the impedance."
    )


def frequency_of(values: Mapping[str, FloatArray]) -> FloatArray:
    """Frequency in Hz."""
    role = next(role for role in FREQUENCY_ROLES if role in values)
    found = values[role]
    return found / (2.0 * np.pi) if role.endswith("angular_frequency") else found


def impedance_of(
    values: Mapping[str, FloatArray], way: tuple[str, str], frequency_hz: FloatArray
) -> ComplexArray:
    """Impedance in Ω (or Ω cm²). A point that was not measured comes out zero or not finite."""
    first, second = values[way[0]], values[way[1]]
    with np.errstate(all="ignore"):
        if way[0] in ("modulus", "log_modulus"):
            result = np.where(first > 0, first, np.nan) * np.exp(1j * second)
        elif way[0] == "real":
            result = first + 1j * second
        elif way == ("admittance_real", "admittance_imaginary"):
            result = 1.0 / (first + 1j * second)
        elif way == ("parallel_resistance", "parallel_capacitance"):
            result = 1.0 / (1.0 / first + 2j * np.pi * frequency_hz * second)
        elif way[0] == "series_resistance":
            result = first + 1.0 / (2j * np.pi * frequency_hz * second)
        elif way[1] == "parallel_capacitance":
            result = 1.0 / (first + 2j * np.pi * frequency_hz * second)
        elif way[0] == "admittance_modulus":
            result = np.exp(-1j * second) / np.where(first > 0, first, np.nan)
        else:
            result = 1.0 / (2j * np.pi * frequency_hz * (first - 1j * second))
    return np.asarray(result, dtype=np.complex128)


def refuse_contradiction(values: Mapping[str, FloatArray], impedance: ComplexArray) -> None:
    """Where the file gives the modulus besides the parts used, it must say the same. Raises
    Unclear."""
    modulus = values.get("modulus", values.get("log_modulus"))
    if modulus is None:
        return
    size = np.abs(impedance)
    good = np.isfinite(size) & np.isfinite(modulus) & (modulus > 0)
    if good.any() and np.median(np.abs(size[good] / modulus[good] - 1.0)) > _AGREE:
        raise Unclear(
            "The columns of real and imaginary part and the column of the modulus contradict each "
            "other: say which columns and units are right."
        )


def expected_phase(frequency_hz: FloatArray, modulus: FloatArray) -> FloatArray:
    """The phase that goes with the slope of |Z|, in rad, by Bode's gain-phase relation in its
    local form φ ≈ (π/2)·d ln|Z|/d ln f: rough, but enough to tell degrees from radians. Points
    must run in the order of frequency, none twice."""
    slope = np.gradient(np.log(modulus), np.log(frequency_hz))
    return np.asarray(np.clip(slope, -1.2, 1.2) * np.pi / 2.0)
