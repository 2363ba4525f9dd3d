"""Complex numbers in one cell, a bridge's equivalent circuits, and cells that go on over a line's
end."""

from __future__ import annotations

import io

import numpy as np
import openpyxl
import pytest

from coatgui.intake import Unreadable, first_guess, read_as_told, read_spectra
from coatgui.records import ComplexArray

FREQUENCY = np.logspace(5, -2, 29)
S = 2j * np.pi * FREQUENCY
Z = 120 + 1 / (2e-9 * S**0.95 + 1 / (4e6 + 1 / (3e-7 * S**0.85)))


def table(form: str, heading: str, z: ComplexArray = Z) -> bytes:
    rows = [
        form.format(f=f, re=v.real, im=v.imag, size=abs(v.imag), sign="-+"[v.imag > 0])
        for f, v in zip(FREQUENCY.tolist(), z.tolist(), strict=True)
    ]
    return "\n".join([*([heading] if heading else []), *rows]).encode()


FORMS = [
    "{f!r};{re:.9e}{im:+.9e}j",
    "{f!r};{re:.9e}{im:+.9e}i",
    "{f!r};({re:.9e}{im:+.9e}j)",
    "{f!r};{re:.9e} {sign} j {size:.9e}",
    "{f!r};{re:.9e}{sign}j*{size:.9e}",
    "{f!r};({re:.9e}, {im:.9e})",
    "{f!r};({re:.9e} {im:.9e})",
    "{f!r},({re:.9e}, {im:.9e})",
    '{f!r},"({re:.9e},{im:.9e})"',
    '{f!r},"{re:.9e}{im:+.9e}j"',
    "{f!r}\t{re:.9e} - {size:.9e} i",
    "{f!r} ({re:.9e}{im:+.9e}j)",
    "{f!r}|[{re:.9e}{im:+.9e}j]",
]


@pytest.mark.parametrize("form", FORMS[:-1])
@pytest.mark.parametrize("heading", ["f (Hz){0}Z (Ohm)", "f{0}complex impedance", ""])
def test_a_complex_number_in_one_cell(form: str, heading: str) -> None:
    mark = next(m for m in ";,\t " if m in form.split("}", 1)[1])
    blanks = mark == " "
    data = table(form, heading.format("  " if blanks else mark))
    (piece,) = read_spectra(data)
    assert np.allclose(piece.spectrum.impedance_ohm, Z, rtol=1e-8)
    assert [c.role for c in piece.dialect.columns] == ["frequency", "real", "imaginary"]
    (again,) = read_as_told(data, piece.dialect)
    assert again.spectrum == piece.spectrum


def test_what_only_looks_like_one_is_not_read() -> None:
    with pytest.raises(Unreadable):
        read_spectra(table(FORMS[-1], "f|Z"))
    # Numbers in brackets are a book-keeper's negative ones, never both parts of something.
    with pytest.raises(Unreadable):
        read_spectra(table("{f!r};{re!r};({size:.0f},5)", "f;Z';Z''"))


def test_decimal_commas_units_below_and_several_complex_columns() -> None:
    rows = [
        f"{f!r};{v.real / 1e3:.9e} {v.imag / 1e3:+.9e}j;{v.real:.9e}{v.imag * 2:+.9e}j"
        for f, v in zip(FREQUENCY.tolist(), Z.tolist(), strict=True)
    ]
    text = "\n".join([";24 h;168 h", "Frequenz;Impedanz;Impedanz", "Hz;kOhm;Ohm", *rows])
    found = read_spectra(text.replace(".", ",").encode())
    assert [p.exposure_h for p in found] == [24.0, 168.0]
    assert np.allclose(found[0].spectrum.impedance_ohm, Z, rtol=1e-8)
    assert np.allclose(found[1].spectrum.impedance_ohm, Z.real + 2j * Z.imag, rtol=1e-8)
    assert [c.position for c in first_guess(text.encode()).columns] == [0, 1, 2, 3, 4]


