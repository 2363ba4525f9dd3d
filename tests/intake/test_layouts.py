"""What the matrix of dialects leaves out: odd tables, contradictions, and what is asked about."""

from __future__ import annotations

import numpy as np
import pytest

from coatgui.intake import Unclear, Unreadable, read_spectra
from coatgui.intake.spectra import Piece
from coatgui.records import ComplexArray

FREQUENCY = np.logspace(5, -2, 29)
S = 2j * np.pi * FREQUENCY
Z = 120 + 1 / (2e-9 * S**0.95 + 1 / (4e6 + 1 / (3e-7 * S**0.85)))
MODULUS, DEGREES = np.abs(Z), np.degrees(np.angle(Z))


def text(headings: str, *columns: object, delimiter: str = ";") -> str:
    rows = zip(*[np.asarray(c).tolist() for c in columns], strict=True)
    lines = [delimiter.join(c if isinstance(c, str) else repr(c) for c in row) for row in rows]
    return "\n".join([*([headings] if headings else []), *lines]) + "\n"


def one(told: str) -> Piece:
    (piece,) = read_spectra(told.encode())
    return piece


def is_z(piece: Piece, z: ComplexArray = Z) -> bool:
    return bool(np.allclose(piece.spectrum.impedance_ohm, z, rtol=1e-9))


def test_redundant_columns_are_checked_against_each_other() -> None:
    headings = "f (Hz);Z' (ohm);Z'' (ohm);|Z| (ohm);phase (deg)"
    assert is_z(one(text(headings, FREQUENCY, Z.real, Z.imag, MODULUS, DEGREES)))
    with pytest.raises(Unclear, match="contradict"):
        read_spectra(text(headings, FREQUENCY, Z.real, Z.imag, MODULUS * 2, DEGREES).encode())


def test_logarithms() -> None:
    told = text("log(f/Hz);log(|Z|/ohm);phase (deg)", np.log10(FREQUENCY), np.log10(MODULUS),
                DEGREES)  # fmt: skip
    assert is_z(one(told))


def test_other_columns_are_left_alone() -> None:
    headings = "#;Time (s);f (Hz);Potential (V);Z' (ohm);Z'' (ohm);Z' error"
    point = np.arange(29.0) + 1
    told = text(headings, point, point * 7.5, FREQUENCY, point * 0 + 0.2, Z.real, Z.imag, point)
    piece = one(told)
    assert is_z(piece)
    assert piece.exposure_h is None  # a clock, not an exposure
    assert [c.role for c in piece.dialect.columns] == [
        "other", "time", "frequency", "potential", "real", "imaginary", "other"
    ]  # fmt: skip
    assert piece.potential_span_mv == (200.0, 200.0)


def test_columns_without_headings() -> None:
    assert is_z(one(text("", FREQUENCY, Z.real, Z.imag)))
    assert is_z(one(text("", FREQUENCY, Z.real, -Z.imag)))
    assert is_z(one(text("", FREQUENCY, MODULUS, DEGREES)))
    assert is_z(one(text("", FREQUENCY, MODULUS, np.radians(DEGREES))))
    assert is_z(one(text("", np.arange(29), FREQUENCY, Z.real, Z.imag, MODULUS, DEGREES)))
    assert is_z(one(text("", FREQUENCY, MODULUS, DEGREES, Z.real, Z.imag)))
    with pytest.raises(Unclear, match="3 columns where two"):
        read_spectra(text("", FREQUENCY, Z.real, Z.imag, MODULUS).encode())
    with pytest.raises(Unclear, match="behave neither"):
        read_spectra(text("", FREQUENCY, np.roll(Z.real, 9)[::-1], Z.imag**2).encode())
    with pytest.raises(Unreadable, match="add a line of headings"):
        read_spectra(text("", Z.real, Z.imag, MODULUS).encode())
    with pytest.raises(Unclear):  # a modulus may run like a frequency
        read_spectra(text("", MODULUS, Z.real, Z.imag).encode())


def test_headings_that_are_not_understood_are_doubted() -> None:
    piece = one(text("freq fit;real fit;imag fit", FREQUENCY, Z.real, Z.imag))
    assert is_z(piece)
    assert any("'freq fit, real fit, imag fit' were not understood" in d for d in piece.doubts)
    assert not one(text("", FREQUENCY, Z.real, Z.imag)).doubts


