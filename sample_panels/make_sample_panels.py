"""Makes the invented sample campaign: every file of this folder but this script and README.md.

    python sample_panels/make_sample_panels.py [FOLDER]

The formulas are written out here on their own, apart from the program's, so that the truth kept in
`truth.json` is an independent check of it. The same numbers come out on every run.
"""

from __future__ import annotations

import json
import sys
from dataclasses import asdict, dataclass
from pathlib import Path

import numpy as np

SEED = 20260307
TIMES_H = (1, 3, 8, 24, 72, 168, 336, 504, 672)
FREQUENCY_HZ = np.logspace(5, -2, 57)
OMEGA = 2.0 * np.pi * FREQUENCY_HZ
SCATTER = 0.003
TEMPERATURE_C = 23.0
LEADS_OHM, LEADS_F = 6e11, 6e-12


def water_permittivity(celsius: float) -> float:
    """Malmberg & Maryott 1956."""
    return 87.740 - 0.40008 * celsius + 9.398e-4 * celsius**2 - 1.410e-6 * celsius**3


def sorbed(hours: float, thickness_um: float, diffusion_cm2_s: float) -> float:
    """Share of the final uptake, film on metal, water from one face (Crank)."""
    fourier = diffusion_cm2_s * hours * 3600.0 / (thickness_um * 1e-4) ** 2
    n = np.arange(400)
    terms = np.exp(-((2 * n + 1) ** 2) * np.pi**2 * fourier / 4.0) / (2 * n + 1) ** 2
    return float(1.0 - 8.0 / np.pi**2 * terms.sum())


@dataclass
class Formulation:
    name: str
    area_cm2: float
    thickness_um: float
    permittivity: float
    exponent: float
    final_water: float
    diffusion_cm2_s: float
    pore_ohm_cm2: float
    pore_fall_per_decade: float  # decades of R_po lost per decade of time after 24 h
    metal_from_h: float
    diffusion_from_h: float


FORMULATIONS = {
    "K": Formulation(
        "K slow-cure epoxy", 14.6, 95.0, 4.6, 0.985, 0.018, 9e-10, 4e12, 0.25, 1e9, 1e9
    ),
    "M": Formulation(
        "M fast-cure epoxy", 14.6, 70.0, 5.2, 0.975, 0.032, 8e-10, 3e9, 0.75, 500, 1e9
    ),
    "P": Formulation("P waterborne", 12.6, 60.0, 5.8, 0.965, 0.052, 7e-10, 2e8, 1.1, 160, 500),
}


def cpe(q: float, n: float) -> np.ndarray:
    return 1.0 / (q * (1j * OMEGA) ** n)


def truth_of(key: str, number: int, hours: float, spread: np.ndarray) -> dict[str, float | str]:
    """What one panel is at one time, per specimen."""
    f = FORMULATIONS[key]
    dry = f.permittivity * 8.8541878e-14 / (f.thickness_um * 1e-4) * (1.0 + 0.03 * spread[0])
    share = sorbed(hours, f.thickness_um, f.diffusion_cm2_s)
    water = f.final_water * (1.0 + 0.05 * spread[1]) * share
    dried = (key, number) == ("M", 3) and hours in (336, 504)
    if dried:
        water *= 0.45
    wet = dry * water_permittivity(TEMPERATURE_C) ** water * f.area_cm2
    n = f.exponent
    # The film's element is set so that its capacitance at 10 kHz is the film's.
    q = wet * (2.0 * np.pi * 1e4) ** (1.0 - n) / np.sin(n * np.pi / 2.0)
    late = max(np.log10(hours / 24.0), 0.0)
    fall = f.pore_fall_per_decade * late
    early_failure = (key, number) == ("P", 4) and hours >= 72
    if early_failure:
        fall += 1.5
    if dried:
        fall -= 1.3
    pore = f.pore_ohm_cm2 * 10.0 ** (0.25 * spread[2] - fall) / f.area_cm2
    truth: dict[str, float | str] = {
        "R_s": 35.0 * (1.0 + 0.1 * spread[3]),
        "Q_c": q,
        "n_c": n,
        "R_po": pore,
        "family": "film",
        "capacitance_f_per_cm2": wet / f.area_cm2,
        "dry_capacitance_f_per_cm2": dry,
        "water_volume_percent": 100.0 * water,
    }
    if (hours >= f.metal_from_h or early_failure) and not dried:
        truth["family"] = "metal"
        # Large enough that |Z| at 0.1 Hz falls, as it should, when the metal begins to show.
        truth["Q_dl"] = 5e-8 * f.area_cm2 * (hours / 168.0) ** 0.8
        truth["n_dl"] = 0.84
        truth["R_ct"] = 12.0 * pore
        if hours >= f.diffusion_from_h:
            truth["family"] = "diffusion"
            truth["σ"] = 1.5 * pore
    return truth


