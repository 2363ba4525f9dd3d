"""Temperature and potential point by point: kept as their ends within the sweep."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest

from coatgui.campaign import CampaignFile, campaign_from_found
from coatgui.intake import read_again, read_folder
from coatgui.intake.conditions import condition
from coatgui.records import Found, FoundReading

FREQUENCY = np.logspace(4, -1, 26)
Z = 100 + 1e5 / (1 + 2j * np.pi * FREQUENCY * 1e-3)
WARM = np.linspace(22.0, 25.5, 26)
POTENTIAL = np.linspace(-0.51, -0.48, 26)


@pytest.mark.parametrize(
    ("heading", "below", "role", "factor"),
    [
        ("T / °C", "", "temperature", 1.0),
        ("Temp (°C)", "", "temperature", 1.0),
        ("Temperature", "°C", "temperature", 1.0),
        ("Zelltemperatur in °C", "", "temperature", 1.0),
        ("E (V vs Ag/AgCl)", "", "potential", 1000.0),
        ("Ecorr / mV vs. SCE", "", "potential", 1.0),
        ("open circuit potential [mV]", "", "potential", 1.0),
    ],
)
def test_headings_of_conditions(heading: str, below: str, role: str, factor: float) -> None:
    found = condition(heading, below)
    assert found is not None
    assert (found[0], found[1].factor) == (role, factor)


@pytest.mark.parametrize(
    "heading", ["T", "t/s", "Temperature", "Potential", "E ac / mV", "Z' / ohm", "f / Hz", "C / F"]
)
def test_what_is_no_condition_or_names_no_unit_is_left_alone(heading: str) -> None:
    assert condition(heading) is None


def table(headings: list[str], *columns: np.ndarray, units: list[str] | None = None) -> str:
    rows = [",".join(headings)] + ([",".join(units)] if units else [])
    rows += [",".join(f"{x:.6g}" for x in row) for row in np.column_stack(columns)]
    return "\n".join(rows) + "\n"


def only(folder: Path, text: str) -> tuple[FoundReading, Found]:
    (folder / "A1_24h.csv").write_text(text, encoding="utf-8")
    found = read_folder(folder)
    assert found.refused == ()
    (reading,) = found.readings
    return reading, found


def test_the_ends_within_the_sweep_are_kept(tmp_path: Path) -> None:
    headings = ["f/Hz", "Zre/ohm", "Zim/ohm", "T/°C", "E/V"]
    text = table(headings, FREQUENCY, Z.real, Z.imag, WARM, POTENTIAL)
    reading, found = only(tmp_path, text)
    assert reading.temperature_span_c == pytest.approx((22.0, 25.5))
    assert reading.potential_span_mv == pytest.approx((-510.0, -480.0))
    assert reading.temperature_c == pytest.approx(23.75)
    assert reading.potential_mv == pytest.approx(-495.0)
    assert reading.spectrum.impedance_ohm == pytest.approx(Z, rel=1e-4)
    # The campaign keeps them, in its file as well.
    campaign = campaign_from_found(found, "C")
    path = tmp_path / "c.coatgui"
    CampaignFile.create(path, campaign, found.raw).close()
    with CampaignFile.open(path) as file:
        kept = file.campaign.readings[0]
    assert kept.temperature_span_c == reading.temperature_span_c
    assert kept.potential_span_mv == reading.potential_span_mv
    # A stored dialect reads the same again.
    assert reading.source.dialect is not None
    again = read_again(text.encode(), reading.source, reading.source.dialect, "A1", 24.0)
    assert again.temperature_span_c == reading.temperature_span_c
    assert again.potential_span_mv == reading.potential_span_mv


def test_units_may_stand_in_the_row_below_and_kelvin_is_turned(tmp_path: Path) -> None:
    text = table(
        ["f", "Zre", "Zim", "Temperature"], FREQUENCY, Z.real, Z.imag, WARM + 273.15,
        units=["Hz", "ohm", "ohm", "K"],
    )  # fmt: skip
    reading, _ = only(tmp_path, text)
    assert reading.temperature_span_c == pytest.approx((22.0, 25.5))
    assert reading.potential_span_mv is None


def test_without_a_unit_nothing_is_taken(tmp_path: Path) -> None:
    text = table(["f/Hz", "Zre/ohm", "Zim/ohm", "Potential"], FREQUENCY, Z.real, Z.imag, POTENTIAL)
    reading, _ = only(tmp_path, text)
    assert reading.potential_span_mv is None
    assert reading.potential_mv is None


def test_cells_that_hold_nothing_do_not_hide_the_others(tmp_path: Path) -> None:
    text = table(["f/Hz", "Zre/ohm", "Zim/ohm", "T/°C"], FREQUENCY, Z.real, Z.imag, WARM)
    lines = text.splitlines()
    lines[5] = lines[5].rsplit(",", 1)[0] + ","
    reading, _ = only(tmp_path, "\n".join(lines) + "\n")
    assert reading.temperature_span_c == pytest.approx((22.0, 25.5))


def test_the_list_of_readings_prevails(tmp_path: Path) -> None:
    (tmp_path / "readings.csv").write_text(
        "file,panel,exposure_h,temperature_c\nA1_24h.csv,A1,24,23\n", encoding="utf-8"
    )
    text = table(["f/Hz", "Zre/ohm", "Zim/ohm", "T/°C"], FREQUENCY, Z.real, Z.imag, WARM)
    reading, _ = only(tmp_path, text)
    assert reading.temperature_c == 23.0
    assert reading.temperature_span_c == pytest.approx((22.0, 25.5))