def test_complex_admittance_and_a_column_behind() -> None:
    data = table("{f!r};{re:.9e}{im:+.9e}j;ok", "f (Hz);Y (uS);remark", 1e6 / Z)
    (piece,) = read_spectra(data)
    assert np.allclose(piece.spectrum.impedance_ohm, Z, rtol=1e-8)
    named = table("{f!r};{re:.9e}{im:+.9e}j", "f (Hz);Z'' (ohm)")
    (piece,) = read_spectra(named)  # an imaginary part has no parts: look at it
    assert "were not understood" in piece.doubts[0]


def test_complex_numbers_as_spreadsheets_write_them() -> None:
    book = openpyxl.Workbook()
    sheet = book.active
    sheet["A1"] = "Bench 3"
    sheet.append(["f", "Z", "E"])
    sheet.append(["Hz", "kOhm", "V"])
    for f, v in zip(FREQUENCY.tolist(), (Z / 1e3).tolist(), strict=True):
        sheet.append([f, f"{v.real!r}{v.imag:+.15e}i".replace("e", "E"), 0.1])
    held = io.BytesIO()
    book.save(held)
    (piece,) = read_spectra(held.getvalue())
    assert np.allclose(piece.spectrum.impedance_ohm, Z, rtol=1e-12)
    (again,) = read_as_told(held.getvalue(), piece.dialect)
    assert again.spectrum == piece.spectrum


def test_a_bridge_in_parallel_and_in_series() -> None:
    omega = 2 * np.pi * FREQUENCY
    y = 1 / Z
    for heading, first, second in (
        ("f (Hz);Rp (Ohm);Cp (nF)", 1 / y.real, y.imag / omega * 1e9),
        ("f (Hz);C parallel (nF);Parallel resistance (Ohm)", y.imag / omega * 1e9, 1 / y.real),
        ("f (Hz);Parallel resistance (kOhm);Parallel capacitance (pF)", 1e-3 / y.real,
         y.imag / omega * 1e12),
        ("f (Hz);Capacité parallèle (nF);Résistance parallèle (Ohm)", y.imag / omega * 1e9,
         1 / y.real),
        ("f (Hz);C_s (nF);R_s (Ohm)", -1e9 / (omega * Z.imag), Z.real),
        ("f (Hz);Series capacitance (nF);Series resistance (Ohm)", -1e9 / (omega * Z.imag), Z.real),
        ("f (Hz);Gp (uS);Cp (nF)", y.real * 1e6, y.imag / omega * 1e9),
    ):  # fmt: skip
        rows = [
            ";".join(map(repr, row)) for row in np.column_stack([FREQUENCY, first, second]).tolist()
        ]
        data = "\n".join([heading, *rows]).encode()
        (piece,) = read_spectra(data)
        assert np.allclose(piece.spectrum.impedance_ohm, Z, rtol=1e-9), heading
        (again,) = read_as_told(data, piece.dialect)
        assert again.spectrum == piece.spectrum


def test_headings_that_go_on_over_a_line_end() -> None:
    rows = [f'{f!r};{v.real!r};{v.imag!r};"ok\nso far"' for f, v in zip(FREQUENCY.tolist(),
            Z.tolist(), strict=True)]  # fmt: skip
    head = '"Frequency\n(Hz)";"Z\'\n(Ohm)";"Z\'\'\n(Ohm)";"what the\noperator\nsaw"'
    (piece,) = read_spectra("\n".join([head, *rows]).replace("\n", "\r\n").encode())
    assert np.allclose(piece.spectrum.impedance_ohm, Z, rtol=1e-12)
    assert piece.dialect.columns[0].heading == "Frequency (Hz)"
    assert piece.dialect.first_data_line == 7  # as an editor counts
    # Inches and a heading that ends in a double prime open no cell.
    for odd in ('a panel of 12" by 4"\nand "one more\n', "f;Z';Z\"\n"):
        (piece,) = read_spectra((odd + "\n".join(r.rsplit(";", 1)[0] for r in rows)).encode())
        assert len(piece.spectrum) == 29