def impedance_of(truth: dict[str, float | str]) -> np.ndarray:
    """What the instrument would measure, leads included, without scatter."""
    value = {k: float(v) for k, v in truth.items() if not isinstance(v, str)}
    inner: np.ndarray | float = value["R_po"]
    if "Q_dl" in value:
        reaction = value["R_ct"] + value.get("σ", 0.0) * (1.0 - 1.0j) / np.sqrt(OMEGA)
        inner = inner + 1.0 / (1.0 / cpe(value["Q_dl"], value["n_dl"]) + 1.0 / reaction)
    film = 1.0 / (1.0 / cpe(value["Q_c"], value["n_c"]) + 1.0 / inner)
    panel = value["R_s"] + film
    leads = 1.0 / LEADS_OHM + 1j * OMEGA * LEADS_F
    return 1.0 / (1.0 / panel + leads)


def rounded(truth: dict[str, float | str]) -> dict[str, float | str]:
    """To nine digits: machines differ in the last ones, and the files must not."""
    return {k: v if isinstance(v, str) else float(f"{v:.9g}") for k, v in truth.items()}


def scattered(z: np.ndarray, rng: np.random.Generator, share: float = SCATTER) -> np.ndarray:
    return z * (1.0 + share * (rng.standard_normal(z.size) + 1j * rng.standard_normal(z.size)))


# --- the dialects ---------------------------------------------------------------------------


def english(z: np.ndarray) -> bytes:
    lines = ["frequency_hz,real_ohm,imaginary_ohm"]
    lines += [f"{f:.6g},{v.real:.7g},{v.imag:.7g}" for f, v in zip(FREQUENCY_HZ, z, strict=True)]
    return ("\n".join(lines) + "\n").encode("utf-8")


def german(z: np.ndarray) -> bytes:
    lines = ["Prüfstand 2, Zelle 4", "", "Frequenz [kHz];Realteil [kΩ];-Imaginärteil [kΩ]"]
    for f, v in zip(FREQUENCY_HZ, z, strict=True):
        row = f"{f / 1e3:.6g};{v.real / 1e3:.7g};{-v.imag / 1e3:.7g}"
        lines.append(row.replace(".", ","))
    # The ohm sign has no place in this encoding; laboratories write it as a word.
    return ("\r\n".join(lines) + "\r\n").replace("kΩ", "kOhm").encode("cp1252")


def polar(z: np.ndarray) -> bytes:
    lines = ["Frequency (Hz)\t|Z| (ohm)\tphase (deg)"]
    for f, v in zip(FREQUENCY_HZ[::-1], z[::-1], strict=True):
        lines.append(f"{f:.6g}\t{abs(v):.7g}\t{np.degrees(np.angle(v)):.6f}")
    return ("\n".join(lines) + "\n").encode("utf-8-sig")


def bare(z: np.ndarray) -> bytes:
    rows = [f"{f:.6e}  {v.real:.7e}  {-v.imag:.7e}" for f, v in zip(FREQUENCY_HZ, z, strict=True)]
    return ("\n".join(rows) + "\n").encode("ascii")


def wide(z: np.ndarray) -> bytes:
    lines = ["Salt room, bench 1", "amplitude 10 mV", "", "f (Hz);Z' (Ω);Z'' (Ω)"]
    lines += [f"{f:.6g};{v.real:.7g};{v.imag:.7g}" for f, v in zip(FREQUENCY_HZ, z, strict=True)]
    return "\r\n".join(lines).encode("utf-16")


def stacked(series: list[tuple[float, np.ndarray]]) -> bytes:
    lines = ["exposure (h);frequency (Hz);Zreal (ohm);Zimag (ohm)"]
    for hours, z in series:
        for f, v in zip(FREQUENCY_HZ, z, strict=True):
            lines.append(f"{hours:g};{f:.6g};{v.real:.7g};{v.imag:.7g}".replace(".", ","))
    return ("\n".join(lines) + "\n").encode("utf-8")


