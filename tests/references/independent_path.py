"""From the sample files to the order of the formulations by another path: numpy and scipy alone.

Nothing of the program is used, neither its reading of files nor its fits. Everything is as simple
as it can be: |Z| is read off at 0.1 Hz, R_s + 1/(Q(jω)^n + G) is laid on the points from 1 kHz up,
Fick's law for one face on the logarithm of the capacitance. Run it with
`python tests/references/independent_path.py` to see the numbers.
"""

from __future__ import annotations

import csv
import re
from dataclasses import dataclass
from pathlib import Path

import numpy as np
from scipy.optimize import least_squares

SAMPLE = Path(__file__).parents[2] / "sample_panels"
WATER = 87.740 - 0.40008 * 23 + 9.398e-4 * 23**2 - 1.410e-6 * 23**3  # Malmberg and Maryott, 23 °C


@dataclass
class Result:
    """|Z|·A at 0.1 Hz in Ω cm²; capacitance in F/cm², water in vol-%, None where the fit misses."""

    panel: str
    hours: float
    modulus: float
    capacitance: float | None
    water: float | None = None


def _text(path: Path) -> str:
    raw = path.read_bytes()
    if raw.startswith(b"\xff\xfe"):
        return raw.decode("utf-16")
    try:
        return raw.decode("utf-8-sig")
    except UnicodeDecodeError:
        return raw.decode("cp1252")


def _rows(path: Path) -> tuple[str, np.ndarray]:
    """The words before the table, and the table."""
    words, rows = "", []
    for line in _text(path).splitlines():
        if ";" in line:
            cells = line.replace(",", ".").split(";")
        else:
            cells = next(csv.reader([line])) if "," in line else line.split()
        try:
            rows.append([float(cell) for cell in cells])
        except ValueError:
            words += line
    width = max((len(row) for row in rows), default=0)
    return words, np.array([row for row in rows if len(row) == width])


def _spectrum(words: str, rows: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    frequency, first, second = rows[:, -3:].T
    polar = "|Z|" in words
    impedance = first * np.exp(1j * np.radians(second)) if polar else first + 1j * second
    if np.median(impedance.imag) > 0:
        impedance = impedance.conj()
    kilo = 1e3 if "kHz" in words else 1.0
    order = np.argsort(frequency)
    return kilo * frequency[order], (1e3 if "kOhm" in words else 1.0) * impedance[order]


def spectra() -> dict[tuple[str, float], tuple[np.ndarray, np.ndarray]]:
    """All whole spectra by panel and hours; a file that is there twice comes once."""
    found = {}
    with (SAMPLE / "readings.csv").open(encoding="utf-8", newline="") as file:
        named = {r["file"]: (r["panel"], float(r["exposure_h"])) for r in csv.DictReader(file)}
    for path in sorted(SAMPLE.iterdir()):
        match = re.fullmatch(r"([KMP]\d)_(\d+)h\.\w+", path.name)
        if match:
            named[path.name] = match[1], float(match[2])
        if path.name in named:
            words, rows = _rows(path)
            if len(rows) > 40:
                found[named[path.name]] = _spectrum(words, rows)
    words, rows = _rows(SAMPLE / "M4.csv")
    for hours in np.unique(rows[:, 0]):
        found["M4", float(hours)] = _spectrum(words, rows[rows[:, 0] == hours])
    return found


def _film(frequency: np.ndarray, impedance: np.ndarray) -> float | None:
    """Capacitance of the film at 10 kHz in F; single wild points count little."""
    high = frequency >= 1e3
    s, z = 2j * np.pi * frequency[high], impedance[high]

    def miss(p: np.ndarray) -> np.ndarray:
        resistance, q, n, conductance = np.exp(p)
        share = (resistance + 1 / (q * s**n + conductance)) / z - 1
        return np.concatenate([share.real, share.imag])

    guess = np.abs(1 / (z.imag * s.imag))
    # The conductance is that of a film that blocks, or of one with open pores.
    starts = [np.log([50.0, np.median(guess), 0.97, g]) for g in (1e-9, 1e-6)]
    bounds = np.log([1.0, 1e-13, 0.5, 1e-14]), np.log([1e5, 1e-5, 1.0, 1e-2])
    fits = [
        least_squares(miss, start, bounds=bounds, loss="soft_l1", f_scale=0.005, x_scale="jac")
        for start in starts
    ]
    fit = min(fits, key=lambda fit: fit.cost)
    if np.median(np.abs(miss(fit.x))) > 0.02:
        return None
    _, q, n, _ = np.exp(fit.x)
    return float(q * np.sin(n * np.pi / 2) * (2e4 * np.pi) ** (n - 1))


def uptake(x: np.ndarray) -> np.ndarray:
    """M_t/M_∞ of a sheet open on one face, 200 terms of Crank's series in x = Dt/L²."""
    odd = 2 * np.arange(200) + 1
    return 1 - 8 / np.pi**2 * (np.exp(-(odd**2) * np.pi**2 / 4 * x[:, None]) / odd**2).sum(axis=1)


def _dry(hours: np.ndarray, logarithm: np.ndarray) -> float:
    """ln C of the dry film."""

    def miss(p: np.ndarray) -> np.ndarray:
        return p[0] + p[1] * uptake(np.exp(p[2]) * hours) - logarithm

    fits = [
        least_squares(
            miss, [logarithm[0], np.ptp(logarithm), np.log(rate)], loss="soft_l1", f_scale=0.003
        )
        for rate in (0.003, 0.03, 0.3)
    ]
    return float(min(fits, key=lambda fit: fit.cost).x[0])


def results() -> list[Result]:
    with (SAMPLE / "panels.csv").open(encoding="utf-8", newline="") as file:
        areas = {row["panel"]: float(row["area_cm2"]) for row in csv.DictReader(file)}
    frequency, impedance = _spectrum(*_rows(SAMPLE / "open_lead.csv"))
    at = np.argmin(np.abs(np.log(frequency / 1e4)))
    leads = float((1 / impedance[at]).imag / (2e4 * np.pi))
    found = []
    for (panel, hours), (f, z) in sorted(spectra().items()):
        modulus = np.exp(np.interp(np.log(0.1), np.log(f), np.log(np.abs(z))))
        film = _film(f, z)
        per_cm2 = None if film is None else (film - leads) / areas[panel]
        found.append(Result(panel, hours, float(modulus) * areas[panel], per_cm2))
    for panel in areas:
        own = [r for r in found if r.panel == panel and r.capacitance]
        logarithm = np.log([r.capacitance or 1.0 for r in own])
        dry = _dry(np.array([r.hours for r in own]), logarithm)
        for result, value in zip(own, logarithm, strict=True):
            result.water = float(100 * (value - dry) / np.log(WATER))
    return found


def order(found: list[Result]) -> list[str]:
    """Formulations from best to worst by the mean log |Z| at 0.1 Hz at the last inspection."""
    last = max(r.hours for r in found)
    means = {}
    for name in "KMP":
        own = [np.log10(r.modulus) for r in found if r.panel[0] == name and r.hours == last]
        means[name] = np.mean(own)
    return sorted(means, key=lambda name: -means[name])


if __name__ == "__main__":
    import sys

    table = results()
    for r in table:
        film = "–" if r.capacitance is None else f"{r.capacitance:.4g}"
        water = "–" if r.water is None else f"{r.water:.2f}"
        line = f"{r.panel} {r.hours:g} h: {r.modulus:.4g} Ω cm², {film} F/cm², {water} vol-%"
        sys.stdout.write(line + "\n")
    sys.stdout.write(f"best to worst: {', '.join(order(table))}\n")
