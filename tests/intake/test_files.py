"""Single files and folders: what is refused and why, stacked times, names, lists, doubles."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest

from coatgui.intake import Unreadable, UnreadableFolder, read_files, read_folder, read_spectra

FREQUENCY = np.logspace(5, -2, 29)
S = 2j * np.pi * FREQUENCY
IMPEDANCE = 120 + 1 / (2e-9 * S**0.95 + 1 / (4e6 + 1 / (3e-7 * S**0.85)))

BASE = "frequency_hz,real_ohm,imaginary_ohm\n" + "\n".join(
    f"{f!r},{z.real!r},{z.imag!r}"
    for f, z in zip(FREQUENCY.tolist(), IMPEDANCE.tolist(), strict=True)
)


def with_point(second_and_third: str) -> bytes:
    lines = BASE.splitlines()
    lines[3] = f"{lines[3].split(',')[0]},{second_and_third}"
    return "\n".join(lines).encode()


@pytest.mark.parametrize(
    ("data", "words"),
    [
        (b"", "no table"),
        (b"only words here\nand here\n", "no table"),
        (b"\x89PNG\r\n\x1a\n\x00\x00\x00\rIHDR" + bytes(range(256)) * 8, "not text"),
        (BASE.replace("120", "12o", 1).encode(), "not a number"),
        ("\n".join(BASE.splitlines()[:12]).rsplit(",", 1)[0].encode(), "cut short"),
        (BASE.replace("frequency_hz", "height").encode(), "frequency"),
        (BASE.replace(repr(float(FREQUENCY[3])), "-5.0").encode(), "not a positive number"),
        (BASE.replace(repr(float(FREQUENCY[3])), "0").encode(), "Line 5: the frequency"),
        (BASE.replace(repr(float(FREQUENCY[3])), "1e999").encode(), "Line 5: the frequency"),
        (with_point("0,0"), "Line 4: the impedance is zero"),
        (with_point("1e999,-5"), "Line 4: the impedance is zero or not a finite number"),
        (with_point("nan,-5"), "Line 4"),
        ("\n".join(BASE.splitlines()[:5]).encode(), "only 4 points"),
    ],
)
def test_what_cannot_be_read_is_refused_with_a_reason(data: bytes, words: str) -> None:
    with pytest.raises(Unreadable, match=words):
        read_spectra(data, "x.csv")


def test_stacked_times_become_readings_of_one_panel(tmp_path: Path) -> None:
    lines = ["time (h);f (Hz);Zre (ohm);Zim (ohm)"]
    for hours in (1, 24, 168):
        for f, z in zip(FREQUENCY, IMPEDANCE * hours, strict=True):
            lines.append(f"{hours};{f!r};{z.real!r};{z.imag!r}".replace("np.float64", "").translate(
                {ord("("): "", ord(")"): ""}))  # fmt: skip
    (tmp_path / "A7.csv").write_text("\n".join(lines), encoding="utf-8")
    found = read_files([tmp_path / "A7.csv"])
    assert [(r.panel, r.exposure_h, len(r.spectrum)) for r in found.readings] == [
        ("A7", 1.0, 29), ("A7", 24.0, 29), ("A7", 168.0, 29)
    ]  # fmt: skip
    assert [r.source.part for r in found.readings] == ["1 h", "24 h", "168 h"]


def test_names_lists_and_doubles(tmp_path: Path) -> None:
    (tmp_path / "B-2_14d.csv").write_text(BASE, encoding="utf-8")
    (tmp_path / "again_1h.csv").write_text(BASE, encoding="utf-8")
    (tmp_path / "ümläut ß.csv").write_text(BASE.replace("120", "121"), encoding="utf-8")
    (tmp_path / "lost.csv").write_text(BASE + "\n", encoding="utf-8")
    (tmp_path / "panels.csv").write_text(
        "panel,formulation,area_cm2,colour\nB-2,Grey,12.5,blue\n", encoding="utf-8"
    )
    (tmp_path / "readings.csv").write_text(
        "file,panel,exposure_h,temperature_c\nümläut ß.csv,B-2,24,22.5\ngone.csv,B-2,1,\n",
        encoding="utf-8",
    )
    found = read_folder(tmp_path)
    times = sorted((r.panel, r.exposure_h) for r in found.readings)
    assert times == [("B-2", 24.0), ("B-2", 336.0)]
    assert found.panels[0].notes == (("colour", "blue"),)
    reasons = {r.file: r.reason for r in found.refused}
    assert set(reasons) == {"again_1h.csv", "lost.csv", "gone.csv"}
    assert "B-2_14d.csv" in reasons["again_1h.csv"]


def test_a_few_positive_points_stay_as_measured() -> None:
    odd = IMPEDANCE.copy()
    odd[:4] = odd[:4].conj()
    text = "f,Zre,Zim\n" + "\n".join(
        f"{f},{z.real},{z.imag}" for f, z in zip(FREQUENCY, odd, strict=True)
    )
    (piece,) = read_spectra(text.encode(), "x.csv")
    assert (piece.spectrum.impedance_ohm.imag > 0).sum() == 4


def test_a_folder_with_nothing_in_it(tmp_path: Path) -> None:
    with pytest.raises(UnreadableFolder):
        read_folder(tmp_path)
    with pytest.raises(UnreadableFolder):
        read_folder(tmp_path / "nowhere")