def test_a_phase_without_a_unit() -> None:
    assert is_z(one(text("f;|Z|;phase", FREQUENCY, MODULUS, DEGREES)))
    assert is_z(one(text("f;|Z|;phase", FREQUENCY, MODULUS, np.radians(DEGREES))))
    # A resistor: its phase is nothing in degrees and in radians alike.
    flat = np.full(29, 1e6)
    with pytest.raises(Unclear, match="degrees or radians"):
        read_spectra(text("f;|Z|;phase", FREQUENCY, flat, flat * -1e-9).encode())


def test_units_that_are_not_known_or_not_sure_are_asked_about() -> None:
    for headings, words in (
        ("f (Hz);Z' (furlong);Z'' (ohm)", "furlong"),
        ("f (mhz);Z' (ohm);Z'' (ohm)", "milli or mega"),
        ("f (Hz);Z' (mohm);Z'' (mohm)", "milli or mega"),
        ("f (Hz);Z' (ohm cm2);Z'' (ohm)", "per area"),
    ):
        with pytest.raises(Unclear, match=words):
            read_spectra(text(headings, FREQUENCY, Z.real, Z.imag).encode())
    piece = one(text("f;Z';Z''", FREQUENCY, Z.real, Z.imag))
    assert "No unit is named: Hz and Ω were taken." in piece.dialect.remarks


def test_an_exposure_without_a_unit_is_asked_about() -> None:
    hours = np.repeat([24.0, 168.0], 29)
    told = [np.tile(c, 2) for c in (FREQUENCY, Z.real, Z.imag)]
    with pytest.raises(Unclear, match="hours or days"):
        read_spectra(text("exposure;f;Z';Z''", hours, *told).encode())
    days = read_spectra(text("exposure (d);f;Z';Z''", hours, *told).encode())
    assert [p.exposure_h for p in days] == [576.0, 4032.0]
    words = [f"{h:g} h" for h in hours]
    assert [p.exposure_h for p in read_spectra(text("exposure;f;Z';Z''", words, *told).encode())] \
        == [24.0, 168.0]  # fmt: skip


def test_seconds_are_no_exposure() -> None:
    zero = np.zeros(29)
    assert one(text("Time (s);f;Z';Z''", zero, FREQUENCY, Z.real, Z.imag)).exposure_h is None
    exposed = one(text("Exposure (min);f;Z';Z''", zero + 90, FREQUENCY, Z.real, Z.imag))
    assert exposed.exposure_h == pytest.approx(1.5)


def test_a_line_of_words_among_the_points_is_no_new_table() -> None:
    lines = text("f;Z';Z''", FREQUENCY, Z.real, Z.imag).splitlines()
    lines[10] = "overload;;"
    with pytest.raises(Unreadable, match="Line 11 stands between the points"):
        read_spectra("\n".join(lines).encode())
    lines[10] = "# cell touched here"
    # A point is missing then, but the file says so itself, and no number is lost.
    assert [len(p.spectrum) for p in read_spectra("\n".join(lines).encode())] == [9, 19]


def test_a_last_line_cut_short() -> None:
    whole = text("f;Z';Z''", FREQUENCY, Z.real, Z.imag).rstrip()
    for end in (whole.rsplit(";", 1)[0], whole.rsplit(";", 2)[0]):
        with pytest.raises(Unreadable, match="cut short"):
            read_spectra(end.encode())
    footed = one(whole + "\n\nmeasured by the night shift\n")
    assert is_z(footed)
    assert any("footer" in remark for remark in footed.dialect.remarks)


def test_tables_that_are_no_spectrum_are_passed_over_and_said_so() -> None:
    before = "Time (s);Potential (V);Current (A)\n0;0.1;1e-9\n1;0.2;1e-9\n2;0.1;1e-9\n\n"
    piece = one(before + text("f (Hz);Z' (ohm);Z'' (ohm)", FREQUENCY, Z.real, Z.imag))
    assert is_z(piece)
    assert any("Lines 2 to 4 hold numbers that are no spectrum" in d for d in piece.doubts)


