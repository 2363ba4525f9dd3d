"""A matrix of dialects: every file is read to the exact numbers or asked about, none wrongly."""

from __future__ import annotations

import random
from collections.abc import Iterator
from dataclasses import dataclass
from itertools import product

import numpy as np
import pytest

from coatgui.intake import Unclear, read_spectra
from coatgui.records import ComplexArray, FloatArray

FREQUENCY = np.logspace(5, -2, 29)
S = 2j * np.pi * FREQUENCY


def impedance(size: float) -> ComplexArray:
    """A film with pores and an interface, `size` times as resistive as the first."""
    film = 2e-9 * S**0.95 / size
    return np.asarray(120 * size + 1 / (film + 1 / (4e6 * size + 1 / (3e-7 * S**0.85))))


HEADINGS: dict[str, dict[str, str]] = {
    "English": {"f": "Frequency", "w": "Angular frequency", "re": "Real part",
                "im": "Imaginary part", "mod": "Modulus", "ph": "Phase", "t": "Exposure time",
                "panel": "Panel", "preamble": "Bench 3, second cell"},
    "German": {"f": "Frequenz", "w": "Kreisfrequenz", "re": "Realteil", "im": "Imaginärteil",
               "mod": "Betrag", "ph": "Phasenwinkel", "t": "Auslagerungszeit", "panel": "Probe",
               "preamble": "Prüfstand 3, Zelle 2"},
    "French": {"f": "Fréquence", "w": "Pulsation", "re": "Partie réelle",
               "im": "Partie imaginaire", "mod": "Module", "ph": "Déphasage",
               "t": "Temps d'exposition", "panel": "Échantillon", "preamble": "Banc n° 3"},
    "Spanish": {"f": "Frecuencia", "w": "Frecuencia angular", "re": "Parte real",
                "im": "Parte imaginaria", "mod": "Módulo", "ph": "Ángulo de fase",
                "t": "Tiempo de exposición", "panel": "Muestra", "preamble": "Banco 3"},
    "Portuguese": {"f": "Frequência", "w": "Frequência angular", "re": "Parte real",
                   "im": "Parte imaginária", "mod": "Módulo", "ph": "Ângulo de fase",
                   "t": "Tempo de exposição", "panel": "Amostra", "preamble": "Bancada 3"},
    "Italian": {"f": "Frequenza", "w": "Pulsazione", "re": "Parte reale",
                "im": "Parte immaginaria", "mod": "Modulo", "ph": "Fase",
                "t": "Tempo di esposizione", "panel": "Campione", "preamble": "Banco 3"},
    "symbols": {"f": "f", "w": "ω", "re": "Z'", "im": "Z''", "mod": "|Z|", "ph": "φ", "t": "t",
                "panel": "Panel", "preamble": "Z 3"},
    "none": {},
}  # fmt: skip
# Unit and factor of frequency, of impedance, and unit of the phase.
UNITS = {
    "plain": ("Hz", 1.0, "Ohm", 1.0, "deg"),
    "kilo": ("kHz", 1e3, "kOhm", 1e3, "rad"),
    "mega": ("MHz", 1e6, "MΩ", 1e6, "°"),
}
PLACES = ("brackets", "slash", "last word", "own row", "preamble")
LAYOUTS = ("one", "polar", "headed blocks", "bare blocks", "columns", "side by side",
           "side by side, one frequency", "admittance", "capacitance", "angular frequency",
           "parallel", "series", "sweeps", "complex cells")  # fmt: skip
NUMBERS = ("shortest", "exponents", "three decimals", "parted thousands")


@dataclass(frozen=True)
class Dialect:
    delimiter: str
    decimal_sign: str
    encoding: str
    language: str
    units: str
    place: str
    turned: bool
    ascending: bool
    layout: str
    numbers: str


def matrix(count: int, seed: int = 7) -> list[Dialect]:
    """That many of all dialects that a file can have, drawn once and for all."""
    return random.Random(seed).sample(list(_possible()), count)


