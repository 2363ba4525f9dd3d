"""What headings, units, numbers and labels say."""

from __future__ import annotations

from datetime import datetime

import pytest

from coatgui.intake.errors import Unclear
from coatgui.intake.headings import meaning
from coatgui.intake.labels import label_in, moment_in, time_in
from coatgui.intake.numbers import Style, number, style_of
from coatgui.intake.units import unit_of

# Heading, role, factor of its unit (None where it names none), whether the sign is turned.
HEADINGS = [
    ("f", "frequency", None, False),
    ("frequency_hz", "frequency", 1.0, False),
    ("Freq. [kHz]", "frequency", 1e3, False),
    ("f [mHz]", "frequency", 1e-3, False),
    ("ω (rad/s)", "angular_frequency", 1.0, False),
    ("Frequenz / rad/s", "angular_frequency", 1.0, False),
    ("ω / s⁻¹", "angular_frequency", 1.0, False),
    ("Frecuencia angular (rad/s)", "angular_frequency", 1.0, False),
    ("Z'", "real", None, False),
    ("Re(Z) / MΩ", "real", 1e6, False),
    ("Zreal/Ohm", "real", 1.0, False),
    ("Z real ohm", "real", 1.0, False),
    ("partie réelle de l'impédance (kΩ)", "real", 1e3, False),
    ("Widerstand", None, None, False),
    ("-Im(Z)/Ohm", "imaginary", 1.0, True),
    ("(-)Z'' (ohm)", "imaginary", 1.0, True),
    ("−Z″ [GΩ]", "imaginary", 1e9, True),
    ("neg. imaginary part", "imaginary", None, True),
    ("parte imaginaria de la impedancia (ohm)", "imaginary", 1.0, False),
    ("Parte immaginaria [kOhm]", "imaginary", 1e3, False),
    ("|Z| (Ω)", "modulus", 1.0, False),
    ("module de l'impédance (kΩ)", "modulus", 1e3, False),
    ("Betrag von Z", None, None, False),
    ("-Phasenwinkel [°]", "phase", 0.017453292519943295, True),
    ("phase angle of Z (deg)", "phase", 0.017453292519943295, False),
    ("phase(Y) / deg", "admittance_phase", 0.017453292519943295, False),
    ("Y'' / µS", "admittance_imaginary", 1e-6, False),
    ("Conductance (S)", "admittance_real", 1.0, False),
    ("C' (nF)", "capacitance_real", 1e-9, False),
    ("Auslagerungszeit (d)", "time", 24.0, False),
    ("Time of immersion (hours)", "time", 1.0, False),
    ("exposure_h", "time", 1.0, False),
    ("Sample", "panel", None, False),
    # What is no measured impedance must not be taken for one.
    ("Zre error", None, None, False),
    ("fit Zre", None, None, False),
    ("Z' std", None, None, False),
    ("height", None, None, False),
    ("Potential (V)", None, None, False),
    ("", None, None, False),
    ("-", None, None, False),
]


@pytest.mark.parametrize(("heading", "role", "factor", "turned"), HEADINGS)
def test_a_heading(heading: str, role: str | None, factor: float | None, turned: bool) -> None:
    what = meaning(heading)
    if role is None:
        assert what is None
        return
    assert what is not None
    assert what.role == role
    assert (None if what.unit is None else what.unit.factor) == factor
    assert what.negative is turned
    assert not what.unknown_unit


def test_headings_that_say_more() -> None:
    labelled = meaning("Zre (24 h) / ohm")
    assert labelled is not None
    assert (labelled.role, labelled.hours) == ("real", 24.0)
    panel = meaning("A1 Z' [Ω]")
    assert panel is not None
    assert (panel.role, panel.label) == ("real", "A1")
    logarithm = meaning("log(|Z|/ohm)")
    assert logarithm is not None
    assert (logarithm.role, logarithm.logarithm) == ("modulus", True)
    unknown = meaning("Zreal (furlong)")
    assert unknown is not None
    assert (unknown.role, unknown.unknown_unit) == ("real", "furlong")


