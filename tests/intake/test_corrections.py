"""A dry run written as a table, corrected, and read back."""

from __future__ import annotations

import csv
import io
from pathlib import Path

import numpy as np
import pytest

from coatgui.intake import (
    Correction,
    Told,
    Unreadable,
    corrections_table,
    propose_folder,
    read_corrections,
    read_folder,
)

FREQUENCY = np.logspace(5, -2, 29)
S = 2j * np.pi * FREQUENCY
Z = 120 + 1 / (2e-9 * S**0.95 + 1 / (4e6 + 1 / (3e-7 * S**0.85)))


def written(heading: str, *columns: object) -> str:
    rows = zip(*[np.asarray(c).tolist() for c in columns], strict=True)
    return "\n".join([heading, *(";".join(map(repr, row)) for row in rows)]) + "\n"


@pytest.fixture
def folder(tmp_path: Path) -> Path:
    place = tmp_path / "in"
    place.mkdir()
    files = {
        "A1_24h.csv": written("f (Hz);Z' (ohm);Z'' (ohm)", FREQUENCY, Z.real, Z.imag),
        "=A2_24h.csv": written("f (Hz);Z' (mohm);Z'' (mohm)", FREQUENCY, Z.real, Z.imag * 2),
        "unnamed.csv": written("f (Hz);Z' (ohm);Z'' (ohm)", FREQUENCY, Z.real, Z.imag * 3),
        "A4_24h.csv": written("one;two;three", FREQUENCY, Z.imag, -Z.real * 4),
        "A5_24h.csv": written("f (Hz);Z' (ohm);Z'' (ohm)", FREQUENCY, Z.real, Z.imag * 5),
    }
    thousands = "\n".join(f"1,{100 + i};2,{300 + i};-3,{500 - i}" for i in range(29))
    files["A6_24h.csv"] = "f (kHz);Z' (ohm);-Z'' (ohm)\n" + thousands + "\n"
    for name, text in files.items():
        (place / name).write_text(text)
    return place


def corrected(folder: Path, said: dict[str, dict[str, str]]) -> dict[tuple[str, str], Correction]:
    run = propose_folder(folder)
    read = lambda name: (folder / name).read_bytes()  # noqa: E731
    table = corrections_table(run, read)
    rows = list(csv.DictReader(io.StringIO(table.decode("utf-8-sig"))))
    for row in rows:
        row.update(said.get(row["file"].lstrip("'"), {}))
    held = io.StringIO()
    writer = csv.DictWriter(held, list(rows[0]))
    writer.writeheader()
    writer.writerows(rows)
    return read_corrections(held.getvalue().encode("utf-8-sig"), run, read, {"A4": 10.0})


def test_what_is_not_touched_says_nothing(folder: Path) -> None:
    assert corrected(folder, {}) == {}


def test_every_kind_of_correction(folder: Path) -> None:
    said = corrected(
        folder,
        {
            "=A2_24h.csv": {"columns": "1 frequency [Hz]; 2 real [Mohm]; 3 imaginary [Mohm]"},
            "unnamed.csv": {"panel": "A3", "exposure_h": "168,5"},
            "A4_24h.csv": {"columns": "1 frequency [Hz]; 3 -real; 2 imaginary [ohm cm2]"},
            "A5_24h.csv": {"leave_out": "yes"},
            "A6_24h.csv": {"decimal_sign": ","},
        },
    )
    assert set(said) == {
        (file, "") for file in ("=A2_24h.csv", "unnamed.csv", "A4_24h.csv", "A5_24h.csv",
                                "A6_24h.csv")
    }  # fmt: skip
    readings = {r.panel: r for r in read_folder(folder, told=Told(corrections=said)).readings}
    assert set(readings) == {"A1", "=A2", "A3", "A4", "A6"}
    z = {panel: reading.spectrum.impedance_ohm for panel, reading in readings.items()}
    assert np.allclose(z["=A2"], (Z.real + 2j * Z.imag) * 1e6, rtol=1e-12)
    assert readings["A3"].exposure_h == 168.5
    assert np.allclose(z["A4"], Z.real * 4 + 0.1j * Z.imag, rtol=1e-12)
    assert z["A6"][0] == pytest.approx(2.328 - 1j * -3.472)
    assert readings["A6"].spectrum.frequency_hz[0] == pytest.approx(1128.0)


@pytest.mark.parametrize(
    ("change", "words"),
    [
        ({"file": "gone.csv"}, "there is no file 'gone.csv'"),
        ({"leave_out": "perhaps"}, "write yes or no"),
        ({"exposure_h": "soon"}, "not a number"),
        ({"exposure_h": "-1"}, "below zero"),
        ({"columns": "1 frequency; 2 height"}, "'2 height' is no column"),
        ({"columns": "1 frequency; 9 real"}, "there is no column 9"),
        ({"columns": "1 frequency; 2 real [furlong]"}, "no unit of the real"),
        ({"columns": "1 frequency; 2 real [ohm cm2]"}, "area is not known"),
        ({"decimal_sign": "'"}, "a point or a comma"),
    ],
)
def test_what_makes_no_sense_is_refused_with_its_line(
    folder: Path, change: dict[str, str], words: str
) -> None:
    with pytest.raises(Unreadable, match=f"Line [0-9].*{words}"):
        corrected(folder, {"A1_24h.csv": change})