def _possible() -> Iterator[Dialect]:
    for case in product(
        (",", ";", "\t", "|", "   "),
        (".", ","),
        ("utf-8", "utf-8-sig", "utf-16", "latin-1", "cp1252"),
        HEADINGS,
        UNITS,
        PLACES,
        (False, True),
        (False, True),
        LAYOUTS,
        NUMBERS,
    ):
        d = Dialect(*case)
        blanks = d.delimiter == "   "
        needs_headings = d.layout in (*LAYOUTS[4:12],)
        if d.language == "none" and (d.units != "plain" or d.place != "brackets" or needs_headings):
            continue
        if d.encoding in ("latin-1", "cp1252") and (d.units == "mega" or d.language == "symbols"):
            continue  # there is no Ω, ω or φ
        if d.place == "preamble" and d.layout in (*LAYOUTS[7:12],):
            continue
        if d.layout in ("parallel", "series") and d.turned:
            continue  # a resistance and a capacitance have no sign to turn
        if d.layout == "complex cells" and (d.turned or d.numbers == "parted thousands"):
            continue
        if d.layout == "complex cells" and d.delimiter == d.decimal_sign:
            continue
        if blanks and d.layout.startswith("side") and d.language != "none":
            continue  # labels over groups need cells that may be empty
        yield d


def _written(value: float, how: str, sign: str, delimiter: str) -> tuple[str, float]:
    """The number as text, and what that text says exactly."""
    if how == "exponents":
        plain = f"{value:.6E}"
    elif how == "shortest":
        plain = repr(float(value))
    else:
        plain = f"{value:.3f}" if abs(value) >= 10 else f"{value:.9f}"
    said = float(plain)
    if how == "parted thousands":
        gap = {".": ",", ",": "."}[sign] if delimiter != "   " else "'"
        minus, digits = plain[: plain.startswith("-")], plain.lstrip("-")
        whole, _, rest = digits.partition(".")
        return minus + f"{int(whole):,}".replace(",", gap) + sign + rest, said
    return plain.replace(".", sign), said