def test_groups_side_by_side_of_different_length() -> None:
    first = text("", FREQUENCY, Z.real, Z.imag).splitlines()
    second = text("", FREQUENCY[:20], 2 * Z.real[:20], 2 * Z.imag[:20]).splitlines()
    lines = [f"{a};{b}" if b else f"{a};;;" for a, b in
             zip(first, [*second, *[""] * 9], strict=True)]  # fmt: skip
    heads = "A1 24 h;;;B2 24 h;;\n" + "f (Hz);Z' (ohm);Z'' (ohm);" * 2
    found = read_spectra("\n".join([heads, *lines]).encode())
    assert [(p.panel, p.exposure_h, len(p.spectrum)) for p in found] == [
        ("A1", 24.0, 29), ("B2", 24.0, 20)
    ]  # fmt: skip
    lines[5] = lines[5].rsplit(";", 1)[0] + ";"
    with pytest.raises(Unreadable, match="lacks a number in column 6"):
        read_spectra("\n".join([heads, *lines]).encode())


def test_times_in_the_headings() -> None:
    told = text("f / Hz;Z' 1 h / ohm;Z' 24 h / ohm;Z'' 1 h / ohm;Z'' 24 h / ohm", FREQUENCY,
                Z.real, 2 * Z.real, Z.imag, 2 * Z.imag)  # fmt: skip
    found = read_spectra(told.encode())
    assert [p.exposure_h for p in found] == [1.0, 24.0]
    assert is_z(found[0])
    assert is_z(found[1], 2 * Z)


def test_there_and_back_again_is_asked_about() -> None:
    both = [np.concatenate([c, c[::-1]]) for c in (FREQUENCY, Z.real, Z.imag)]
    with pytest.raises(Unclear, match="one way and back"):
        read_spectra(text("f;Z';Z''", *both).encode())


def test_one_bad_spectrum_does_not_turn_the_sign() -> None:
    hours = np.repeat([1.0, 2.0, 3.0], 29)
    f, re = np.tile(FREQUENCY, 3), np.tile(Z.real, 3)
    im = np.concatenate([Z.imag, -Z.imag, Z.imag])
    found = read_spectra(text("time (h);f (Hz);Zre (ohm);Zim (ohm)", hours, f, re, im).encode())
    assert is_z(found[0])
    assert is_z(found[1], Z.conj())


def test_a_heading_against_the_numbers_is_doubted() -> None:
    piece = one(text("f (Hz);Z' (ohm);-Z'' (ohm)", FREQUENCY, Z.real, Z.imag))
    assert is_z(piece)
    assert any("turned, and its numbers say not" in doubt for doubt in piece.doubts)


def test_separator_line_and_quoted_cells() -> None:
    body = text("f (Hz),Z' (ohm),Z'' (ohm)", FREQUENCY, Z.real, Z.imag, delimiter=",")
    assert is_z(one("sep=,\n" + body))
    quoted = "\n".join(",".join(f'"{c}"' for c in line.split(",")) for line in body.splitlines())
    assert is_z(one(quoted))


def test_what_a_preamble_says() -> None:
    head = "Sample: A1\nExposure time: 7 d\nDate: 2026-03-08 10:00\n\n"
    piece = one(head + text("f (Hz);Z' (ohm);Z'' (ohm)", FREQUENCY, Z.real, Z.imag))
    assert (piece.panel, piece.exposure_h) == ("A1", 168.0)
    assert piece.moment is not None
    assert piece.moment.isoformat() == "2026-03-08T10:00:00"
    clock = one("Time: 12 min\n" + text("f;Z';Z''", FREQUENCY, Z.real, Z.imag))
    assert clock.exposure_h is None  # how long the sweep took


def test_a_dialect_reads_its_own_spectrum_again() -> None:
    """What is stored with a reading is enough to read the same numbers once more."""
    from coatgui.intake.reading import read_as_told

    for told in (
        text("f (kHz);|Z| (kohm);-phase", FREQUENCY / 1e3, MODULUS / 1e3, -DEGREES),
        text("log f;Z';Z''", np.log10(FREQUENCY), Z.real, -Z.imag),
        text("", FREQUENCY, MODULUS, DEGREES, delimiter="\t"),
        text("f (Hz);Y' (uS);Y'' (uS)", FREQUENCY, (1e6 / Z).real, (1e6 / Z).imag),
    ):
        piece = one(told)
        (again,) = read_as_told(told.encode(), piece.dialect)
        assert is_z(again)
        assert again.spectrum == piece.spectrum
