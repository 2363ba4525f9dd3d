"""From a table to spectra: sign of the imaginary part, stacked exposure times, several panels."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from coatgui.intake.decode import Unreadable
from coatgui.intake.table import Table
from coatgui.records import ComplexArray, Dialect, FloatArray, Spectrum

_FEWEST_POINTS = 5


@dataclass(frozen=True)
class Piece:
    """One spectrum of a file; `exposure_h` and `panel` where the file itself names them."""

    spectrum: Spectrum
    part: str
    exposure_h: float | None
    panel: str
    dialect: Dialect


def pieces(table: Table, encoding: str, delimiter: str, decimal_sign: str) -> list[Piece]:
    """All spectra of a table. Raises Unreadable."""
    frequency = table.values("frequency")
    if frequency is None:
        omega = table.values("angular_frequency")
        assert omega is not None
        frequency = omega / (2.0 * np.pi)
    usable = np.isfinite(frequency) & (frequency > 0)
    if not usable.all():
        line = table.lines[int(np.argmin(usable))]
        raise Unreadable(
            f"Line {line}: the frequency is not a positive number; correct or remove the line."
        )
    impedance, remarks = _impedance(table)
    # Zero is what an instrument writes for a point that it did not measure.
    usable = np.isfinite(impedance) & (impedance != 0)
    if not usable.all():
        line = table.lines[int(np.argmin(usable))]
        raise Unreadable(
            f"Line {line}: the impedance is zero or not a finite number, so this point was not "
            "measured; correct or remove the line."
        )
    groups = _groups(table)
    result = []
    for (hours, panel), rows in groups.items():
        if rows.size < _FEWEST_POINTS:
            where = f" of {hours:g} h" if hours is not None else ""
            raise Unreadable(
                f"The spectrum{where} has only {rows.size} points: at least {_FEWEST_POINTS} are "
                "needed."
            )
        words = [f"{hours:g} h"] if hours is not None and len(groups) > 1 else []
        if panel and len({key[1] for key in groups}) > 1:
            words.insert(0, panel)
        own = frequency[rows]
        dialect = Dialect(
            encoding,
            delimiter,
            decimal_sign,
            table.first_line,
            table.columns,
            bool(own[0] < own[-1]),
            (*table.remarks, *remarks),
        )
        spectrum = Spectrum(own, impedance[rows])
        result.append(Piece(spectrum, ", ".join(words), hours, panel, dialect))
    return result


def _groups(table: Table) -> dict[tuple[float | None, str], np.ndarray]:
    """Rows of each exposure time and panel, in the order they come."""
    hours = table.values("time")
    if hours is not None and np.unique(hours).size > max(1, hours.size // _FEWEST_POINTS):
        hours = None  # a clock that runs through the sweep, not an exposure time
    place = table.place("panel")
    labels = table.words.get(place, ()) if place is not None else ()
    size = table.numbers.shape[0]
    keys = [
        (None if hours is None else float(hours[i]), labels[i] if labels else "")
        for i in range(size)
    ]
    found: dict[tuple[float | None, str], list[int]] = {}
    for i, key in enumerate(keys):
        found.setdefault(key, []).append(i)
    return {key: np.array(rows) for key, rows in found.items()}


def _impedance(table: Table) -> tuple[ComplexArray, list[str]]:
    """Impedance (R,) with a capacitor's imaginary part negative, and what was done for it."""
    real, imaginary = table.values("real"), table.values("imaginary")
    if real is not None and imaginary is not None:
        column = next(c for c in table.columns if c.role == "imaginary")
        told = column.factor < 0
        turned, remarks = _turned(imaginary, told, "imaginary part")
        return real + 1j * turned, remarks
    modulus, phase = table.values("modulus"), table.values("phase")
    assert modulus is not None
    assert phase is not None
    column = next(c for c in table.columns if c.role == "phase")
    remarks = []
    if not column.unit:
        degrees = bool(np.abs(phase).max() > 3.2)
        remarks.append(
            f"The heading of the phase names no unit; its size says "
            f"{'degrees' if degrees else 'radians'}."
        )
        phase = np.deg2rad(phase) if degrees else phase
    turned, more = _turned(phase, column.factor < 0, "phase")
    return np.asarray(modulus * np.exp(1j * turned), dtype=np.complex128), remarks + more


def _turned(values: FloatArray, told: bool, name: str) -> tuple[FloatArray, list[str]]:
    """The sign that makes a panel capacitive: a coated panel's points are so, nearly all of them,
    so where most are not, the file counts the other way round. A few points of the other sign in
    a spectrum are kept as measured."""
    if np.median(np.sign(values)) > 0:
        how = "against its heading " if told else ""
        return -values, [f"The {name} is counted {how}with the opposite sign and was turned."]
    return values, []
