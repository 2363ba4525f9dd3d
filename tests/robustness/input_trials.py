"""Damaged input files through intake: no crash, no hang, no spectrum that is none.

    PYTHONPATH=. python tests/robustness/input_trials.py [TRIALS] [SEED]

A digit that became another digit is a measurement like any other; what can be asked is that
whatever is read is a spectrum (finite, positive frequencies) and whatever is not is refused in a
sentence. A trial that raises anything else, or takes longer than 20 s, is a failure and is named
by its number, from which it can be made again.
"""

from __future__ import annotations

import io
import signal
import sys
import tempfile
import traceback
from collections import Counter
from pathlib import Path
from random import Random
from types import FrameType

import numpy as np
from mutations import mutated

from coatgui.intake import read_files

PATIENCE_S = 20
_HEADINGS = {
    "comma.csv": ("freq / Hz,Z' / Ohm,-Z'' / Ohm", ",", "."),
    "german.txt": ("Frequenz/kHz;|Z|/kOhm;Phase/°", ";", ","),
    "tabs.dat": ("f\tRe(Z)\tIm(Z)", "\t", "."),
    "spaces.txt": ("", " ", "."),
}
_LISTS = {
    "panels.csv": "panel,formulation,area_cm2,thickness_um,remark\nA1,Grey,10.1,62,x\nB2,Blue,,,\n",
    "readings.csv": "file,panel,exposure_h\nA1_168h.csv,A1,168\nB2_24h.csv,B2,24\n",
}


def samples() -> list[tuple[str, bytes]]:
    """Small files of each kind that intake reads, with names by which it may know them."""
    frequency = np.logspace(5, -1, 19)
    impedance = 1e3 + 1e8 / (1 + 2j * np.pi * frequency * 1e8 * 1e-9)
    made = []
    for name, (heading, delimiter, point) in _HEADINGS.items():
        rows = [heading] if heading else []
        for f, z in zip(frequency, impedance, strict=True):
            one, two = z.real, -z.imag
            if "Phase" in heading:
                f, one, two = f / 1e3, abs(z) / 1e3, np.degrees(np.angle(z))
            elif not heading or "Im" in heading:
                two = z.imag
            row = delimiter.join(f"{number:.6e}" for number in (f, one, two))
            rows.append(row.replace(".", point))
        text = "\r\n".join([*rows, ""])
        made.append((f"A{len(made)}_168h{Path(name).suffix}", text.encode("utf-8")))
    made.append(("A1_24h.csv", made[0][1].decode().encode("utf-16")))
    made += [(name, text.encode()) for name, text in _LISTS.items()]
    # A workbook costs ten times a text: it has its share, but a small one.
    return [*made * 8, ("A1_7d.xlsx", _workbook(frequency, impedance))]


def _workbook(frequency: object, impedance: object) -> bytes:
    from openpyxl import Workbook

    book = Workbook()
    sheet = book.active
    sheet.append(["Frequency (Hz)", "Z' (Ohm)", "Z'' (Ohm)"])
    for f, z in zip(frequency, impedance, strict=True):  # type: ignore[call-overload]
        sheet.append([float(f), float(z.real), float(z.imag)])
    held = io.BytesIO()
    book.save(held)
    return held.getvalue()


class TooLong(Exception):
    pass


def _too_long(_signal: int, _frame: FrameType | None) -> None:
    raise TooLong


def trial(number: int, seed: int, kinds: list[tuple[str, bytes]], folder: Path) -> str:
    """What became of one damaged file: read, refused, or what went wrong."""
    random = Random(f"{seed}/{number}")
    name, content = random.choice(kinds)
    path = folder / name
    path.write_bytes(mutated(content, random))
    try:
        found = read_files([path])
    except TooLong:
        return "HANG"
    except Exception:
        return f"CRASH {traceback.format_exc()}"
    finally:
        path.unlink()
    for reading in found.readings:
        spectrum = reading.spectrum
        if not (
            np.isfinite(spectrum.impedance_ohm).all() and np.isfinite(spectrum.frequency_hz).all()
        ):
            return "NOT A SPECTRUM"
    if any("\n" in r.reason or not r.reason.strip() for r in found.refused):
        return "A REFUSAL THAT IS NO SENTENCE"
    return "read" if found.readings or found.panels else "refused"


def trials(count: int, seed: int, folder: Path) -> tuple[Counter[str], list[str]]:
    """Counts of what happened, and the failures."""
    kinds = samples()
    counts: Counter[str] = Counter()
    failures = []
    signal.signal(signal.SIGALRM, _too_long)
    for number in range(count):
        signal.alarm(PATIENCE_S)
        what = trial(number, seed, kinds, folder)
        signal.alarm(0)
        counts[what.split(" ")[0]] += 1
        if what not in ("read", "refused"):
            failures.append(f"trial {number}: {what}")
        if (number + 1) % 5000 == 0:
            print(f"{number + 1}: {dict(counts)}", flush=True)
    return counts, failures


if __name__ == "__main__":
    wanted = int(sys.argv[1]) if len(sys.argv) > 1 else 100_000
    with tempfile.TemporaryDirectory() as place:
        shown, wrong = trials(wanted, int(sys.argv[2]) if len(sys.argv) > 2 else 1, Path(place))
    print(f"{wanted} damaged input files: {dict(shown)}")
    print("\n".join(wrong[:20]))
    sys.exit(bool(wrong))