def test_units_per_area_and_unsure_ones() -> None:
    for text, factor in (("Ω·cm²", 1.0), ("kohm cm2", 1e3), ("MΩ*cm^2", 1e6), ("Ω m²", 1e4)):
        unit = unit_of(text, "impedance")
        assert unit is not None
        assert (unit.factor, unit.per_area, unit.sure) == (factor, True, True)
    per_area = unit_of("µS/cm²", "admittance")
    assert per_area is not None
    assert (per_area.factor, per_area.per_area) == (1e-6, True)
    assert unit_of("ohm cm", "impedance") is None  # a resistivity
    for text, kind in (("mhz", "frequency"), ("mohm", "impedance")):
        unsure = unit_of(text, kind)
        assert unsure is not None
        assert not unsure.sure
    for text, kind, factor in (("mHz", "frequency", 1e-3), ("MHz", "frequency", 1e6),
                               ("mΩ", "impedance", 1e-3), ("Mohm", "impedance", 1e6),
                               ("Kilohertz", "frequency", 1e3)):  # fmt: skip
        sure = unit_of(text, kind)
        assert sure is not None
        assert (sure.factor, sure.sure) == (factor, True)


@pytest.mark.parametrize(
    ("cells", "style"),
    [
        (["1.5", "200"], Style(".")),
        (["1,5", "200"], Style(",")),
        (["1,234.5"], Style(".", ",")),
        (["1.234,5"], Style(",", ".")),
        (["1'234.5"], Style(".", "'")),
        (["1 234,5"], Style(",", " ")),
        (["1\u202f234,5"], Style(",", "\u202f")),
        (["1,234,567"], Style(".", ",")),
        (["1.234", "0.5"], Style(".")),
        (["1,234", "0.5"], Style(".", ",")),
        (["1.234", "100000"], Style(".")),  # thousands stand unparted elsewhere
        (["1.234E+05"], Style(".")),
        (["12"], Style(".")),
        (["1.5", "1,5"], None),
        (["1.234.5,6", "2,5"], Style(",", ".")),
    ],
)
def test_the_style_of_numbers(cells: list[str], style: Style | None) -> None:
    assert style_of(cells) == style


def test_thousands_or_decimals_is_asked() -> None:
    with pytest.raises(Unclear, match=r"1,234"):
        style_of(["1,234", "5,678", "12"])
    assert style_of(["1,234", "5,678"], ",") == Style(",")
    # Parted here and unparted there: either the one or the other is something else.
    with pytest.raises(Unclear):
        style_of(["1.234", "12345,5"])


def test_numbers() -> None:
    assert number("1.234.567,5", Style(",", ".")) == 1234567.5
    assert number("−1,5D+03", Style(",")) == -1500.0
    assert number(".5", Style(".")) == 0.5
    for text in ("1.2.3", "1_000", "nan", "inf", "0x10", "12o", "1,5", "", "+", "."):
        assert number(text, Style(".")) is None


def test_labels_times_and_dates() -> None:
    assert label_in("A1 24 h") == ("A1", 24.0)
    assert label_in("== t = 7 d ==") == ("", 168.0)
    assert label_in("Probe B-2, 3 Tage") == ("Probe B-2", 72.0)
    assert time_in("2 h and 3 h")[0] is None
    assert moment_in("on 2026-03-01 14:05") == (datetime(2026, 3, 1, 14, 5), False)
    assert moment_in("01.03.2026 2:05 PM") == (datetime(2026, 3, 1, 14, 5), False)
    assert moment_in("03/04/2026") == (datetime(2026, 4, 3), True)
    assert moment_in("12/25/2026") == (datetime(2026, 12, 25), False)
    assert moment_in("31.02.2026") == (None, False)
    assert moment_in("no date") == (None, False)