DIALECTS = {
    "K1": (english, "csv"), "K2": (english, "csv"), "K3": (polar, "tsv"), "K4": (english, "csv"),
    "M1": (german, "txt"), "M2": (german, "txt"), "M3": (german, "txt"),
    "P1": (bare, "dat"), "P2": (bare, "dat"), "P3": (wide, "txt"), "P4": (english, "csv"),
}  # fmt: skip
STACKED = "M4"


def faulty(name: str, z: np.ndarray, rng: np.random.Generator) -> tuple[np.ndarray, str]:
    """The faults of single readings: what a laboratory meets now and then."""
    z = z.copy()
    if name == "K2_72h":
        z[30] *= 1.6
        return z, "wild point"
    if name == "M1_168h":
        # Of this sweep's points only the one at 100 Hz, twice 50 Hz, lies where mains are heard.
        z[np.abs(FREQUENCY_HZ - 100.0).argmin()] *= 1.25 * np.exp(0.2j)
        return z, "mains pick-up"
    if name == "P2_336h":
        slow = np.clip(np.log10(1.0 / FREQUENCY_HZ), 0.0, None)
        return z * (1.0 - 0.12 * slow), "low-frequency drift"
    if name == "P3_504h":
        z = scattered(z, rng, 0.25)
        z[:9] = z[:9].real * 1.0 + 0.35j * np.abs(z[:9])
        return z, "useless"
    return z, ""


def make(folder: Path) -> None:
    rng = np.random.default_rng(SEED)
    truth: dict[str, dict[str, object]] = {}
    files: dict[str, bytes] = {}
    stack: list[tuple[float, np.ndarray]] = []
    renamed: list[str] = []
    panels = ["panel,formulation,area_cm2,thickness_um,substrate,electrolyte,temperature_c,remark"]
    for key, f in FORMULATIONS.items():
        for number in range(1, 5):
            panel = f"{key}{number}"
            spread = rng.standard_normal(4)
            remark = "edge sealed twice" if panel == "K3" else ""
            panels.append(
                f"{panel},{f.name},{f.area_cm2},{f.thickness_um:g},blasted steel,"
                f"3 % sodium chloride,{TEMPERATURE_C:g},{remark}"
            )
            for hours in TIMES_H:
                known = truth_of(key, number, hours, spread)
                name = f"{panel}_{hours}h"
                z, fault = faulty(name, scattered(impedance_of(known), rng), rng)
                truth[name] = {
                    "panel": panel,
                    "exposure_h": hours,
                    "fault": fault,
                    **rounded(known),
                }
                if panel == STACKED:
                    stack.append((hours, z))
                    continue
                write, ending = DIALECTS[panel]
                file = f"{name}.{ending}"
                if panel == "P3" and hours >= 504:
                    file = f"bench 1 {panel} week {hours // 168}.{ending}"
                    renamed.append(f"{file},{panel},{hours},{TEMPERATURE_C:g},10,")
                files[file] = write(z)
    files[f"{STACKED}.csv"] = stacked(stack)
    # Refused on purpose: cut short, no table, the same bytes twice.
    files["K4_3h.csv"] = b",".join(files["K4_3h.csv"].split(b",")[:64])
    files["notes.txt"] = (
        b"Bench 1 was moved to the window side in week two.\nNothing else changed.\n"
    )
    files["K1_24h_again.csv"] = files["K1_24h.csv"]
    leads = 1.0 / (1.0 / LEADS_OHM + 1j * OMEGA * LEADS_F)
    files["open_lead.csv"] = english(scattered(leads, rng, 0.01))
    files["panels.csv"] = ("\n".join(panels) + "\n").encode("utf-8")
    heading = "file,panel,exposure_h,temperature_c,amplitude_mv,remark"
    files["readings.csv"] = ("\n".join([heading, *renamed]) + "\n").encode("utf-8")
    about = {
        "invented": True,
        "seed": SEED,
        "scatter": SCATTER,
        "formulations": {key: asdict(f) for key, f in FORMULATIONS.items()},
        "refused": ["K4_3h.csv", "notes.txt", "K1_24h_again.csv"],
        "readings": truth,
    }
    text = json.dumps(about, indent=1, ensure_ascii=False) + "\n"
    files["truth.json"] = text.encode("utf-8")
    folder.mkdir(parents=True, exist_ok=True)
    for file, content in sorted(files.items()):
        (folder / file).write_bytes(content)


if __name__ == "__main__":
    make(Path(sys.argv[1]) if len(sys.argv) > 1 else Path(__file__).resolve().parent)