def write(d: Dialect) -> tuple[bytes, list[tuple[float | None, FloatArray, ComplexArray]]]:
    """The file, and of each spectrum in it the exposure time that it names, the frequencies and
    the impedances, highest frequency first."""
    words = HEADINGS[d.language]
    f_unit, f_factor, z_unit, z_factor, p_unit = UNITS[d.units]
    lines: list[str] = []
    expected: list[tuple[float | None, FloatArray, ComplexArray]] = []

    def joined(cells: list[str]) -> str:
        if d.delimiter != "   ":
            cells = [f'"{c}"' if d.delimiter in c else c for c in cells]
        return d.delimiter.join(cells)

    def columns(size: float) -> tuple[list[list[str]], FloatArray, ComplexArray]:
        """Cells row by row, and what they say."""
        z = impedance(size)
        f, f_scale = FREQUENCY / f_factor, f_factor
        a, b = z.real / z_factor, z.imag / z_factor
        if d.layout == "polar":
            a, b = np.abs(z) / z_factor, np.angle(z)
            b = b if p_unit == "rad" else np.degrees(b)
        elif d.layout == "admittance":
            a, b = (1 / z).real * 1e6, (1 / z).imag * 1e6
        elif d.layout == "capacitance":
            c = 1 / (S * z)
            a, b = c.real * 1e9, -c.imag * 1e9
        elif d.layout == "parallel":
            a, b = 1 / (1 / z).real / z_factor, (1 / z / S).real * 1e9
        elif d.layout == "series":
            b = -1 / (2 * np.pi * FREQUENCY * z.imag) * 1e9
        elif d.layout == "angular frequency":
            f, f_scale = 2 * np.pi * FREQUENCY, 1 / (2 * np.pi)
        b = -b if d.turned else b
        rows = [
            [_written(float(v), d.numbers, d.decimal_sign, d.delimiter) for v in row]
            for row in zip(f, a, b, strict=True)
        ]
        said = np.array([[value for _, value in row] for row in rows])
        f, a, b = said[:, 0] * f_scale, said[:, 1], said[:, 2] * (-1 if d.turned else 1)
        if d.layout == "polar":
            z = a * z_factor * np.exp(1j * (b if p_unit == "rad" else np.radians(b)))
        elif d.layout == "admittance":
            z = 1e6 / (a + 1j * b)
        elif d.layout == "capacitance":
            z = 1 / (2j * np.pi * f * (a - 1j * b) * 1e-9)
        elif d.layout == "parallel":
            z = 1 / (1 / (a * z_factor) + 2j * np.pi * f * b * 1e-9)
        elif d.layout == "series":
            z = a * z_factor + 1 / (2j * np.pi * f * b * 1e-9)
        else:
            z = (a + 1j * b) * z_factor
        cells = [[text for text, _ in row] for row in rows]
        if d.layout == "complex cells":
            cells = [[f, f"{a}{'' if b.startswith('-') else '+'}{b}j"] for f, a, b in cells]
        return (cells[::-1] if d.ascending else cells), f, z

    def headings(named: list[tuple[str, str]]) -> None:
        form = {"brackets": "{} ({})", "slash": "{} / {}", "last word": "{} {}"}.get(d.place)
        cells = [form.format(n, u) if form and u else n for n, u in named]
        lines.append(joined(cells))
        if d.place == "own row":
            lines.append(joined([u for _, u in named]))

    named: list[tuple[str, str]] = []
    if words:
        minus = "-" if d.turned else ""
        first, second = (words["re"], z_unit), (minus + words["im"], z_unit)
        if d.layout == "polar":
            first, second = (words["mod"], z_unit), (minus + words["ph"], p_unit)
        elif d.layout == "admittance":
            first, second = ("Y'", "uS"), (minus + "Y''", "uS")
        elif d.layout == "capacitance":
            first, second = ("C'", "nF"), (minus + "C''", "nF")
        elif d.layout in ("parallel", "series"):
            first, second = (f"R{d.layout[0]}", z_unit), (f"C{d.layout[0]}", "nF")
        named = [(words["f"], f_unit), first, second]
        if d.layout == "complex cells":
            named = [named[0], ("Z", z_unit)]
        if d.layout == "angular frequency":
            named[0] = (words["w"], "rad/s")
        lines.append(words["preamble"])
        if d.place == "preamble":
            lines.append("Units: " + ", ".join(dict.fromkeys(unit for _, unit in named)))

    def add(size: float, hours: float | None) -> list[list[str]]:
        cells, f, z = columns(size)
        expected.append((hours, f, z))
        return cells

    if d.layout in ("headed blocks", "bare blocks"):
        for size, hours in ((1, 24), (2, 168), (3, 336)):
            headed = d.layout == "headed blocks"
            if headed and named:
                lines.append(f"Exposure: {hours} h")
            if named and (headed or size == 1):
                headings(named)
            if not headed:
                lines.append(f"{hours} h")
            lines += map(joined, add(size, hours if named or not headed else None))
            lines.append("")
    elif d.layout == "columns":
        time = (words["t"], "h") if d.place != "preamble" else (words["t"] + " (h)", "")
        headings([time, (words["panel"], ""), *named])
        for size, hours in ((1, 24), (2, 168)):
            lines += [joined([str(hours), "A1", *row]) for row in add(size, hours)]
    elif d.layout.startswith("side"):
        one, two = add(1, 24), add(2, 168)
        if d.layout == "side by side":
            lines.append(joined(["24 h", "", "", "168 h", "", ""]))
            headings(named * 2)
            lines += [joined(a + b) for a, b in zip(one, two, strict=True)]
        else:
            lines.append(joined(["", "24 h", "", "168 h", ""]))
            headings([named[0], *named[1:], *named[1:]])
            lines += [joined(a + b[1:]) for a, b in zip(one, two, strict=True)]
    else:
        if named:
            headings(named)
        for size in (1, 2) if d.layout == "sweeps" else (1,):
            lines += map(joined, add(size, None))
    return ("\r\n".join(lines) + "\r\n").encode(d.encoding), expected


MATRIX = matrix(2100)
MOST_ASKED = 0.02


def outcome(d: Dialect) -> str:
    data, expected = write(d)
    try:
        found = read_spectra(data)
    except Unclear:
        return "asked"
    assert len(found) == len(expected), d
    for piece, (hours, frequency, impedance) in zip(found, expected, strict=True):
        assert hours is None or piece.exposure_h == hours, d
        assert np.allclose(piece.spectrum.frequency_hz, frequency, rtol=1e-12), d
        assert np.allclose(piece.spectrum.impedance_ohm, impedance, rtol=1e-11), d
    return "read"


@pytest.mark.parametrize("chunk", range(12))
def test_every_dialect_is_read_to_the_numbers_or_asked_about(chunk: int) -> None:
    outcomes = [outcome(d) for d in MATRIX[chunk::12]]
    assert outcomes.count("asked") <= MOST_ASKED * len(outcomes)


def test_the_matrix_holds_every_value_of_every_axis() -> None:
    assert len(set(MATRIX)) >= 2000
    for axis, count in (("delimiter", 5), ("decimal_sign", 2), ("encoding", 5), ("language", 8),
                        ("units", 3), ("place", 5), ("layout", 14), ("numbers", 4)):  # fmt: skip
        assert len({getattr(d, axis) for d in MATRIX}) == count
